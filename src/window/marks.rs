//! What is marked on the stack: crossover and margins, landmarks of the plant, the crossover window, frequencies.

use eframe::egui::{self, Align2, Painter, Rect, Sense, Shape, Stroke, Ui, pos2, vec2};

use super::axis::{DecadeLine, decade_lines};
use super::bode::Stack;
use super::plot;
use super::theme::{self, LineStyle, Palette};
use crate::analysis::{Analysis, Detail, Level, LimitKind, Readout};
use crate::quantity::{self, Unit};

/// Draws crossover, phase margin and gain margin of the shown condition.
pub(super) fn margins(painter: &Painter, stack: &Stack, analysis: &Analysis, detail: &Detail, palette: &Palette) {
    let margins = &detail.loop_gain.margins;
    let stable = detail.loop_gain.stable();
    for crossover in &margins.crossovers {
        painter.circle_filled(stack.gain.at(crossover.frequency_hz, 0.0), 3.0, palette.loop_gain);
    }
    for crossing in &margins.phase_crossovers {
        let wanted = Some(crossing.gain_margin_db);
        if wanted == margins.gain_margin_up_db() || wanted == margins.gain_margin_down_db() {
            let colour = colour(analysis, "gain-margin", stable, palette);
            gain_margin(painter, stack, crossing.frequency_hz, crossing.gain_margin_db, (colour, palette));
        }
    }
    let Some(headline) = margins.headline_crossover() else { return };
    let frequency_hz = headline.frequency_hz;
    if !stack.gain.x.holds(frequency_hz) {
        return;
    }
    let colour_of_crossover = colour(analysis, "crossover", stable, palette);
    let x = stack.gain.x.at(frequency_hz);
    painter.vline(x, stack.whole(), Stroke::new(1.2, colour_of_crossover));
    painter.circle_filled(stack.gain.at(frequency_hz, 0.0), 4.0, colour_of_crossover);
    let text = quantity::print_digits(frequency_hz, Unit::Hertz, 3);
    label(painter, stack.gain.rect, (x, stack.gain.y.at(0.0) - 11.0), &text, (colour_of_crossover, palette.canvas));
    let colour = colour(analysis, "phase-margin", stable, palette);
    phase_margin(painter, stack, detail, (frequency_hz, headline.phase_margin_deg), (colour, palette));
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
    let middle = from.y.midpoint(to.y).clamp(stack.phase.rect.top() + 9.0, stack.phase.rect.bottom() - 9.0);
    label(&painter, stack.phase.rect, (from.x, middle), &text, (colour, palette.canvas));
}

fn gain_margin(
    painter: &Painter,
    stack: &Stack,
    frequency_hz: f64,
    margin_db: f64,
    colours: (egui::Color32, &Palette),
) {
    let (colour, palette) = colours;
    if !stack.gain.x.holds(frequency_hz) {
        return;
    }
    let (from, to) = (stack.gain.at(frequency_hz, 0.0), stack.gain.at(frequency_hz, -margin_db));
    let painter = painter.with_clip_rect(stack.gain.rect);
    painter.line_segment([from, to], Stroke::new(3.5, colour));
    let text = quantity::print_digits(margin_db, Unit::Decibel, 3);
    let side = if margin_db > 0.0 { -11.0 } else { 11.0 };
    label(&painter, stack.gain.rect, (from.x, from.y + side), &text, (colour, palette.canvas));
}

/// A number beside a mark, kept within the plot.
fn label(painter: &Painter, bounds: Rect, at: (f32, f32), text: &str, colours: (egui::Color32, egui::Color32)) {
    let (colour, ground) = colours;
    let left = at.0 > bounds.right() - 80.0;
    let (x, align) = if left { (at.0 - 9.0, Align2::RIGHT_CENTER) } else { (at.0 + 9.0, Align2::LEFT_CENTER) };
    plot::tag(painter, pos2(x, at.1), align, text, theme::strong(12.5), (colour, ground.gamma_multiply(0.82)));
}

/// Draws landmarks across the stack, and under it their names, the frequencies and the crossover window.
pub(super) fn foot_ui(ui: &mut Ui, stack: &Stack, analysis: &Analysis, palette: &Palette) {
    if let Ok(detail) = &analysis.shown {
        landmarks_ui(ui, stack, detail, palette);
    }
    frequencies(ui.painter(), stack, palette);
    window_ui(ui, stack, analysis, palette);
}

fn landmarks_ui(ui: &mut Ui, stack: &Stack, detail: &Detail, palette: &Palette) {
    let mut landmarks: Vec<_> = detail.landmarks.iter().filter(|mark| stack.gain.x.holds(mark.frequency_hz)).collect();
    landmarks.sort_by(|one, other| one.frequency_hz.total_cmp(&other.frequency_hz));
    let mut taken = [f32::NEG_INFINITY; 2];
    for landmark in landmarks {
        let x = stack.gain.x.at(landmark.frequency_hz);
        let line = [pos2(x, stack.whole().min), pos2(x, stack.whole().max)];
        let dots = Shape::dashed_line(&line, Stroke::new(1.0, palette.landmark.gamma_multiply(0.75)), 1.5, 3.5);
        ui.painter().extend(dots);
        let galley = ui.painter().layout_no_wrap(landmark.name.to_owned(), theme::small(), palette.landmark);
        let half = galley.size().x / 2.0;
        let left = (x - half).clamp(stack.foot.left() + 4.0, (stack.foot.right() - 2.0 * half - 4.0).max(0.0));
        let Some(row) = (0..2_u8).find(|row| taken[usize::from(*row)] + 8.0 < left) else {
            continue;
        };
        taken[usize::from(row)] = left + 2.0 * half;
        let at = pos2(left, stack.foot.top() + 1.0 + 13.0 * f32::from(row));
        let rect = Rect::from_min_size(at, galley.size());
        ui.painter().galley(at, galley, palette.landmark);
        let help = format!(
            "{}: {}\n{}{}",
            landmark.name,
            quantity::print(landmark.frequency_hz, Unit::Hertz),
            landmark.formula,
            if landmark.derived { "\nderived from the model" } else { "" }
        );
        let _ = ui
            .interact(rect.expand(2.0), ui.scope_id().with(("landmark", landmark.key, landmark.name)), Sense::hover())
            .on_hover_text(help);
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
        painter.text(pos2(plot.left(), y), Align2::LEFT_CENTER, text, theme::small(), palette.amber);
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
    let name = |edge: &crate::analysis::WindowEdge| {
        let cause = edge.cause.split(" at ").next().unwrap_or_default();
        format!("{}: {cause}", quantity::print_digits(edge.frequency_hz, Unit::Hertz, 2))
    };
    let mut help = vec!["Crossover window: the crossover frequencies this stage allows.".to_owned()];
    let ground = palette.canvas;
    if let Some(edge) = &window.lower {
        plot::tag(
            &painter,
            pos2(left - 6.0, y),
            Align2::RIGHT_CENTER,
            &name(edge),
            theme::small(),
            (palette.weak, ground),
        );
        help.push(format!("least {}: {}", quantity::print(edge.frequency_hz, Unit::Hertz), edge.cause));
    }
    if let Some(edge) = &window.upper {
        plot::tag(
            &painter,
            pos2(right + 6.0, y),
            Align2::LEFT_CENTER,
            &name(edge),
            theme::small(),
            (palette.weak, ground),
        );
        help.push(format!("greatest {}: {}", quantity::print(edge.frequency_hz, Unit::Hertz), edge.cause));
    }
    let bar = Rect::from_x_y_ranges(left..=right, (y - 7.0)..=(y + 7.0));
    let _ = ui.interact(bar, ui.scope_id().with("crossover window"), Sense::hover()).on_hover_text(help.join("\n"));
}

/// A dotted vertical tick, used for marks of time as well.
pub(super) fn tick(painter: &Painter, rect: Rect, x: f32, colour: egui::Color32) {
    let pen = plot::Pen { colour, width: 1.0, style: LineStyle::Dotted };
    plot::stroke(painter, vec![pos2(x, rect.top()), pos2(x, rect.top()) + vec2(0.0, rect.height())], pen);
}
