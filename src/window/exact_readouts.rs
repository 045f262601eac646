//! What the exact model says among the read-outs: its margins beside the averaged ones, and the multiplier that decides stability.

use eframe::egui::{Align2, Color32, FontId, Painter, Role, Sense, Ui, WidgetInfo, pos2, vec2};

use super::exact_curves;
use super::explain;
use super::plot;
use super::readouts::shown_column;
use super::theme::{self, Palette, palette};
use super::view::Desk;
use crate::analysis::{Analysis, Level, LimitKind, Readout, Referee, SwitchedStability};
use crate::quantity::{self, Unit};

/// Height of a row [points].
const ROW: f32 = 19.0;
/// Length of the mark before an exact value [points].
const MARK: f32 = 9.0;

/// The exact results that are known.
fn known<'a>(desk: &Desk<'a>) -> Option<&'a Referee> {
    desk.session.referee()?.as_ref().ok()
}

/// Read-outs that have an exact counterpart.
const COUNTERPARTS: [&str; 4] = ["crossover", "phase-margin", "gain-margin", "modulus-margin"];

/// The exact counterpart of one of them.
fn counterpart(key: &str, exact: &Referee) -> Option<f64> {
    let margins = &exact.margins;
    let headline = margins.headline_crossover();
    match key {
        "crossover" => headline.map(|crossover| crossover.frequency_hz),
        "phase-margin" => headline.map(|crossover| crossover.phase_margin_deg),
        "gain-margin" => margins.gain_margin_up_db(),
        _ => Some(margins.modulus_margin),
    }
}

/// An exact value ready to be written beside the averaged one.
pub(super) struct Beside {
    /// With its unit.
    text: String,
    colour: Color32,
}

impl Beside {
    /// The exact counterpart of a read-out; none where exact results are not shown or it has none.
    pub(super) fn of(readout: &Readout, analysis: &Analysis, desk: &Desk<'_>, palette: &Palette) -> Option<Self> {
        let exact = known(desk).filter(|_| COUNTERPARTS.contains(&readout.key))?;
        let value = counterpart(readout.key, exact);
        let text = value.map_or("none".to_owned(), |value| print(value, readout.unit));
        let colour = if !exact.stability.is_stable() {
            palette.held
        } else if value.is_some_and(|value| misses(readout, analysis, value)) {
            palette.amber
        } else {
            palette.ink
        };
        Some(Beside { text, colour })
    }

    /// For who does not see it.
    pub(super) fn said(&self) -> String {
        format!("exact {}", self.text)
    }

    /// Writes it from a place on, with as many words as there is room: the mark of the exact curves stands for the word.
    pub(super) fn write(&self, painter: &Painter, (x, middle, room): (f32, f32, f32), palette: &Palette) {
        let font: FontId = theme::small();
        let long = painter.layout_no_wrap(self.said(), font.clone(), self.colour);
        if long.size().x <= room {
            painter.galley(pos2(x, middle - long.size().y / 2.0), long, self.colour);
            return;
        }
        let short = painter.layout_no_wrap(self.text.clone(), font.clone(), self.colour);
        let number = self.text.split(' ').next().unwrap_or_default().to_owned();
        let shortest = painter.layout_no_wrap(number, font, self.colour);
        let Some(galley) = [short, shortest].into_iter().find(|galley| MARK + 3.0 + galley.size().x <= room) else {
            return;
        };
        plot::sample(painter, pos2(x, middle), MARK, exact_curves::loop_pen(palette));
        painter.galley(pos2(x + MARK + 3.0, middle - galley.size().y / 2.0), galley, self.colour);
    }
}

/// Angles and decibels to a tenth, as beside.
fn print(value: f64, unit: Unit) -> String {
    let value = if matches!(unit, Unit::Degree | Unit::Decibel) { (value * 10.0).round() / 10.0 } else { value };
    quantity::print_digits(value, unit, 3)
}

/// Whether an exact value misses what is asked of its averaged counterpart at the condition shown.
fn misses(readout: &Readout, analysis: &Analysis, value: f64) -> bool {
    let nominal = analysis.condition.levels == Some((Level::Nominal, Level::Nominal));
    let asked = readout.requirements.iter().filter(|verdict| verdict.over_all_conditions || nominal);
    asked.into_iter().any(|verdict| match verdict.kind {
        LimitKind::AtLeast => value < verdict.limit,
        LimitKind::AtMost => value > verdict.limit,
    })
}

/// The rows that only the exact model has: the greatest multiplier, and up to where the averaged model holds.
pub(super) fn rows_ui(ui: &mut Ui, desk: &Desk<'_>) {
    let palette = palette(ui);
    match desk.session.referee() {
        None => {}
        Some(Err(finding)) => {
            let text = eframe::egui::RichText::new(&finding.message).font(theme::small());
            ui.label(text.color(palette.weak));
        }
        Some(Ok(exact)) => {
            let size =
                exact.greatest_multiplier().map_or("none".to_owned(), |m| quantity::print_digits(m, Unit::One, 3));
            let stable = exact.stability.is_stable();
            let ink = if stable { palette.ink } else { palette.problem };
            let all = format!("All multipliers: {}.", multipliers(exact));
            row_ui(ui, "Greatest multiplier", (&size, ink), "multiplier", &all);
            let holds = exact.reach.frequency_hz;
            let holds = holds.map_or("nowhere".to_owned(), |hz| quantity::print_digits(hz, Unit::Hertz, 3));
            let words = exact_curves::in_words(&exact.reach);
            row_ui(ui, "Averaged holds to", (&holds, palette.ink), "averaged-reach", &words);
        }
    }
}

/// The multipliers in words, pairs once; at most eight.
fn multipliers(exact: &Referee) -> String {
    let number = |value: f64| quantity::print_digits(value, Unit::One, 3);
    let upper = exact.multipliers.iter().filter(|multiplier| multiplier.im >= 0.0);
    let words = upper.take(8).map(|multiplier| match multiplier.im {
        0.0 => number(multiplier.re),
        im => format!("{} ± j{}", number(multiplier.re), number(im)),
    });
    words.collect::<Vec<_>>().join(", ")
}

fn row_ui(ui: &mut Ui, name: &str, (value, ink): (&str, Color32), term: &str, further: &str) {
    let palette = palette(ui);
    let (rect, response) = ui.allocate_exact_size(vec2(ui.available_width(), ROW), Sense::hover());
    let painter = ui.painter().with_clip_rect(rect);
    painter.text(rect.left_center(), Align2::LEFT_CENTER, name, theme::small(), palette.weak);
    let at = pos2(shown_column(rect), rect.center().y);
    painter.text(at, Align2::RIGHT_CENTER, value, theme::body(), ink);
    response.widget_info(|| WidgetInfo::labeled(Role::Label, true, format!("{name}: {value}")));
    let _ = explain::explained(ui, response, term, || further.to_owned());
}

/// Stability of the switched loop in words, where it is not stable: the word, and what stands behind it.
pub(super) fn instability(exact: &Referee) -> Option<(&'static str, String)> {
    let word = match exact.stability {
        SwitchedStability::Stable => return None,
        SwitchedStability::PeriodDoubling => "Period doubling",
        SwitchedStability::Oscillates { .. } => "Unstable, switched",
        SwitchedStability::RunsAway => "Runs away, switched",
    };
    let size = exact.greatest_multiplier().map_or(String::new(), |m| quantity::print_digits(m, Unit::One, 3));
    let at = exact.stability.oscillation_hz().map(|hz| quantity::print_digits(hz, Unit::Hertz, 3));
    let at = at.map_or(String::new(), |at| format!(" It oscillates at {at}."));
    Some((word, format!("The exact model multiplies a deviation by {size} every period.{at} Margins are greyed.")))
}
