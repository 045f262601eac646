//! One steady period of the switched loop: waveforms under one another, and the table of what the parts bear.

use eframe::egui::{self, Align2, Rect, RichText, Role, ScrollArea, Sense, Ui, UiBuilder, WidgetInfo, pos2, vec2};

use super::steps;
use super::theme::{self, palette};
use super::view::Desk;
use crate::analysis::{Steady, Stress};
use crate::figure;
use crate::quantity;

/// Least height of the waveforms [points].
const LEAST_CHART: f32 = 300.0;
/// Least height of the page before it scrolls [points].
pub(super) const LEAST: f32 = 480.0;
/// Width of the table below which its numbers are short [points].
const NARROW: f32 = 420.0;
/// Height of a row of the table [points].
const ROW: f32 = 18.0;
/// Where the columns of numbers end, as shares of the table's width: peak, least, RMS, average.
const COLUMNS: [(&str, f32); 4] = [("greatest", 0.55), ("least", 0.7), ("RMS", 0.85), ("mean", 1.0)];

/// Draws waveforms and table into a rectangle.
pub(super) fn waves_ui(ui: &mut Ui, rect: Rect, desk: &mut Desk<'_>) {
    let steady = match desk.session.steady() {
        Some(Ok(steady)) => steady,
        other => {
            let why = other.and_then(|steady| steady.as_ref().err());
            let why = why.map_or("No waveforms at this condition.".to_owned(), |finding| finding.message.clone());
            steps::empty(ui, steps::frame_of(rect), &why, palette(ui));
            return;
        }
    };
    ui.scope_builder(UiBuilder::new().max_rect(rect), |ui| {
        ui.multiply_opacity(if desk.session.stale() { theme::STALE } else { 1.0 });
        let rows = steady.stress.len() as f32 + 2.8;
        let table = (rows * ROW).min(rect.height() * 0.42);
        let chart = rect.with_max_y((rect.bottom() - table).max(rect.top() + LEAST_CHART).min(rect.bottom()));
        let said = format!("One period of {}.", quantity::print(steady.period_s, quantity::Unit::Second));
        let number = desk.session.generation();
        let title = &desk.session.design().title;
        let make = || figure::waves(title, steady);
        desk.view.waves.ui(ui, chart.shrink2(vec2(4.0, 0.0)), number, ("Waveforms plot", &said), make);
        let below = Rect::from_min_max(pos2(rect.left(), chart.bottom() + 4.0), rect.max);
        if below.height() > ROW {
            table_ui(ui, below, steady);
        }
    });
}

fn table_ui(ui: &mut Ui, rect: Rect, steady: &Steady) {
    let inner = Rect::from_min_max(
        pos2(rect.left() + theme::GUTTER + 6.0, rect.top()),
        pos2(rect.right() - theme::RIGHT_GUTTER - 4.0, rect.bottom()),
    );
    let mut ui = ui.new_child(UiBuilder::new().max_rect(inner));
    ScrollArea::vertical().id_salt("stress").auto_shrink(false).show(&mut ui, |ui| {
        ui.spacing_mut().item_spacing.y = 0.0;
        header_ui(ui);
        for stress in &steady.stress {
            row_ui(ui, stress);
        }
        let volts = |value| quantity::print_digits(value, quantity::Unit::Volt, 3);
        let [whole, capacitive, resistive] = steady.ripple_v.map(volts);
        let text = format!(
            "Ripple of the output bank {whole} peak to peak; {capacitive} of the capacitances alone, {resistive} of their ESR alone."
        );
        ui.add_space(3.0);
        ui.add(egui::Label::new(RichText::new(text).font(theme::small()).color(palette(ui).weak)).wrap());
    });
}

fn header_ui(ui: &mut Ui) {
    let palette = palette(ui);
    let (rect, _) = ui.allocate_exact_size(vec2(ui.available_width(), ROW), Sense::hover());
    let painter = ui.painter();
    let title = if rect.width() < NARROW { "Stress" } else { "What the parts bear" };
    painter.text(rect.left_center(), Align2::LEFT_CENTER, title, theme::strong(12.5), palette.ink);
    for (name, share) in COLUMNS {
        let at = pos2(rect.left() + rect.width() * share, rect.center().y);
        painter.text(at, Align2::RIGHT_CENTER, name, theme::small(), palette.weak);
    }
}

fn row_ui(ui: &mut Ui, stress: &Stress) {
    let palette = palette(ui);
    let (rect, response) = ui.allocate_exact_size(vec2(ui.available_width(), ROW), Sense::hover());
    // Three digits are enough where the columns are narrow.
    let digits = if rect.width() < NARROW { 3 } else { 4 };
    let font = if rect.width() < NARROW { theme::small() } else { theme::body() };
    let print = |value: f64| quantity::print_digits(value, stress.unit, digits);
    let values =
        [print(stress.peak), print(stress.least), stress.rms.map_or(String::new(), print), print(stress.average)];
    let painter = ui.painter().with_clip_rect(rect);
    painter.text(rect.left_center(), Align2::LEFT_CENTER, &stress.name, theme::small(), palette.weak);
    for ((_, share), value) in COLUMNS.iter().zip(&values) {
        let at = pos2(rect.left() + rect.width() * share, rect.center().y);
        painter.text(at, Align2::RIGHT_CENTER, value, font.clone(), palette.ink);
    }
    let words = COLUMNS.iter().zip(&values).filter(|(_, value)| !value.is_empty());
    let words: Vec<String> = words.map(|((name, _), value)| format!("{name} {value}")).collect();
    response.widget_info(|| WidgetInfo::labeled(Role::Label, true, format!("{}: {}", stress.name, words.join(", "))));
}
