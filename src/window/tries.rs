//! The held tries in a list: what was changed, and what came of it at the condition shown.

use eframe::egui::{Align2, Button, RichText, Role, Sense, Stroke, StrokeKind, Ui, WidgetInfo, vec2};

use super::command::Command;
use super::explain;
use super::theme::{self, palette};
use super::view::Desk;
use crate::analysis::Analysis;
use crate::quantity::{self, Unit};

/// Height of a row [points].
const ROW: f32 = 20.0;

/// Draws the list, where anything is held.
pub(super) fn tries_ui(ui: &mut Ui, desk: &mut Desk<'_>) {
    let session = desk.session;
    if session.tries().is_empty() {
        return;
    }
    ui.horizontal(|ui| {
        let heading = ui.label(RichText::new("Held tries").font(theme::strong(13.5)));
        explain::explained(ui, heading, "held-tries", explain::nothing);
        let text = RichText::new("dotted in the plots").font(theme::small()).color(palette(ui).weak);
        ui.label(text).on_hover_text("Press a try to draw it beside the present design, at the condition shown.");
    });
    let beside = session.held().map(|held| held.number);
    for held in session.tries() {
        let figures = if beside == Some(held.number) { figures(&held.analysis) } else { String::new() };
        row_ui(ui, (held.number, &held.title()), &figures, beside == Some(held.number), desk);
    }
}

/// Crossover and phase margin of a try at the condition shown.
pub(super) fn figures(analysis: &Analysis) -> String {
    let Ok(detail) = &analysis.shown else { return "no result".to_owned() };
    if !detail.loop_gain.stable() {
        return "unstable".to_owned();
    }
    detail.loop_gain.margins.headline_crossover().map_or_else(String::new, |crossover| {
        let margin = quantity::print_digits((crossover.phase_margin_deg * 10.0).round() / 10.0, Unit::Degree, 3);
        format!("{}, {margin}", quantity::print_digits(crossover.frequency_hz, Unit::Hertz, 3))
    })
}

fn row_ui(ui: &mut Ui, held: (usize, &str), figures: &str, beside: bool, desk: &mut Desk<'_>) {
    let palette = palette(ui);
    let (number, title) = held;
    ui.horizontal(|ui| {
        ui.spacing_mut().item_spacing.x = 2.0;
        let width = ui.available_width() - 24.0;
        let (rect, response) = ui.allocate_exact_size(vec2(width, ROW), Sense::click());
        if beside || response.hovered() {
            ui.painter().rect(rect, 3.0, palette.accent_ground, Stroke::NONE, StrokeKind::Inside);
        }
        let at = rect.right_center() - vec2(4.0, 0.0);
        let value = ui.painter().text(at, Align2::RIGHT_CENTER, figures, theme::small(), palette.weak);
        let painter = ui.painter().with_clip_rect(rect.with_max_x(value.left() - 6.0));
        painter.text(rect.left_center() + vec2(4.0, 0.0), Align2::LEFT_CENTER, title, theme::body(), palette.ink);
        response.widget_info(|| WidgetInfo::selected(Role::CheckBox, true, beside, format!("Held try {title}")));
        super::legend::focus_ring(ui, &response);
        if response.on_hover_text(format!("{title}\n{figures}")).clicked() {
            desk.ask(Command::CompareWith(number));
        }
        let cross = Button::new(RichText::new("×").color(palette.accent)).frame(false).min_size(vec2(20.0, ROW));
        if ui.add(cross).accessible_name(format!("Drop try {title}")).on_hover_text("Drop this try.").clicked() {
            desk.ask(Command::DropTry(number));
        }
    });
}
