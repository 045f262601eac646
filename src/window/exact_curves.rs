//! The exact curves on the Bode plots: broad and pale under the averaged ones, so that where both agree one runs within the other;
//! their switch, and up to where the averaged model holds.

use eframe::egui::{Align2, Painter, Rect, Role, Sense, Stroke, Ui, WidgetInfo, pos2};

use super::bode::{self, Stack};
use super::command::{Command, Curve};
use super::explain;
use super::legend;
use super::plot::{self, Pen};
use super::theme::{self, LineStyle, Palette, palette};
use super::view::Desk;
use crate::analysis::{Reach, ReachedBy, Referee};
use crate::quantity::{self, Unit};

/// The exact results that are shown.
fn shown<'a>(desk: &Desk<'a>) -> Option<&'a Referee> {
    desk.session.referee().filter(|_| desk.view.exact)?.as_ref().ok()
}

/// The pen of an exact curve; none for what is the same in both models.
fn pen(curve: Curve, palette: &Palette) -> Option<Pen> {
    match curve {
        Curve::Plant => Some(Pen { colour: palette.exact[0], ..loop_pen(palette) }),
        Curve::Loop => Some(loop_pen(palette)),
        Curve::Compensator => None,
    }
}

/// The pen of the exact loop gain and of what follows from it.
pub(super) fn loop_pen(palette: &Palette) -> Pen {
    Pen { colour: palette.exact[1], width: theme::EXACT_CURVE, style: LineStyle::Solid }
}

/// The exact closed-loop output impedance [Ω], where exact curves are shown.
pub(super) fn impedance<'a>(desk: &Desk<'a>) -> Option<&'a [f64]> {
    shown(desk).map(|exact| &*exact.curves.output_impedance_ohm)
}

/// Draws the exact curves of what is shown; the averaged ones come after.
pub(super) fn curves(painter: &Painter, stack: &Stack, desk: &Desk<'_>, palette: &Palette) {
    let Some(exact) = shown(desk) else { return };
    let curves = &exact.curves;
    let log_hz = desk.session.exact_log_hz();
    let of = [(Curve::Plant, &curves.plant_db, &curves.plant_deg), (Curve::Loop, &curves.loop_db, &curves.loop_deg)];
    for (curve, gain_db, phase_deg) in of {
        if let Some(pen) = pen(curve, palette).filter(|_| desk.view.shows(curve)) {
            stack.gain.curve(painter, log_hz, gain_db, pen);
            stack.phase.curve(painter, log_hz, phase_deg, pen);
        }
    }
}

/// The switch of the exact curves, at the right end of the row of pages, with what the exact loop reads under the cursor.
pub(super) fn switch_ui(ui: &mut Ui, rect: Rect, desk: &mut Desk<'_>) {
    let palette = palette(ui);
    let on = desk.view.exact;
    let ink = if on { palette.ink } else { palette.weak.gamma_multiply(0.6) };
    let painter = ui.painter().with_clip_rect(rect);
    let name = painter.layout_no_wrap("exact".to_owned(), theme::strong(12.0), ink);
    let reading = reading(desk).map(|text| painter.layout_no_wrap(text, theme::small(), palette.ink));
    let width = SAMPLE + 5.0 + name.size().x + reading.as_ref().map_or(0.0, |galley| galley.size().x + 6.0);
    let middle = rect.center().y;
    let left = rect.right() - width;
    if left < rect.left() {
        return;
    }
    if let (Some(plant), Some(of_loop)) = (pen(Curve::Plant, palette), pen(Curve::Loop, palette)) {
        let pale = |pen: Pen| if on { pen } else { Pen { colour: pen.colour.gamma_multiply(0.5), ..pen } };
        plot::sample(&painter, pos2(left, middle), SAMPLE / 2.0, pale(plant));
        plot::sample(&painter, pos2(left + SAMPLE / 2.0, middle), SAMPLE / 2.0, pale(of_loop));
    }
    let mut x = left + SAMPLE + 5.0;
    for galley in std::iter::once(name).chain(reading) {
        let size = galley.size();
        painter.galley(pos2(x, middle - size.y / 2.0), galley, palette.ink);
        x += size.x + 6.0;
    }
    let press = Rect::from_min_max(pos2(left - 2.0, middle - 9.0), pos2(rect.right() + 2.0, middle + 9.0));
    let response = ui.interact(press, ui.scope_id().with("exact curves"), Sense::click());
    response.widget_info(|| WidgetInfo::selected(Role::CheckBox, true, on, "Exact curves"));
    legend::focus_ring(ui, &response);
    let further = || {
        let why = desk.session.referee().and_then(|exact| exact.as_ref().err());
        let why = why.map_or(String::new(), |finding| format!("{}\n", finding.message));
        format!("{why}Press to show or hide.")
    };
    if explain::explained(ui, response, "exact-curves", further).clicked() {
        desk.ask(Command::ToggleExact);
    }
}

/// Length of the piece of line beside the switch's name [points].
const SAMPLE: f32 = 26.0;

/// What the exact loop reads under the cursor.
fn reading(desk: &Desk<'_>) -> Option<String> {
    let at = desk.view.cursor_hz?.log10();
    let curves = &shown(desk)?.curves;
    let log_hz = desk.session.exact_log_hz();
    let value = |values: &[f64]| super::axis::interpolate(log_hz, values, at).filter(|value| value.is_finite());
    let tenth = |value: f64, unit| quantity::print_digits((value * 10.0).round() / 10.0, unit, 4);
    let (gain, phase) = (value(&curves.loop_db)?, value(&curves.loop_deg)?);
    Some(format!("loop {}  {}", tenth(gain, Unit::Decibel), tenth(phase, Unit::Degree)))
}

/// Up to where the averaged model holds, drawn between gain and phase along the frequency axis.
pub(super) fn reach_ui(ui: &mut Ui, stack: &Stack, desk: &Desk<'_>) {
    let Some(exact) = shown(desk) else { return };
    let palette = palette(ui);
    let plot = stack.gain.rect;
    let y = plot.bottom() + bode::GAP / 2.0;
    let (reach, end) = (exact.reach, exact.reach.frequency_hz.map_or(plot.left(), |hz| stack.gain.x.at(hz)));
    let end = end.clamp(plot.left(), plot.right());
    let painter = ui.painter().with_clip_rect(plot.expand(bode::GAP));
    let pen = Stroke::new(1.5, palette.landmark);
    painter.hline(plot.left()..=end, y, pen);
    let within = reach.frequency_hz.is_some_and(|hz| stack.gain.x.holds(hz));
    if within {
        painter.vline(end, (y - 5.0)..=(y + 5.0), pen);
    }
    let words = short(&reach);
    let width = painter.layout_no_wrap(words.clone(), theme::small(), palette.weak).size().x;
    // Before the end of the line where it has the room, else behind it.
    let (x, align) = if end - plot.left() > width + 24.0 {
        (end - 10.0, Align2::RIGHT_CENTER)
    } else {
        (end + 8.0, Align2::LEFT_CENTER)
    };
    let colours = (palette.weak, palette.canvas);
    let rect = plot::tag(&painter, pos2(x, y), align, &words, theme::small(), colours);
    let response = ui.interact(rect, ui.scope_id().with("reach"), Sense::hover());
    let said = in_words(&reach);
    response.widget_info(|| WidgetInfo::labeled(Role::Label, true, &said));
    let _ = explain::explained(ui, response, "averaged-reach", || said.clone());
}

fn short(reach: &Reach) -> String {
    match (reach.frequency_hz, reach.by) {
        (None, _) => "averaged holds nowhere".to_owned(),
        (Some(_), None) => "averaged holds throughout".to_owned(),
        (Some(hz), Some(_)) => format!("averaged holds to {}", quantity::print_digits(hz, Unit::Hertz, 3)),
    }
}

/// Up to where the averaged model holds, and what leaves first.
pub(super) fn in_words(reach: &Reach) -> String {
    let looked = quantity::print_digits(reach.looked_to_hz, Unit::Hertz, 3);
    match (reach.frequency_hz, reach.by) {
        (None, _) => "At no frequency are plant and loop gain within 1 dB and 5° of the exact ones.".to_owned(),
        (Some(_), None) => format!("Plant and loop gain are within 1 dB and 5° of the exact ones up to {looked}."),
        (Some(hz), Some(by)) => {
            let what = if by == ReachedBy::Plant { "the plant" } else { "the loop gain" };
            let hz = quantity::print_digits(hz, Unit::Hertz, 3);
            format!(
                "Up to {hz} plant and loop gain are within 1 dB and 5° of the exact ones; there {what} leaves first."
            )
        }
    }
}
