//! The stacked plots of gain and phase with the lanes under them, on one frequency axis.

use eframe::egui::{self, Align2, Rect, Sense, Stroke, Ui, WidgetInfo, pos2, vec2};

use super::axis::{self, Axis};
use super::crossover;
use super::exact_curves;
use super::held::Held;
use super::lanes;
use super::legend;
use super::marks;
use super::plot::{Pen, Plot};
use super::theme::{self, LineStyle, Palette, palette};
use super::view::{Desk, View};
use super::zoom;
use crate::analysis::{Analysis, Curves, Detail};
use crate::quantity::{self, Unit};

/// Where the parts of the stack are drawn.
#[derive(Clone, Copy, Debug)]
pub(super) struct Stack {
    /// Gain over frequency [dB].
    pub gain: Plot,
    /// Phase over frequency [°].
    pub phase: Plot,
    /// All lanes.
    pub lanes: Rect,
    /// Names of landmarks, frequencies and the crossover window.
    pub foot: Rect,
}

impl Stack {
    /// Top and bottom of everything that shares the frequency axis.
    pub(super) fn whole(&self) -> egui::Rangef {
        egui::Rangef::new(self.gain.rect.top(), self.lanes.bottom())
    }
}

/// Height of the line of legend and readings above the plots [points].
const HEAD: f32 = 24.0;
/// Height of what stands under the lanes [points].
const FOOT: f32 = 58.0;
/// Distance between gain and phase [points].
pub(super) const GAP: f32 = 17.0;

/// Draws the stack into all room of the `Ui`.
pub(super) fn bode_ui(ui: &mut Ui, desk: &mut Desk<'_>) {
    let room = ui.available_rect_before_wrap();
    let stack = lay_out(room, desk);
    desk.view.plot_width = stack.gain.rect.width();
    desk.view.gain_rect = stack.gain.rect;
    let head =
        Rect::from_min_max(pos2(stack.gain.rect.left(), room.top()), pos2(stack.gain.rect.right(), room.top() + HEAD));
    cursor_ui(ui, &stack, desk);
    let palette = palette(ui);
    let veil = if desk.session.stale() { theme::STALE } else { 1.0 };
    ground(ui, &stack, desk.session.analysis(), palette);
    let session = desk.session;
    if let Some(analysis) = session.analysis() {
        let mut painter = ui.painter().clone();
        painter.multiply_opacity(veil);
        if desk.view.band {
            bands(&painter, &stack, desk, palette);
        }
        if let Some(held) = desk.session.held() {
            held_curves(&painter, &stack, held, palette);
        }
        if let Ok(detail) = &analysis.shown {
            exact_curves::curves(&painter, &stack, desk, palette);
            curves(&painter, &stack, detail, desk, palette);
            marks::margins(&painter, &stack, analysis, detail, palette);
        }
        marks::foot_ui(ui, &stack, analysis, desk);
        exact_curves::reach_ui(ui, &stack, desk);
    }
    cursor_line(ui, &stack, desk.view, palette);
    legend::legend_ui(ui, head, desk);
    if !desk.view.review {
        lanes::lanes_ui(ui, &stack, desk);
        crossover::crossover_ui(ui, &stack, desk);
    }
    ui.advance_cursor_after_rect(room);
}

fn lay_out(room: Rect, desk: &mut Desk<'_>) -> Stack {
    // A review has no lanes: there is nothing to move.
    let lanes = if desk.view.review { 0 } else { desk.session.lanes().len().max(1) };
    let lanes_height = theme::LANE_HEIGHT * lanes as f32 + 6.0;
    let left = room.left() + theme::GUTTER;
    let right = (room.right() - theme::RIGHT_GUTTER).max(left + 50.0);
    let rest = (room.height() - HEAD - FOOT - GAP - lanes_height - 8.0).max(120.0);
    let gain_height = (rest * 0.56).round();
    let gain_top = (room.top() + HEAD).round();
    let gain = Rect::from_min_max(pos2(left, gain_top), pos2(right, gain_top + gain_height));
    let phase_top = gain.bottom() + GAP;
    let phase = Rect::from_min_max(pos2(left, phase_top), pos2(right, phase_top + (rest - gain_height).round()));
    let lanes = Rect::from_min_max(
        pos2(room.left(), phase.bottom() + 4.0),
        pos2(room.right(), phase.bottom() + 4.0 + lanes_height),
    );
    let foot = Rect::from_min_max(pos2(room.left(), lanes.bottom()), pos2(room.right(), lanes.bottom() + FOOT));

    let (from, to) = frequency_range(desk);
    let x = Axis::logarithmic(from, to, left, right);
    let (gain_range, phase_range) = value_ranges(desk);
    Stack {
        gain: Plot { rect: gain, x, y: Axis::linear(gain_range.0, gain_range.1, gain.bottom(), gain.top()) },
        phase: Plot { rect: phase, x, y: Axis::linear(phase_range.0, phase_range.1, phase.bottom(), phase.top()) },
        lanes,
        foot,
    }
}

/// Frequencies the axis spans [Hz]: what was zoomed to, or four decades up to the switching frequency.
pub(super) fn frequency_range(desk: &Desk<'_>) -> (f64, f64) {
    desk.view.range_hz.unwrap_or_else(|| desk.session.whole_range_hz())
}

/// Ranges of both value axes. They stand still while a handle is dragged, so that the hand sees what it does.
fn value_ranges(desk: &mut Desk<'_>) -> ((f64, f64), (f64, f64)) {
    let drawing = desk.session.drawing();
    let fresh = (drawing.gain_range, drawing.phase_range);
    let kept = desk.view.axes.filter(|_| desk.view.drag.is_some());
    let ranges = kept.unwrap_or(fresh);
    desk.view.axes = Some(ranges);
    ranges
}

/// Grid, frames and labels.
fn ground(ui: &Ui, stack: &Stack, analysis: Option<&Analysis>, palette: &Palette) {
    let painter = ui.painter();
    let detail = analysis.and_then(|analysis| analysis.shown.as_ref().ok());
    for plot in [&stack.gain, &stack.phase] {
        if let Some(detail) = detail {
            beyond_half_switching(painter, plot, detail, palette);
        }
        plot.decades(painter, palette);
    }
    let (low, high) = stack.gain.y.range();
    let step = if stack.gain.rect.height() / axis::narrow((high - low) / 20.0) < 15.0 { 40.0 } else { 20.0 };
    levels(ui, &stack.gain, (20.0, step), (Unit::Decibel, 0.0), palette);
    let (low, high) = stack.phase.y.range();
    let label_step = if stack.phase.rect.height() / axis::narrow((high - low) / 45.0) < 18.0 { 90.0 } else { 45.0 };
    levels(ui, &stack.phase, (45.0, label_step), (Unit::Degree, -180.0), palette);
}

/// Beyond half the switching frequency an averaged model says nothing: the ground says so.
fn beyond_half_switching(painter: &egui::Painter, plot: &Plot, detail: &Detail, palette: &Palette) {
    let Some(landmark) = detail.landmarks.iter().find(|landmark| landmark.key == "half-switching") else {
        return;
    };
    let x = plot.x.at(landmark.frequency_hz);
    if x < plot.rect.right() {
        let from = pos2(x.max(plot.rect.left()), plot.rect.top());
        painter.rect_filled(Rect::from_min_max(from, plot.rect.max), 0.0, palette.veil);
    }
}

/// Lines at every step, labels at every label step; the line the margins are read from is the heavy one.
fn levels(ui: &Ui, plot: &Plot, steps: (f64, f64), what: (Unit, f64), palette: &Palette) {
    let ((step, label_step), (unit, heavy)) = (steps, what);
    let (low, high) = plot.y.range();
    for value in axis::multiples(low, high, step) {
        let strong = (value - heavy).abs() < step * 0.01;
        plot.level(ui.painter(), value, if strong { palette.landmark.gamma_multiply(0.7) } else { palette.grid });
    }
    for value in axis::multiples(low, high, label_step) {
        plot.level_label(ui.painter(), value, &axis::grid_label(value, step, unit), palette.weak);
    }
    plot.frame(ui.painter(), palette);
}

fn bands(painter: &egui::Painter, stack: &Stack, desk: &Desk<'_>, palette: &Palette) {
    let band = &desk.session.drawing().band;
    if desk.view.loop_gain {
        stack.gain.band(painter, &band.log_hz, &band.gain_db, palette.band);
        stack.phase.band(painter, &band.log_hz, &band.phase_deg, palette.band);
    }
}

/// Pen of a role.
pub(super) fn pen(curve: super::command::Curve, palette: &Palette) -> Pen {
    use super::command::Curve;
    let (colour, width, style) = match curve {
        Curve::Plant => (palette.plant, theme::THIN_CURVE, LineStyle::Dashed),
        Curve::Compensator => (palette.compensator, theme::THIN_CURVE, LineStyle::DashDot),
        Curve::Loop => (palette.loop_gain, theme::CURVE, LineStyle::Solid),
    };
    Pen { colour, width, style }
}

fn curves(painter: &egui::Painter, stack: &Stack, detail: &Detail, desk: &Desk<'_>, palette: &Palette) {
    use super::command::Curve;
    let log_hz = &desk.session.drawing().log_hz;
    for curve in [Curve::Plant, Curve::Compensator, Curve::Loop] {
        if desk.view.shows(curve) {
            let (gain_db, phase_deg) = of(&detail.curves, curve);
            stack.gain.curve(painter, log_hz, gain_db, pen(curve, palette));
            stack.phase.curve(painter, log_hz, phase_deg, pen(curve, palette));
        }
    }
}

/// Gain [dB] and phase [°] of a curve.
pub(super) fn of(curves: &Curves, curve: super::command::Curve) -> (&[f64], &[f64]) {
    use super::command::Curve;
    match curve {
        Curve::Plant => (&curves.plant_db, &curves.plant_deg),
        Curve::Compensator => (&curves.compensator_db, &curves.compensator_deg),
        Curve::Loop => (&curves.loop_db, &curves.loop_deg),
    }
}

fn held_curves(painter: &egui::Painter, stack: &Stack, held: &Held, palette: &Palette) {
    let Ok(detail) = &held.analysis.shown else { return };
    let log_hz = &held.drawing.log_hz;
    let pen = Pen { colour: palette.held, width: theme::THIN_CURVE, style: LineStyle::Dotted };
    stack.gain.curve(painter, log_hz, &detail.curves.loop_db, pen);
    stack.phase.curve(painter, log_hz, &detail.curves.loop_deg, pen);
}

/// Follows the pointer over the plots; the wheel zooms about it, with Ctrl where the column scrolls; dragging pans, a double
/// click shows all again.
fn cursor_ui(ui: &mut Ui, stack: &Stack, desk: &mut Desk<'_>) {
    let mut cursor = None;
    for (name, plot) in [("Gain plot", &stack.gain), ("Phase plot", &stack.phase)] {
        let response = ui.interact(plot.rect, ui.scope_id().with(name), Sense::drag());
        response.widget_info(|| WidgetInfo::labeled(egui::Role::Canvas, true, name));
        legend::focus_ring(ui, &response);
        cursor = cursor.or(zoom::cursor_by_keys(ui, &response, plot, desk));
        if let Some(pointer) = response.hover_pos() {
            cursor = Some(plot.x.value(pointer.x));
            zoom::wheel(ui, plot, pointer, desk);
        }
        if response.dragged() {
            zoom::drag(plot, response.drag_delta().x, desk);
        }
        if response.double_clicked() {
            desk.view.range_hz = None;
        }
    }
    desk.view.cursor_hz = cursor.or(desk.view.cursor_below_hz);
}

/// The line under the pointer, with its frequency.
fn cursor_line(ui: &Ui, stack: &Stack, view: &View, palette: &Palette) {
    let Some(frequency_hz) = view.cursor_hz else { return };
    let painter = ui.painter();
    let x = stack.gain.x.at(frequency_hz);
    painter.vline(x, stack.whole(), Stroke::new(1.0, palette.weak.gamma_multiply(0.6)));
    let text = quantity::print_digits(frequency_hz, Unit::Hertz, 3);
    let at = pos2(x, stack.gain.rect.bottom() + GAP / 2.0);
    let clipped = painter.with_clip_rect(stack.gain.rect.expand2(vec2(0.0, GAP)));
    super::plot::tag(&clipped, at, Align2::CENTER_CENTER, &text, theme::small(), (palette.ink, palette.bar));
}
