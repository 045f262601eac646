//! Closed-loop responses over frequency: output impedance, line to output, reference to output, input impedance against the input
//! filter's; open loop dashed beside.

use eframe::egui::{self, Align2, Rect, Stroke, Ui, pos2, vec2};

use super::axis::{self, Axis, DecadeLine, decade_lines, extent};
use super::exact_curves;
use super::plot::{self, Pen, Plot};
use super::steps;
use super::theme::{self, LineStyle, Palette, palette};
use super::view::{ClosedLoop, Desk};
use crate::analysis::{Analysis, Curves, InputFilterResult};
use crate::quantity::{self, Unit};

/// Draws heading and plot into a rectangle.
pub(super) fn responses_ui(ui: &mut Ui, rect: Rect, desk: &mut Desk<'_>) {
    let without = |analysis: &Analysis| analysis.shown.as_ref().is_ok_and(|detail| detail.input_filter.is_none());
    if desk.view.closed_loop == ClosedLoop::Input && desk.session.analysis().is_some_and(without) {
        // The filter is gone, or another design has none.
        desk.view.closed_loop = ClosedLoop::default();
    }
    heading_ui(ui, Rect::from_min_size(rect.min, vec2(rect.width(), steps::HEADING)), desk);
    let palette = palette(ui);
    let frame = steps::frame_of(rect);
    let detail = desk.session.analysis().and_then(|analysis| analysis.shown.as_ref().ok());
    let Some(detail) = detail else {
        desk.view.cursor_below_hz = None;
        steps::empty(ui, frame, "No response at this condition.", palette);
        return;
    };
    let which = desk.view.closed_loop;
    let curves = &detail.curves;
    let (closed, open, unit) = which.of(detail);
    let beside = which.beside(detail);
    let rows = 1 + usize::from(open.is_some()) + beside.len();
    let (from, to) = super::bode::frequency_range(desk);
    let plot = Plot {
        rect: frame,
        x: Axis::logarithmic(from, to, frame.left(), frame.right()),
        y: value_axis((frame, rows), beside.iter().map(|curve| curve.0).chain([closed]).chain(open), unit),
    };
    grid(ui, &plot, unit, palette);
    let mut painter = ui.painter().clone();
    // What a closed loop would do that is not stable is no result: it stands back as stale curves do.
    let doubtful = desk.session.stale() || !detail.loop_gain.stable();
    painter.multiply_opacity(if doubtful { theme::STALE } else { 1.0 });
    let log_hz = &desk.session.drawing().log_hz;
    let inner = |values: &[f64]| -> Vec<f64> {
        if unit == Unit::Ohm { values.iter().map(|value| value.log10()).collect() } else { values.to_vec() }
    };
    let inner_plot = Plot { y: inner_axis(&plot, unit), ..plot };
    if let Some(open) = open {
        inner_plot.curve(&painter, log_hz, &inner(open), open_pen(palette));
    }
    for (values, name) in &beside {
        inner_plot.curve(&painter, log_hz, &inner(values), beside_pen(name, palette));
    }
    if let Some(exact) = exact_curves::impedance(desk).filter(|_| which == ClosedLoop::Impedance) {
        inner_plot.curve(&painter, desk.session.exact_log_hz(), &inner(exact), exact_curves::loop_pen(palette));
    }
    inner_plot.curve(&painter, log_hz, &inner(closed), closed_pen(palette));
    if let Some(filter) = detail.input_filter.as_ref().filter(|_| which == ClosedLoop::Input) {
        margin(&painter, &plot, &filter.result, palette);
    }
    if desk.view.closed_loop == ClosedLoop::Impedance && detail.loop_gain.stable() {
        peak(&painter, &plot, curves, palette);
    }
    read(ui, &plot, &Legend::new(which, (closed, open, unit), &beside, palette), desk, palette);
    announce(ui, &plot, (closed, unit), desk);
    if !detail.loop_gain.stable() {
        let at = plot.rect.center_bottom() - vec2(0.0, 14.0);
        let colours = (palette.problem, palette.canvas);
        plot::tag(ui.painter(), at, Align2::CENTER_CENTER, "the closed loop is not stable", theme::small(), colours);
    }
}

/// Tells screen readers what the plot shows: its greatest value.
fn announce(ui: &Ui, plot: &Plot, shown: (&[f64], Unit), desk: &Desk<'_>) {
    let (closed, unit) = shown;
    let name = NAMES.iter().find(|(which, ..)| *which == desk.view.closed_loop).map_or("", |(_, name, ..)| name);
    let greatest = closed.iter().copied().filter(|value| value.is_finite()).fold(f64::NEG_INFINITY, f64::max);
    let text = format!("{name} plot: at most {}", quantity::print_digits(greatest, unit, 3));
    let response = ui.interact(plot.rect, ui.scope_id().with("closed-loop plot"), egui::Sense::hover());
    response.widget_info(|| egui::WidgetInfo::labeled(egui::Role::Image, true, &text));
}

/// The closed-loop responses with their names, long and short, and the terms that explain them.
const NAMES: [(ClosedLoop, &str, &str, &str); 4] = [
    (ClosedLoop::Impedance, "Output impedance", "Impedance", "output-impedance"),
    (ClosedLoop::Line, "Line to output", "Line", "line-to-output"),
    (ClosedLoop::Reference, "Following", "Following", "following"),
    (ClosedLoop::Input, "Input impedance", "Input", "input-impedance"),
];

fn closed_pen(palette: &Palette) -> Pen {
    Pen { colour: palette.loop_gain, width: theme::CURVE, style: LineStyle::Solid }
}

/// The pen of a curve beside: the filter's own stands out.
fn beside_pen(name: &str, palette: &Palette) -> Pen {
    if name.starts_with("Zo") {
        Pen { colour: palette.compensator, width: theme::CURVE, style: LineStyle::Solid }
    } else {
        Pen { colour: palette.plant, width: theme::THIN_CURVE, style: LineStyle::Dotted }
    }
}

fn open_pen(palette: &Palette) -> Pen {
    Pen { colour: palette.held, width: theme::THIN_CURVE, style: LineStyle::Dashed }
}

/// Below this width four tabs have no room for their full names.
const FOUR_TABS: f32 = 390.0;

fn heading_ui(ui: &mut Ui, rect: Rect, desk: &mut Desk<'_>) {
    let inner = rect.with_min_x(rect.left() + theme::GUTTER - 2.0).with_max_x(rect.right() - theme::RIGHT_GUTTER);
    let mut row =
        ui.new_child(egui::UiBuilder::new().max_rect(inner).layout(egui::Layout::left_to_right(egui::Align::Center)));
    row.spacing_mut().item_spacing.x = 10.0;
    // The last is there only with an input filter, or while it is still looked at.
    let filtered =
        desk.session.analysis().and_then(|a| a.shown.as_ref().ok()).is_some_and(|d| d.input_filter.is_some());
    let with_input = filtered || desk.view.closed_loop == ClosedLoop::Input;
    let needed = if with_input { FOUR_TABS } else { steps::NARROW };
    let narrow = inner.width() < needed;
    for (closed_loop, name, short, term) in NAMES {
        if closed_loop == ClosedLoop::Input && !with_input {
            continue;
        }
        let chosen = desk.view.closed_loop == closed_loop;
        if steps::tab_ui(&mut row, (name, if narrow { short } else { name }), term, chosen) {
            desk.view.closed_loop = closed_loop;
        }
    }
}

fn value_axis<'a>((frame, rows): (Rect, usize), shown: impl Iterator<Item = &'a [f64]>, unit: Unit) -> Axis {
    let all = shown.flatten().copied();
    if unit == Unit::Ohm {
        let (least, greatest) = extent(all.filter(|value| *value > 0.0)).unwrap_or((1e-3, 1.0));
        let low = (least.log10() - 0.1).max(greatest.log10() - 6.0);
        // A fifth of the height stays free above the curves for their names, more for more of them.
        let room = if rows > 2 { 0.5 } else { 0.25 };
        let high = greatest.log10() + room * (greatest.log10() - low) + 0.1;
        return Axis::logarithmic(10f64.powf(low), 10f64.powf(high), frame.bottom(), frame.top());
    }
    let (least, greatest) = extent(all).unwrap_or((-40.0, 20.0));
    let low = least.max(greatest - 140.0) - 4.0;
    Axis::linear(low, greatest + 0.25 * (greatest - low) + 2.0, frame.bottom(), frame.top())
}

/// The value axis in its own measure, for curves given in it.
fn inner_axis(plot: &Plot, unit: Unit) -> Axis {
    let (low, high) = plot.y.range();
    let (low, high) = if unit == Unit::Ohm { (low.log10(), high.log10()) } else { (low, high) };
    Axis::linear(low, high, plot.rect.bottom(), plot.rect.top())
}

fn grid(ui: &Ui, plot: &Plot, unit: Unit, palette: &Palette) {
    let painter = ui.painter();
    plot.decades(painter, palette);
    let (low, high) = plot.y.range();
    if unit == Unit::Ohm {
        let crowded = (high / low).log10() > 3.5;
        for DecadeLine { value, digit } in decade_lines(low, high) {
            if digit == 1 || !crowded {
                plot.level(painter, value, if digit == 1 { palette.grid_strong } else { palette.grid });
            }
            if digit == 1 {
                plot.level_label(painter, value, &quantity::print_digits(value, unit, 1), palette.weak);
            }
        }
    } else {
        let step = axis::nice_step(high - low, f64::from(plot.rect.height() / 24.0).max(1.0));
        for value in axis::multiples(low, high, step) {
            plot.level(painter, value, palette.grid);
            plot.level_label(painter, value, &axis::grid_label(value, step, unit), palette.weak);
        }
    }
    let (from, to) = plot.x.range();
    for DecadeLine { value, digit } in decade_lines(from, to) {
        if digit == 1 {
            let at = pos2(plot.x.at(value).min(plot.rect.right() - 14.0), plot.rect.bottom() + 10.0);
            painter.text(
                at,
                Align2::CENTER_CENTER,
                quantity::print_digits(value, Unit::Hertz, 1),
                theme::small(),
                palette.weak,
            );
        }
    }
    plot.frame(painter, palette);
}

/// Marks the greatest closed-loop output impedance.
fn peak(painter: &egui::Painter, plot: &Plot, curves: &Curves, palette: &Palette) {
    let pairs = curves.frequencies_hz.iter().zip(&curves.output_impedance_ohm);
    let Some((frequency_hz, ohm)) = pairs.max_by(|one, other| one.1.total_cmp(other.1)) else { return };
    if !plot.x.holds(*frequency_hz) {
        return;
    }
    let at = plot.at(*frequency_hz, *ohm);
    painter.circle_filled(at, 3.5, palette.good);
    let text = format!(
        "{} at {}",
        quantity::print_digits(*ohm, Unit::Ohm, 3),
        quantity::print_digits(*frequency_hz, Unit::Hertz, 3)
    );
    // Above the peak and at its right, pushed back to the left as far as the plot makes it: the closed-loop curve lies below.
    let at = at + vec2(6.0, if at.y - plot.rect.top() > 40.0 { -13.0 } else { 15.0 });
    let ground = palette.canvas.gamma_multiply(0.8);
    let clipped = painter.with_clip_rect(plot.rect);
    plot::tag(&clipped, at, Align2::LEFT_CENTER, &text, theme::strong(12.0), (palette.good, ground));
}

/// Draws the least margin between filter and converter.
fn margin(painter: &egui::Painter, plot: &Plot, result: &InputFilterResult, palette: &Palette) {
    let least = result.least_margin();
    if !plot.x.holds(least.frequency_hz) {
        return;
    }
    let ends = [least.filter_ohm, least.converter_ohm].map(|ohm| plot.at(least.frequency_hz, ohm));
    let colour = if least.margin_db < 0.0 { palette.problem } else { palette.good };
    painter.line_segment(ends, Stroke::new(theme::CURVE, colour));
    for end in ends {
        painter.circle_filled(end, 3.0, colour);
    }
    let (x, y) = (ends[0].x, 0.5 * (ends[0].y + ends[1].y));
    let at_left = x + 160.0 > plot.rect.right();
    let align = if at_left { Align2::RIGHT_CENTER } else { Align2::LEFT_CENTER };
    let x = if at_left { x - 10.0 } else { x + 10.0 };
    let ground = palette.canvas.gamma_multiply(0.8);
    let words = crate::figure::margin_in_words(result);
    plot::tag(painter, pos2(x, y), align, &words, theme::strong(11.0), (colour, ground));
}

/// What the lines mean: values, name, term and pen of each.
struct Legend<'a> {
    rows: Vec<(&'a [f64], &'static str, &'static str, Pen)>,
    unit: Unit,
}

impl<'a> Legend<'a> {
    fn new(
        which: ClosedLoop,
        (closed, open, unit): (&'a [f64], Option<&'a [f64]>, Unit),
        beside: &[(&'a [f64], &'static str)],
        palette: &Palette,
    ) -> Self {
        let names = match which {
            ClosedLoop::Input => ["Zi, closed loop", "ZD, open loop"],
            _ => ["closed loop", "open loop"],
        };
        let mut rows = vec![(closed, names[0], "closed-loop", closed_pen(palette))];
        rows.extend(open.map(|values| (values, names[1], "open-loop", open_pen(palette))));
        rows.extend(beside.iter().map(|(values, name)| (*values, *name, "input-impedance", beside_pen(name, palette))));
        Legend { rows, unit }
    }
}

/// The linked line under the pointer, the values there, and what the lines mean.
fn read(ui: &Ui, plot: &Plot, legend: &Legend<'_>, desk: &mut Desk<'_>, palette: &Palette) {
    let unit = legend.unit;
    let painter = ui.painter().with_clip_rect(plot.rect);
    let pointer = ui.input(|input| input.pointer.hover_pos()).filter(|at| plot.rect.contains(*at));
    let cursor_hz = pointer.map(|at| plot.x.value(at.x)).or(desk.view.cursor_hz);
    let log_hz = &desk.session.drawing().log_hz;
    let value = |values: &[f64]| {
        let value = axis::interpolate(log_hz, values, cursor_hz?.log10())?;
        Some(format!("  {}", quantity::print_digits(value, unit, 3)))
    };
    if let Some(frequency_hz) = cursor_hz {
        painter.vline(plot.x.at(frequency_hz), plot.rect.y_range(), Stroke::new(1.0, palette.weak.gamma_multiply(0.6)));
    }
    let mut y = plot.rect.top() + 12.0;
    for (values, name, term, pen) in &legend.rows {
        let text = format!("{name}{}", value(values).unwrap_or_default());
        let ground = palette.canvas.gamma_multiply(0.85);
        let rect = plot::tag(
            &painter,
            pos2(plot.rect.left() + 34.0, y),
            Align2::LEFT_CENTER,
            &text,
            theme::small(),
            (palette.weak, ground),
        );
        plot::sample(&painter, pos2(plot.rect.left() + 8.0, rect.center().y), 20.0, *pen);
        let response = ui.interact(rect, ui.scope_id().with(name), egui::Sense::hover());
        response.widget_info(|| egui::WidgetInfo::labeled(egui::Role::Label, true, &text));
        super::explain::explained(ui, response, term, super::explain::nothing);
        y += 15.0;
    }
    let below = pointer.map(|at| plot.x.value(at.x));
    if below != desk.view.cursor_below_hz {
        // The plots above are already drawn; they follow in the next frame.
        desk.view.cursor_below_hz = below;
        ui.ctx().request_repaint();
    }
}
