//! What is marked on the stack: crossover and margins, landmarks of the plant, the crossover window, frequencies.

use eframe::egui::{self, Align2, Painter, Rect, Role, Sense, Shape, Stroke, Ui, WidgetInfo, pos2, vec2};

use super::axis::{DecadeLine, decade_lines};
use super::bode::Stack;
use super::labels::{self, Labels};
use super::plot;
use super::pointed::Pointed;
use super::theme::{self, LineStyle, Palette};
use super::view::Desk;
use crate::analysis::{Analysis, Detail, Level, LimitKind, Readout, terms};
use crate::quantity::{self, Unit};

/// Length below which a bar has its number above or below it [points].
const SHORT_BAR: f32 = 18.0;

/// Draws crossover, phase margin and gain margin of the shown condition.
pub(super) fn margins(painter: &Painter, stack: &Stack, analysis: &Analysis, detail: &Detail, palette: &Palette) {
    let margins = &detail.loop_gain.margins;
    let stable = detail.loop_gain.stable();
    for crossover in &margins.crossovers {
        painter.circle_filled(stack.gain.at(crossover.frequency_hz, 0.0), 3.0, palette.loop_gain);
    }
    // All marks come before all numbers, so that no line strikes through a number.
    let mut labels = Labels::default();
    let wanted = [margins.gain_margin_up_db(), margins.gain_margin_down_db()];
    let of_gain: Vec<_> = margins
        .phase_crossovers
        .iter()
        .filter(|crossing| wanted.contains(&Some(crossing.gain_margin_db)) && stack.gain.x.holds(crossing.frequency_hz))
        .map(|crossing| (crossing.frequency_hz, crossing.gain_margin_db))
        .collect();
    let colour_of_gain = colour(analysis, "gain-margin", stable, palette);
    for (frequency_hz, margin_db) in &of_gain {
        gain_margin(painter, stack, (*frequency_hz, *margin_db), colour_of_gain, &mut labels);
    }
    let headline = margins.headline_crossover().filter(|crossover| stack.gain.x.holds(crossover.frequency_hz));
    if let Some(headline) = headline {
        let colour_of_crossover = colour(analysis, "crossover", stable, palette);
        crossover(painter, stack, headline.frequency_hz, (colour_of_crossover, palette), &mut labels);
        let colour = colour(analysis, "phase-margin", stable, palette);
        phase_margin(painter, stack, detail, (headline.frequency_hz, headline.phase_margin_deg), (colour, palette));
    }
    for at in of_gain {
        gain_margin_label(painter, stack, at, (colour_of_gain, palette), &mut labels);
    }
}

/// The line at the crossover and its frequency.
fn crossover(
    painter: &Painter,
    stack: &Stack,
    frequency_hz: f64,
    colours: (egui::Color32, &Palette),
    labels: &mut Labels,
) {
    let (colour, palette) = colours;
    let at = stack.gain.at(frequency_hz, 0.0);
    painter.vline(at.x, stack.whole(), Stroke::new(1.2, colour));
    painter.circle_filled(at, 4.0, colour);
    labels.keep_off(at.x, stack.gain.rect.top(), stack.gain.rect.bottom());
    let text = quantity::print_digits(frequency_hz, Unit::Hertz, 3);
    let places = labels::around(at, true);
    labels.write(painter, stack.gain.rect, &places, &text, (colour, palette.canvas));
}

/// Green for a margin that is there, amber for one that misses what is asked, weak for those of an unstable loop.
fn colour(analysis: &Analysis, key: &str, stable: bool, palette: &Palette) -> egui::Color32 {
    let readout = analysis.readouts.iter().find(|readout| readout.key == key);
    match readout {
        _ if !stable => palette.held,
        Some(readout) if misses(readout, analysis) => palette.amber,
        _ => palette.good,
    }
}

/// True when the value at the shown condition is beyond a limit asked of all conditions, or of the nominal one when that is shown.
pub(super) fn misses(readout: &Readout, analysis: &Analysis) -> bool {
    let nominal = analysis.condition.levels == Some((Level::Nominal, Level::Nominal));
    readout.value.is_some_and(|value| {
        let asked = readout.requirements.iter().filter(|verdict| verdict.over_all_conditions || nominal);
        asked.into_iter().any(|verdict| match verdict.kind {
            LimitKind::AtLeast => value < verdict.limit,
            LimitKind::AtMost => value.abs() > verdict.limit,
        })
    })
}

fn phase_margin(painter: &Painter, stack: &Stack, detail: &Detail, at: (f64, f64), colours: (egui::Color32, &Palette)) {
    let ((frequency_hz, margin_deg), (colour, palette)) = (at, colours);
    let curves = &detail.curves;
    let after = curves.frequencies_hz.partition_point(|frequency| *frequency < frequency_hz);
    let Some(phase) = curves.loop_deg.get(after).or(curves.loop_deg.last()) else { return };
    // The half turn the margin is measured from is the one nearest to where the curve minus the margin lies.
    let turns = ((phase - margin_deg + 180.0) / 360.0).round();
    let foot = turns.mul_add(360.0, -180.0);
    let (from, to) = (stack.phase.at(frequency_hz, foot), stack.phase.at(frequency_hz, foot + margin_deg));
    let painter = painter.with_clip_rect(stack.phase.rect);
    painter.line_segment([from, to], Stroke::new(3.5, colour));
    let text = quantity::print_digits(margin_deg, Unit::Degree, 3);
    let middle = from.y.midpoint(to.y).clamp(stack.phase.rect.top() + 11.0, stack.phase.rect.bottom() - 11.0);
    // Beside a short bar the number would lie on the line the margin is measured from.
    let short = (to.y - from.y).abs() < SHORT_BAR;
    let places = if short { labels::around(pos2(from.x, middle), true) } else { labels::beside(from.x, &[middle]) };
    Labels::default().write(&painter, stack.phase.rect, &places, &text, (colour, palette.canvas));
}

/// The bar between 0 dB and the gain at a phase crossover.
fn gain_margin(painter: &Painter, stack: &Stack, at: (f64, f64), colour: egui::Color32, labels: &mut Labels) {
    let (frequency_hz, margin_db) = at;
    let (from, to) = (stack.gain.at(frequency_hz, 0.0), stack.gain.at(frequency_hz, -margin_db));
    painter.with_clip_rect(stack.gain.rect).line_segment([from, to], Stroke::new(3.5, colour));
    labels.keep_off(from.x, from.y, to.y);
}

/// The number of a gain margin: beyond the end of its bar at 0 dB, else beside the bar.
fn gain_margin_label(
    painter: &Painter,
    stack: &Stack,
    at: (f64, f64),
    colours: (egui::Color32, &Palette),
    labels: &mut Labels,
) {
    let (colour, palette) = colours;
    let (frequency_hz, margin_db) = at;
    let (from, to) = (stack.gain.at(frequency_hz, 0.0), stack.gain.at(frequency_hz, -margin_db));
    let mut places = labels::around(from, margin_db > 0.0);
    let end = to.y.clamp(stack.gain.rect.top() + 11.0, stack.gain.rect.bottom() - 11.0);
    places.extend(labels::beside(from.x, &[from.y.midpoint(end), end]));
    let text = quantity::print_digits(margin_db, Unit::Decibel, 3);
    labels.write(painter, stack.gain.rect, &places, &text, (colour, palette.canvas));
}

/// Draws landmarks across the stack, and under it their names, the frequencies and the crossover window.
pub(super) fn foot_ui(ui: &mut Ui, stack: &Stack, analysis: &Analysis, desk: &mut Desk<'_>) {
    let palette = theme::palette(ui);
    if let Ok(detail) = &analysis.shown {
        landmarks_ui(ui, stack, detail, desk);
    }
    frequencies(ui.painter(), stack, palette);
    window_ui(ui, stack, analysis, palette);
}

fn landmarks_ui(ui: &mut Ui, stack: &Stack, detail: &Detail, desk: &mut Desk<'_>) {
    let palette = theme::palette(ui);
    let mut landmarks: Vec<_> = detail.landmarks.iter().filter(|mark| stack.gain.x.holds(mark.frequency_hz)).collect();
    landmarks.sort_by(|one, other| one.frequency_hz.total_cmp(&other.frequency_hz));
    let mut taken = [f32::NEG_INFINITY; 2];
    for landmark in landmarks {
        let x = stack.gain.x.at(landmark.frequency_hz);
        let line = [pos2(x, stack.whole().min), pos2(x, stack.whole().max)];
        let lit = desk.lit_landmark(landmark);
        let colour = if lit { palette.plant } else { palette.landmark };
        let pen = if lit { Stroke::new(1.8, colour) } else { Stroke::new(1.0, colour.gamma_multiply(0.75)) };
        ui.painter().extend(Shape::dashed_line(&line, pen, 1.5, 3.5));
        let galley = ui.painter().layout_no_wrap(landmark.name.to_owned(), theme::small(), colour);
        let half = galley.size().x / 2.0;
        let left = (x - half).clamp(stack.foot.left() + 4.0, (stack.foot.right() - 2.0 * half - 4.0).max(0.0));
        let Some(row) = (0..2_u8).find(|row| taken[usize::from(*row)] + 8.0 < left) else {
            continue;
        };
        taken[usize::from(row)] = left + 2.0 * half;
        let at = pos2(left, stack.foot.top() + 1.0 + 13.0 * f32::from(row));
        let rect = Rect::from_min_size(at, galley.size());
        ui.painter().galley(at, galley, colour);
        let name = || format!("{}: {}", landmark.name, quantity::print(landmark.frequency_hz, Unit::Hertz));
        let id = ui.scope_id().with(("landmark", landmark.key, landmark.name));
        let response = ui.interact(rect.expand(2.0), id, Sense::hover());
        response.widget_info(|| WidgetInfo::labeled(Role::Label, true, name()));
        desk.view.point(Pointed::Landmark(landmark.key), &response);
        let _ = super::explain::described(ui, response, || format!("{}\n{}", name(), terms::of_landmark(landmark)));
    }
}

fn frequencies(painter: &Painter, stack: &Stack, palette: &Palette) {
    let x = stack.gain.x;
    let (from, to) = x.range();
    let wide = (to / from).log10() > 1.6;
    let y = stack.foot.top() + 34.0;
    for DecadeLine { value, digit } in decade_lines(from, to) {
        if digit == 1 || (!wide && matches!(digit, 2 | 5)) {
            let at = pos2(x.at(value).clamp(stack.foot.left() + 20.0, stack.foot.right() - 22.0), y);
            let text = quantity::print_digits(value, Unit::Hertz, 1);
            painter.text(at, Align2::CENTER_CENTER, text, theme::small(), palette.weak);
        }
    }
}

/// The crossover window as a bar with its edges named.
fn window_ui(ui: &mut Ui, stack: &Stack, analysis: &Analysis, palette: &Palette) {
    let window = &analysis.window;
    let y = stack.foot.top() + 50.0;
    let plot = stack.gain.rect;
    if !window.empty.is_empty() {
        let text = format!("crossover window {}", window.empty);
        let painter = ui.painter().with_clip_rect(stack.foot);
        let at = pos2(plot.left(), y);
        let rect = painter.text(at, Align2::LEFT_CENTER, &text, theme::small(), palette.amber);
        explained_ui(ui, rect, &text);
        return;
    }
    let edge = |at: Option<f64>, otherwise: f32| {
        at.map_or(otherwise, |frequency| stack.gain.x.at(frequency).clamp(plot.left(), plot.right()))
    };
    let left = edge(window.lower.as_ref().map(|edge| edge.frequency_hz), plot.left());
    let right = edge(window.upper.as_ref().map(|edge| edge.frequency_hz), plot.right());
    if window.lower.is_none() && window.upper.is_none() {
        return;
    }
    let painter = ui.painter().with_clip_rect(stack.foot);
    painter.rect_filled(
        Rect::from_x_y_ranges(left..=right, (y - 2.5)..=(y + 2.5)),
        2.5,
        palette.good.gamma_multiply(0.55),
    );
    // Cause and frequency where both fit beside the bar, else the frequency alone.
    let name = |edge: &crate::analysis::WindowEdge, room: f32| {
        let cause = edge.cause.split(" at ").next().unwrap_or_default();
        let frequency = quantity::print_digits(edge.frequency_hz, Unit::Hertz, 2);
        let text = format!("{frequency}: {cause}");
        let width = painter.layout_no_wrap(text.clone(), theme::small(), palette.weak).size().x;
        if width + 8.0 < room { text } else { frequency }
    };
    let mut help = vec!["Crossover window: the crossover frequencies this stage allows.".to_owned()];
    let mut whole = Rect::from_x_y_ranges(left..=right, (y - 7.0)..=(y + 7.0));
    let sides = [
        (&window.lower, "least", pos2(left - 6.0, y), (Align2::RIGHT_CENTER, left - 6.0 - stack.foot.left())),
        (&window.upper, "greatest", pos2(right + 6.0, y), (Align2::LEFT_CENTER, stack.foot.right() - right - 6.0)),
    ];
    for (edge, word, at, (align, room)) in sides {
        let Some(edge) = edge else { continue };
        let colours = (palette.weak, palette.canvas);
        whole = whole.union(plot::tag(&painter, at, align, &name(edge, room), theme::small(), colours));
        help.push(format!("{word} {}: {}", quantity::print(edge.frequency_hz, Unit::Hertz), edge.cause));
    }
    explained_ui(ui, whole, &help.join("\n"));
}

/// Gives the crossover window its words, for the pointer and for screen readers.
fn explained_ui(ui: &Ui, rect: Rect, help: &str) {
    let response = ui.interact(rect, ui.scope_id().with("crossover window"), Sense::hover());
    response.widget_info(|| WidgetInfo::labeled(Role::Label, true, help));
    let _ = super::explain::explained(ui, response, "crossover-window", || help.to_owned());
}

/// A dotted vertical tick, used for marks of time as well.
pub(super) fn tick(painter: &Painter, rect: Rect, x: f32, colour: egui::Color32) {
    let pen = plot::Pen { colour, width: 1.0, style: LineStyle::Dotted };
    plot::stroke(painter, vec![pos2(x, rect.top()), pos2(x, rect.top()) + vec2(0.0, rect.height())], pen);
}
