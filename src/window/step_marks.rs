//! Marks of a time response: deviation or overshoot, settling, the values under the pointer, and the same in words.
//!
//! *Conventions*: a load or line step is judged by the extreme against the value before it; a reference step by how far the output
//! runs beyond its new value, since the change itself is wanted.

use eframe::egui::{Align2, Color32, Role, Sense, Stroke, Ui, WidgetInfo, pos2, vec2};

use super::axis;
use super::marks;
use super::plot::{self, Plot};
use super::theme::{self, Palette};
use super::view::Event;
use crate::analysis::{Analysis, Step};
use crate::quantity::{self, Unit};

/// Which of a response's requirements the shown condition misses.
#[derive(Clone, Copy, Debug, Default)]
pub(super) struct Missed {
    /// That on the deviation.
    pub deviation: bool,
    /// That on settling.
    pub settling: bool,
}

impl Missed {
    /// What is missed of an event; only a load step is asked anything.
    pub(super) fn of(event: Event, analysis: &Analysis) -> Self {
        let missed = |key| {
            let of_key = analysis.readouts.iter().find(|readout| readout.key == key);
            event == Event::Load && of_key.is_some_and(|readout| marks::misses(readout, analysis))
        };
        Missed { deviation: missed("load-step-deviation"), settling: missed("settling") }
    }
}

/// Draws the marks of a step into its plot.
pub(super) fn marks_ui(ui: &Ui, plot: &Plot, step: &Step, event: Event, look: (&Missed, &Palette)) {
    let (missed, palette) = look;
    let ink = |missed| if missed { palette.amber } else { palette.good };
    // The line first: the words of the extreme have a ground of their own.
    if let Some(settling_s) = step.settling_s.filter(|time| *time > 0.0 && plot.x.holds(*time)) {
        let colour = ink(missed.settling);
        marks::tick(&ui.painter().with_clip_rect(plot.rect), plot.rect, plot.x.at(settling_s), colour);
    }
    let extreme = extreme(step, event);
    if let Some(extreme) = &extreme {
        extreme_ui(ui, plot, extreme, (ink(missed.deviation), palette));
    }
    let words = words(step, event);
    let rises = step.deviation_v > 0.0;
    let at = if rises { plot.rect.right_bottom() - vec2(8.0, 11.0) } else { plot.rect.right_top() + vec2(-8.0, 11.0) };
    let colours = (palette.weak, palette.canvas.gamma_multiply(0.85));
    let painter = ui.painter().with_clip_rect(plot.rect);
    plot::tag(&painter, at, Align2::RIGHT_CENTER, &words, theme::small(), colours);
    announce(
        ui,
        plot,
        event,
        &format!("{words}{}", extreme.map_or_else(String::new, |mark| format!(", {}", mark.text))),
    );
    cursor(ui, plot, step, palette);
}

/// The extreme that is marked: between which values, when, and in words.
#[derive(Clone, Debug, PartialEq)]
struct Extreme {
    at_s: f64,
    from_v: f64,
    to_v: f64,
    text: String,
}

/// Distance of the extreme's words from it [points].
const BEYOND: f32 = 12.0;

fn extreme(step: &Step, event: Event) -> Option<Extreme> {
    let (at_s, to_v) = (step.deviation_at_s?, step.initial_v + step.deviation_v);
    let volts = |value: f64| quantity::print_digits(value, Unit::Volt, 3);
    if event != Event::Reference {
        return Some(Extreme { at_s, from_v: step.initial_v, to_v, text: volts(step.deviation_v) });
    }
    let change = step.final_v - step.initial_v;
    let beyond = to_v - step.final_v;
    // What only creeps up to its new value has no overshoot; a thousandth of the change is not seen in the plot either.
    (beyond * change > 1e-3 * change * change).then(|| Extreme {
        at_s,
        from_v: step.final_v,
        to_v,
        text: format!("{} beyond", volts(beyond)),
    })
}

/// A line from where it came, and its size beyond it, where the curve does not go.
fn extreme_ui(ui: &Ui, plot: &Plot, extreme: &Extreme, look: (Color32, &Palette)) {
    let (colour, palette) = look;
    let painter = ui.painter().with_clip_rect(plot.rect);
    let (from, to) = (plot.at(extreme.at_s, extreme.from_v), plot.at(extreme.at_s, extreme.to_v));
    painter.line_segment([from, to], Stroke::new(1.5, colour));
    let ground = palette.canvas.gamma_multiply(0.85);
    let beyond = if to.y > from.y { BEYOND } else { -BEYOND };
    let at = pos2(to.x, (to.y + beyond).clamp(plot.rect.top() + 8.0, plot.rect.bottom() - 9.0));
    plot::tag(&painter, at, Align2::CENTER_CENTER, &extreme.text, theme::strong(12.5), (colour, ground));
}

/// The event and whether it settles.
fn words(step: &Step, event: Event) -> String {
    let unit = if event == Event::Load { Unit::Ampere } else { Unit::Volt };
    let sign = if step.size > 0.0 { "+" } else { "" };
    let size = quantity::print_digits(step.size, unit, 3);
    let band = quantity::print_digits(step.band_v, Unit::Volt, 3);
    match step.settling_s {
        Some(0.0) => format!("{sign}{size}: stays within ±{band}"),
        Some(time) => format!("{sign}{size}: settles to ±{band} in {}", quantity::print_digits(time, Unit::Second, 3)),
        None => format!("{sign}{size}: does not settle to ±{band} here"),
    }
}

/// Tells screen readers what the plot shows.
fn announce(ui: &Ui, plot: &Plot, event: Event, words: &str) {
    let name = super::steps::NAMES.iter().find(|(which, ..)| *which == event).map_or("", |(_, name, ..)| name);
    let text = format!("{name} plot: {words}");
    let response = ui.interact(plot.rect, ui.scope_id().with("step plot"), Sense::hover());
    response.widget_info(|| WidgetInfo::labeled(Role::Image, true, &text));
}

/// Time and value under the pointer.
fn cursor(ui: &Ui, plot: &Plot, step: &Step, palette: &Palette) {
    let pointer = ui.input(|input| input.pointer.hover_pos()).filter(|at| plot.rect.contains(*at));
    let Some(time_s) = pointer
        .filter(|at| ui.rect_contains_pointer(plot.rect.intersect(ui.clip_rect())) && at.x > 0.0)
        .map(|at| plot.x.value(at.x))
    else {
        return;
    };
    let Some(value) = axis::interpolate(&step.times_s, &step.output_v, time_s) else { return };
    let painter = ui.painter().with_clip_rect(plot.rect);
    let at = plot.at(time_s, value);
    painter.vline(at.x, plot.rect.y_range(), Stroke::new(1.0, palette.weak.gamma_multiply(0.6)));
    painter.circle_filled(at, 3.0, palette.loop_gain);
    let text = format!(
        "{}  {}",
        quantity::print_digits(time_s, Unit::Second, 3),
        quantity::print_digits(value, Unit::Volt, 5)
    );
    let above = if at.y > plot.rect.center().y { -14.0 } else { 14.0 };
    let on_left = at.x > plot.rect.center().x;
    let (align, way) = if on_left { (Align2::RIGHT_CENTER, -8.0) } else { (Align2::LEFT_CENTER, 8.0) };
    let colours = (palette.ink, palette.bar);
    plot::tag(&painter, pos2(at.x + way, at.y + above), align, &text, theme::small(), colours);
}

#[cfg(test)]
mod tests {
    use super::*;

    fn step(initial_v: f64, final_v: f64, peak_v: f64, settling_s: Option<f64>) -> Step {
        Step {
            times_s: vec![0.0, 1e-4, 2e-4],
            output_v: vec![initial_v, peak_v, final_v],
            deviation_v: peak_v - initial_v,
            deviation_at_s: Some(1e-4),
            settling_s,
            initial_v,
            final_v,
            band_v: 0.05,
            control_v: (0.0, 1.0),
            size: final_v - initial_v,
            rise_s: 1e-6,
        }
    }

    #[test]
    fn a_reference_step_is_judged_by_what_lies_beyond_its_new_value() {
        let mark = extreme(&step(5.0, 5.1, 5.12, Some(1e-4)), Event::Reference).unwrap();
        assert!((mark.to_v - 5.12).abs() < 1e-12 && (mark.from_v - 5.1).abs() < 1e-12);
        assert!(mark.text.starts_with("20 mV"), "{}", mark.text);
        assert_eq!(extreme(&step(5.0, 5.1, 5.1, None), Event::Reference), None);
        let down = extreme(&step(5.0, 4.9, 4.88, None), Event::Reference).unwrap();
        assert!(down.text.starts_with("\u{2212}20 mV"), "{}", down.text);
        let load = extreme(&step(5.0, 5.0, 4.9, Some(1e-4)), Event::Load).unwrap();
        assert!((load.from_v - 5.0).abs() < 1e-12 && load.text.starts_with("\u{2212}100 mV"));
    }

    #[test]
    fn a_fall_is_written_with_its_own_sign() {
        assert!(words(&step(5.0, 4.9, 4.88, None), Event::Reference).starts_with('\u{2212}'));
        assert!(words(&step(5.0, 5.1, 5.12, Some(0.0)), Event::Reference).contains("stays within"));
        assert!(words(&step(5.0, 5.1, 5.12, Some(0.0)), Event::Reference).starts_with('+'));
    }
}
