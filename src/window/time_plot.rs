//! A chart over time in the window: its figure is worked out when its content or its size changes, and a cursor reads every panel.
//!
//! *Keys*: with the keyboard on it, left and right move the cursor, with Ctrl in larger steps; Escape takes it away.

use eframe::egui::{self, Align2, EventFilter, Key, Rect, Role, Sense, Stroke, Ui, Vec2, WidgetInfo, pos2, vec2};

use super::axis;
use super::brush::{Brush, Scale};
use super::legend;
use super::plot;
use super::theme::{self, Palette, palette};
use crate::figure::axis::narrow;
use crate::figure::{self, Figure, Frame, Mark, Panel, TimeChart, Trace};
use crate::quantity::{self, Unit};

/// A chart with what was last drawn of it.
#[derive(Debug, Default)]
pub(super) struct TimePlot {
    drawn: Option<Drawn>,
    /// Where the keyboard put the cursor [s].
    key_cursor_s: Option<f64>,
}

#[derive(Debug)]
struct Drawn {
    /// Moves with the content.
    number: u64,
    size: Vec2,
    chart: TimeChart,
    figure: Figure,
    frames: Vec<Frame>,
}

/// One press of an arrow key moves the cursor by this share of the axis; with Ctrl by ten times as much.
const KEY_STEP: f64 = 0.01;
/// Height of a line of the cursor's words [points].
const LINE: f32 = 14.0;

impl TimePlot {
    /// Draws the chart with this number into a rectangle; `make` is asked for it when the number or the size moved. `words` tell
    /// who does not see it.
    pub(super) fn ui(
        &mut self,
        ui: &Ui,
        rect: Rect,
        number: u64,
        words: (&str, &str),
        make: impl FnOnce() -> TimeChart,
    ) {
        let known = self.drawn.take().filter(|drawn| drawn.number == number);
        let drawn = match known {
            Some(drawn) if drawn.size == rect.size() => drawn,
            known => Drawn::new(number, rect.size(), known.map_or_else(make, |drawn| drawn.chart)),
        };
        let palette = palette(ui);
        paint(ui, rect, &drawn.figure, palette);
        let (name, said) = words;
        let response = ui.interact(rect, ui.scope_id().with(name), Sense::click());
        response.widget_info(|| WidgetInfo::labeled(Role::Canvas, true, name));
        ui.ctx().accesskit_node_builder(response.id, |node| node.set_description(said));
        legend::focus_ring(ui, &response);
        self.keys(ui, &response, drawn.chart.span_s);
        let over = response.hover_pos().and_then(|at| drawn.time_at(at.x - rect.left()));
        if let Some(time_s) = over.or(self.key_cursor_s.filter(|_| response.has_focus())) {
            drawn.cursor_ui(ui, rect, time_s, palette);
        }
        self.drawn = Some(drawn);
    }

    fn keys(&mut self, ui: &Ui, response: &egui::Response, (from, to): (f64, f64)) {
        if !response.has_focus() {
            return;
        }
        let filter = EventFilter { horizontal_arrows: true, escape: true, ..EventFilter::default() };
        ui.memory_mut(|memory| memory.set_focus_lock_filter(response.id, filter));
        let steps = ui.input(|input| {
            let large = if input.modifiers.command { 10.0 } else { 1.0 };
            let pressed = |key| f64::from(u8::from(input.key_pressed(key)));
            large * (pressed(Key::ArrowRight) - pressed(Key::ArrowLeft))
        });
        if steps != 0.0 {
            let at = self.key_cursor_s.unwrap_or(from);
            self.key_cursor_s = Some((at + steps * KEY_STEP * (to - from)).clamp(from, to));
        }
        if ui.input(|input| input.key_pressed(Key::Escape)) {
            self.key_cursor_s = None;
            response.surrender_focus();
        }
    }
}

impl Drawn {
    fn new(number: u64, size: Vec2, chart: TimeChart) -> Self {
        let (figure, frames) = chart.figure([f64::from(size.x), f64::from(size.y)], false);
        Drawn { number, size, chart, figure, frames }
    }

    /// The time at a place across [s]; none beside the frames.
    fn time_at(&self, x: f32) -> Option<f64> {
        let frame = self.frames.first()?;
        let inside = (frame.corners[0][0]..=frame.corners[1][0]).contains(&f64::from(x));
        inside.then(|| frame.x.value(x))
    }

    fn cursor_ui(&self, ui: &Ui, rect: Rect, time_s: f64, palette: &Palette) {
        let Some(lowest) = self.frames.last() else { return };
        let place = |[x, y]: figure::Point| rect.min + vec2(narrow(x), narrow(y));
        let x = rect.left() + lowest.x.at(time_s);
        let right = x < rect.center().x;
        for (panel, frame) in self.chart.panels.iter().zip(&self.frames) {
            let [top, bottom] = frame.corners.map(place);
            let painter = ui.painter().with_clip_rect(Rect::from_min_max(top, bottom));
            painter.vline(x, top.y..=bottom.y, Stroke::new(1.0, palette.weak.gamma_multiply(0.6)));
            let mut y = top.y + 10.0;
            for (trace, value) in read(panel, time_s) {
                let at = pos2(x, rect.top() + frame.y.at(value));
                painter.circle_filled(at, 3.0, theme::of_role(trace.look.role, palette));
                let (align, way) = if right { (Align2::LEFT_CENTER, 8.0) } else { (Align2::RIGHT_CENTER, -8.0) };
                let text = said(panel, trace, value);
                let colours = (palette.ink, palette.bar);
                plot::tag(&painter, pos2(x + way, y), align, &text, theme::small(), colours);
                y += LINE;
            }
        }
        let at = pos2(x, rect.top() + narrow(lowest.corners[1][1]) + 10.0);
        let text = quantity::print_digits(time_s, Unit::Second, 4);
        plot::tag(ui.painter(), at, Align2::CENTER_CENTER, &text, theme::small(), (palette.ink, palette.bar));
    }
}

/// The named traces of a panel with their values at a time, as they are named above it.
fn read(panel: &Panel, time_s: f64) -> impl Iterator<Item = (&Trace, f64)> {
    let value = move |trace: &Trace| axis::interpolate(&trace.times_s, &trace.values, time_s).filter(|v| v.is_finite());
    panel.traces.iter().rev().filter_map(move |trace| value(trace).map(|value| (trace, value)))
}

fn said(panel: &Panel, trace: &Trace, value: f64) -> String {
    let value = quantity::print_digits(value, panel.unit, 4);
    if trace.name.is_empty() { value } else { format!("{}  {value}", trace.name) }
}

/// Paints a figure; lines of grid and frame go onto pixels, curves stay where they are.
pub(super) fn paint(ui: &Ui, rect: Rect, figure: &Figure, palette: &Palette) {
    let painter = ui.painter().with_clip_rect(rect.intersect(ui.clip_rect()));
    let brush = Brush { painter: &painter, palette, view: Scale { origin: rect.min, scale: 1.0 }, light: None };
    for mark in &figure.marks {
        let straight = matches!(mark, Mark::Line { role: figure::Role::Grid | figure::Role::GridStrong, .. });
        brush.mark(mark, (!straight).then_some(Vec2::ZERO));
    }
}
