//! Which frequencies the plots show: wheel, drag and keys zoom and pan the one axis within what it can span.

use eframe::egui::{EventFilter, Key, Modifiers, Pos2, Response, Ui};

use super::app::App;
use super::command::{Pan, Zoom};
use super::plot::Plot;
use super::view::Desk;

/// Least and greatest span of the frequency axis [decades].
const SPANS: (f64, f64) = (0.5, 7.0);
/// Frequencies the axis stays within [Hz].
const BOUNDS_HZ: (f64, f64) = (1e-3, 1e10);
/// What one key press zooms by.
const KEY_ZOOM: f64 = 1.25;
/// What one key press pans by, as a share of the span.
const KEY_PAN: f64 = 0.1;

/// The wheel zooms about the pointer; with Ctrl where the column scrolls, or its lower plots could not be reached.
pub(super) fn wheel(ui: &Ui, plot: &Plot, pointer: Pos2, desk: &mut Desk<'_>) {
    let scrolls = desk.view.plots_scroll;
    let turn = ui.input(|input| {
        let wheel = if scrolls { 0.0 } else { input.smooth_scroll_delta().y };
        wheel + 200.0 * (input.zoom_delta() - 1.0)
    });
    if turn.abs() >= 0.1 {
        let factor = (-f64::from(turn) / 300.0).exp();
        desk.view.range_hz = zoomed(plot.x.range(), plot.x.value(pointer.x), factor).or(desk.view.range_hz);
    }
}

/// Dragging the ground of a plot moves the axis along.
pub(super) fn drag(plot: &Plot, by: f32, desk: &mut Desk<'_>) {
    let (from, _) = plot.x.range();
    let ratio = plot.x.value(plot.rect.left() - by) / from;
    if by != 0.0 {
        desk.view.range_hz = panned(plot.x.range(), ratio).or(desk.view.range_hz);
    }
}

/// While a plot has the keyboard, arrow keys move the cursor along the axis; where it stands [Hz].
pub(super) fn cursor_by_keys(ui: &Ui, response: &Response, plot: &Plot, desk: &mut Desk<'_>) -> Option<f64> {
    if !response.has_focus() {
        return None;
    }
    let filter = EventFilter { horizontal_arrows: true, ..EventFilter::default() };
    ui.memory_mut(|memory| memory.set_focus_lock_filter(response.id, filter));
    let (from, to) = plot.x.range();
    let middle = || desk.session.headline().crossover.map_or((from * to).sqrt(), |(frequency_hz, _)| frequency_hz);
    let at = desk.view.key_cursor_hz.unwrap_or_else(middle);
    let count = |key| ui.input_mut(|input| input.count_and_consume_key(Modifiers::NONE, key));
    let steps = count(Key::ArrowRight) as f64 - count(Key::ArrowLeft) as f64;
    let at = (at * 10f64.powf(steps * KEY_CURSOR)).clamp(from, to);
    desk.view.key_cursor_hz = Some(at);
    Some(at)
}

/// A range about a centre [Hz], its span times `factor`; nothing when the span would leave what is useful.
fn zoomed((from, to): (f64, f64), centre: f64, factor: f64) -> Option<(f64, f64)> {
    let span = (to / from).log10() * factor;
    let (low, high) = (centre * (from / centre).powf(factor), centre * (to / centre).powf(factor));
    (SPANS.0..=SPANS.1).contains(&span).then(|| (low.max(BOUNDS_HZ.0), high.min(BOUNDS_HZ.1)))
}

/// A range with both ends times `ratio`; nothing when it would leave the bounds.
fn panned((from, to): (f64, f64), ratio: f64) -> Option<(f64, f64)> {
    let (from, to) = (from * ratio, to * ratio);
    (from > BOUNDS_HZ.0 && to < BOUNDS_HZ.1).then_some((from, to))
}

/// What one key press moves the cursor by [decades].
const KEY_CURSOR: f64 = 1.0 / 40.0;

impl App {
    /// Zooms about the pointer, else the crossover, else the middle.
    pub(super) fn zoom(&mut self, zoom: Zoom) {
        let range = self.frequency_range_hz();
        let crossover = self.session.headline().crossover.map(|(frequency_hz, _)| frequency_hz);
        let shown = crossover.filter(|hz| (range.0..=range.1).contains(hz));
        let centre = self.view.cursor_hz.or(shown).unwrap_or((range.0 * range.1).sqrt());
        let factor = if zoom == Zoom::In { 1.0 / KEY_ZOOM } else { KEY_ZOOM };
        self.view.range_hz = zoomed(range, centre, factor).or(self.view.range_hz);
    }

    /// Moves the axis by a share of its span.
    pub(super) fn pan(&mut self, pan: Pan) {
        let (from, to) = self.frequency_range_hz();
        let ratio = (to / from).powf(if pan == Pan::Lower { -KEY_PAN } else { KEY_PAN });
        self.view.range_hz = panned((from, to), ratio).or(self.view.range_hz);
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn zooming_keeps_its_centre_and_stops_at_the_bounds() {
        let (from, to) = zoomed((10.0, 1e5), 1e3, 0.5).unwrap();
        // The centre keeps its share of the axis.
        let share = |from: f64, to: f64| (1e3 / from).ln() / (to / from).ln();
        assert!((share(from, to) - share(10.0, 1e5)).abs() < 1e-12);
        assert!(((to / from).log10() - 2.0).abs() < 1e-12);
        assert_eq!(zoomed((100.0, 1e3), 300.0, 0.4), None);
        assert_eq!(zoomed((10.0, 1e8), 300.0, 1.01), None);
    }

    #[test]
    fn panning_keeps_the_span() {
        let (from, to) = panned((10.0, 1e5), 2.0).unwrap();
        assert!((to / from - 1e4).abs() < 1e-9 && (from - 20.0).abs() < 1e-12);
        assert_eq!(panned((1e-2, 1e5), 1e-2), None);
    }
}
