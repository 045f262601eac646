//! The line above the plots: which curves are shown, and what they read under the pointer.

use eframe::egui::{self, Align2, Rect, Role, Sense, Ui, WidgetInfo, pos2, vec2};

use super::axis;
use super::bode;
use super::command::{Command, Curve};
use super::explain;
use super::plot;
use super::theme::{self, palette};
use super::view::Desk;
use crate::quantity::{self, Unit};

/// Curves in the order of the legend, with their names.
const CURVES: [(Curve, &str); 3] =
    [(Curve::Plant, "plant"), (Curve::Compensator, "compensator"), (Curve::Loop, "loop")];

/// Where each curve and the band begin, as shares of the line; the longest name has the most room.
const PLACES: [f32; 4] = [0.0, 0.27, 0.615, 0.885];

/// The same without the band.
const NARROW_PLACES: [f32; 4] = [0.0, 0.26, 0.72, 1.0];

/// Width below which lines are short, readings are left out and the band has no place [points].
const NARROW: f32 = 470.0;

/// Draws the legend; pressing a name shows or hides its curve.
pub(super) fn legend_ui(ui: &mut Ui, head: Rect, desk: &mut Desk<'_>) {
    let places = if head.width() > NARROW { PLACES } else { NARROW_PLACES };
    let at = |share: f32| head.left() + head.width() * share;
    for (index, (curve, name)) in CURVES.into_iter().enumerate() {
        let rect = Rect::from_min_max(
            pos2(at(places[index]), head.top()),
            pos2(at(places[index + 1]) - 6.0, head.bottom() - 3.0),
        );
        curve_ui(ui, rect, curve, name, desk);
    }
    if head.width() > NARROW {
        let rect = Rect::from_min_max(pos2(at(PLACES[3]), head.top()), head.max - vec2(0.0, 3.0));
        band_ui(ui, rect, desk);
    }
}

fn curve_ui(ui: &mut Ui, rect: Rect, curve: Curve, name: &str, desk: &mut Desk<'_>) {
    let palette = palette(ui);
    let shown = desk.view.shows(curve);
    let pen = bode::pen(curve, palette);
    let ink = if shown { pen.colour } else { palette.weak.gamma_multiply(0.6) };
    let painter = ui.painter();
    let middle = rect.center().y;
    let narrow = rect.width() < NARROW * 0.25;
    let length = if narrow { 13.0 } else { 16.0 };
    plot::sample(painter, pos2(rect.left(), middle), length, plot::Pen { colour: ink, ..pen });
    let text =
        painter.text(pos2(rect.left() + length + 5.0, middle), Align2::LEFT_CENTER, name, theme::strong(12.0), ink);
    let mut end = text.right();
    if let (true, Some(reading)) = (shown && !narrow, reading(desk, curve)) {
        let at = pos2(text.right() + 6.0, middle);
        end = painter.text(at, Align2::LEFT_CENTER, reading, theme::small(), palette.ink).right();
    }
    let press = Rect::from_min_max(rect.min, pos2(end.max(text.right()) + 4.0, rect.bottom()));
    let response = ui.interact(press, ui.scope_id().with(("curve", name)), Sense::click());
    let label = format!("Curve of the {name}");
    response.widget_info(|| WidgetInfo::selected(Role::CheckBox, true, shown, &label));
    focus_ring(ui, &response);
    let response = explain::explained(ui, response, term(curve), || PRESS.to_owned());
    if response.clicked() {
        desk.ask(Command::Toggle(curve));
    }
}

fn band_ui(ui: &mut Ui, rect: Rect, desk: &mut Desk<'_>) {
    let palette = palette(ui);
    let painter = ui.painter();
    let middle = rect.center().y;
    let swatch = Rect::from_min_size(pos2(rect.left(), middle - 5.0), vec2(14.0, 10.0));
    let ink = if desk.view.band { palette.weak } else { palette.weak.gamma_multiply(0.5) };
    painter.rect_filled(swatch, 2.0, palette.band);
    let text = painter.text(pos2(rect.left() + 19.0, middle), Align2::LEFT_CENTER, "all nine", theme::small(), ink);
    let press = Rect::from_min_max(rect.min, pos2(text.right() + 3.0, rect.bottom()));
    let response = ui.interact(press, ui.scope_id().with("band"), Sense::click());
    let shown = desk.view.band;
    response.widget_info(|| WidgetInfo::selected(Role::CheckBox, true, shown, "Band of the nine conditions"));
    focus_ring(ui, &response);
    if explain::explained(ui, response, "band", || PRESS.to_owned()).clicked() {
        desk.ask(Command::ToggleBand);
    }
}

/// A ring around what has the keyboard.
pub(super) fn focus_ring(ui: &Ui, response: &egui::Response) {
    if response.has_focus() {
        let stroke = egui::Stroke::new(1.5, palette(ui).accent);
        ui.painter().rect_stroke(response.rect.expand(1.0), 4.0, stroke, egui::StrokeKind::Outside);
    }
}

/// What a press does.
const PRESS: &str = "Press to show or hide.";

/// Key of the term that explains a curve.
fn term(curve: Curve) -> &'static str {
    match curve {
        Curve::Plant => "plant",
        Curve::Compensator => "compensator",
        Curve::Loop => "loop",
    }
}

/// Gain and phase of a curve under the pointer.
fn reading(desk: &Desk<'_>, curve: Curve) -> Option<String> {
    let frequency_hz = desk.view.cursor_hz?;
    let detail = desk.session.analysis()?.shown.as_ref().ok()?;
    let (gain_db, phase_deg) = bode::of(&detail.curves, curve);
    let at = frequency_hz.log10();
    let log_hz = &desk.session.drawing().log_hz;
    let gain = axis::interpolate(log_hz, gain_db, at)?;
    let phase = axis::interpolate(log_hz, phase_deg, at)?;
    let gain = quantity::print_digits(round(gain), Unit::Decibel, 4);
    let phase = quantity::print_digits(round(phase), Unit::Degree, 4);
    Some(format!("{gain}  {phase}"))
}

fn round(value: f64) -> f64 {
    (value * 10.0).round() / 10.0
}
