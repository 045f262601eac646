//! The time response to a load, line or reference step, with its deviation and the band it settles into.

use eframe::egui::{self, Align2, Rect, RichText, Stroke, Ui, pos2, vec2};

use super::axis::{self, Axis, extent};
use super::plot::{Pen, Plot};
use super::step_marks::{self, Missed};
use super::theme::{self, LineStyle, Palette, palette};
use super::view::{Desk, Event};
use crate::analysis::Step;
use crate::quantity::Unit;

/// Height of a heading above a plot [points].
pub(super) const HEADING: f32 = 26.0;
/// Room under a plot for its labels [points].
pub(super) const LABELS: f32 = 20.0;

/// Draws heading and plot into a rectangle.
pub(super) fn steps_ui(ui: &mut Ui, rect: Rect, desk: &mut Desk<'_>) {
    let detail = desk.session.analysis().and_then(|analysis| analysis.shown.as_ref().ok());
    let step = desk.session.analysis().and_then(|analysis| desk.view.event.of(analysis));
    let heading = Rect::from_min_size(rect.min, vec2(rect.width(), HEADING));
    heading_ui(ui, heading, desk);
    let palette = palette(ui);
    let frame = frame_of(rect);
    let Some(step) = step else {
        let why = match detail {
            Some(detail) if !detail.loop_gain.stable() => "The closed loop is not stable: there is no step response.",
            Some(_) if desk.view.event == Event::Load => "The load step is 0 A: there is no response.",
            _ => "No step response at this condition.",
        };
        empty(ui, frame, why, palette);
        return;
    };
    let held = desk.session.held().and_then(|held| desk.view.event.of(&held.analysis));
    let plot = axes(frame, step, held);
    let opacity = if desk.session.stale() { theme::STALE } else { 1.0 };
    draw(ui, &plot, step, held, (opacity, palette));
    let event = desk.view.event;
    let missed = desk.session.analysis().map_or_else(Missed::default, |analysis| Missed::of(event, analysis));
    step_marks::marks_ui(ui, &plot, step, event, (&missed, palette));
}

/// Plot within a rectangle that has a heading above and labels left and below.
pub(super) fn frame_of(rect: Rect) -> Rect {
    let min = pos2(rect.left() + theme::GUTTER, rect.top() + HEADING);
    Rect::from_min_max(min, pos2(rect.right() - theme::RIGHT_GUTTER, (rect.bottom() - LABELS).max(min.y + 30.0)))
}

/// A plot with nothing in it but the reason.
pub(super) fn empty(ui: &Ui, frame: Rect, why: &str, palette: &Palette) {
    ui.painter().rect_stroke(frame, 0.0, Stroke::new(1.0, palette.grid_strong), egui::StrokeKind::Middle);
    let galley = ui.painter().layout(why.to_owned(), theme::small(), palette.weak, frame.width() - 24.0);
    ui.painter().galley(frame.center() - galley.size() / 2.0, galley, palette.weak);
}

/// The events with their names, long and short, and the terms that explain them.
pub(super) const NAMES: [(Event, &str, &str, &str); 3] = [
    (Event::Load, "Load step", "Load", "load-step"),
    (Event::Line, "Line step", "Line", "line-step"),
    (Event::Reference, "Reference step", "Reference", "reference-step"),
];

fn heading_ui(ui: &mut Ui, rect: Rect, desk: &mut Desk<'_>) {
    let inner = rect.with_min_x(rect.left() + theme::GUTTER - 2.0).with_max_x(rect.right() - theme::RIGHT_GUTTER);
    let mut row =
        ui.new_child(egui::UiBuilder::new().max_rect(inner).layout(egui::Layout::left_to_right(egui::Align::Center)));
    let row = &mut row;
    row.spacing_mut().item_spacing.x = 10.0;
    let narrow = inner.width() < NARROW;
    for (event, name, short, term) in NAMES {
        if tab_ui(row, (name, if narrow { short } else { name }), term, desk.view.event == event) {
            desk.view.event = event;
        }
    }
}

/// Width of a heading below which its words are short [points].
pub(super) const NARROW: f32 = 270.0;

/// A word that chooses what a plot shows: ink when chosen, accent when it can be.
pub(super) fn tab_ui(ui: &mut Ui, names: (&str, &str), term: &str, chosen: bool) -> bool {
    let (name, shown) = names;
    let palette = palette(ui);
    let text = if chosen {
        RichText::new(shown).font(theme::strong(13.0)).color(palette.ink)
    } else {
        RichText::new(shown).font(theme::body()).color(palette.accent)
    };
    let response = ui.add(egui::Button::new(text).frame(false));
    response.widget_info(|| egui::WidgetInfo::selected(egui::Role::RadioButton, true, chosen, name));
    super::legend::focus_ring(ui, &response);
    super::explain::explained(ui, response, term, super::explain::nothing).clicked()
}

/// Half of the band that is seen at most, as a share of the span of the response.
const BAND_SHARE: f64 = 1.2;

fn axes(frame: Rect, step: &Step, held: Option<&Step>) -> Plot {
    let end = step.times_s.last().copied().unwrap_or(1.0);
    let all = step.output_v.iter().chain(held.into_iter().flat_map(|held| &held.output_v)).copied();
    // A band far wider than the response would flatten it: then only part of the band is seen.
    let (least, greatest) = extent(all.clone()).unwrap_or((0.0, 1.0));
    let half = step.band_v.min(BAND_SHARE * (greatest - least));
    let band = [step.final_v - half, step.final_v + half];
    let (least, greatest) = extent(all.chain(band)).unwrap_or((0.0, 1.0));
    let room = (greatest - least).max(1e-9) * 0.08;
    Plot {
        rect: frame,
        x: Axis::linear(0.0, end, frame.left(), frame.right()),
        // Words stand above and below the response.
        y: Axis::linear(least - 2.0 * room, greatest + 2.0 * room, frame.bottom(), frame.top()),
    }
}

fn draw(ui: &Ui, plot: &Plot, step: &Step, held: Option<&Step>, look: (f32, &Palette)) {
    let (opacity, palette) = look;
    let painter = ui.painter();
    let band = (step.final_v - step.band_v, step.final_v + step.band_v);
    let settle = Rect::from_x_y_ranges(plot.rect.x_range(), plot.y.at(band.1)..=plot.y.at(band.0));
    let settle = settle.intersect(plot.rect);
    painter.rect_filled(settle, 0.0, palette.settle);
    linear_grid(ui, plot, (Unit::Second, Unit::Volt), palette);
    let mut painter = painter.clone();
    painter.multiply_opacity(opacity);
    if let Some(held) = held {
        let pen = Pen { colour: palette.held, width: theme::THIN_CURVE, style: LineStyle::Dotted };
        plot.curve(&painter, &held.times_s, &held.output_v, pen);
    }
    let pen = Pen { colour: palette.loop_gain, width: theme::CURVE, style: LineStyle::Solid };
    plot.curve(&painter, &step.times_s, &step.output_v, pen);
}

/// Grid, labels and frame of a plot with linear axes.
fn linear_grid(ui: &Ui, plot: &Plot, units: (Unit, Unit), palette: &Palette) {
    let painter = ui.painter();
    let (low, high) = plot.y.range();
    let step = axis::nice_step(high - low, f64::from(plot.rect.height() / 26.0).max(1.0));
    for value in axis::multiples(low, high, step) {
        plot.level(painter, value, palette.grid);
        plot.level_label(painter, value, &axis::grid_label(value, step, units.1), palette.weak);
    }
    let (from, to) = plot.x.range();
    let step = axis::nice_step(to - from, f64::from(plot.rect.width() / 74.0).max(1.0));
    for value in axis::multiples(from, to, step) {
        let x = painter.round_to_pixel_center(plot.x.at(value));
        painter.vline(x, plot.rect.y_range(), Stroke::new(1.0, palette.grid));
        let at = pos2(x.clamp(plot.rect.left(), plot.rect.right() - 12.0), plot.rect.bottom() + 10.0);
        painter.text(at, Align2::CENTER_CENTER, axis::grid_label(value, step, units.0), theme::small(), palette.weak);
    }
    plot.frame(painter, palette);
}
