//! What the exact switched model says, in both reports.

use super::text::padded;
use crate::analysis::{Detail, ExactCurves, Reach, ReachedBy, Referee, Steady};
use crate::finding::Finding;
use crate::linear::Margins;
use crate::quantity::{Unit, print, print_digits};
use serde::Serialize;
use std::fmt::Write as _;

/// The exact results of the condition shown.
#[derive(Clone, Debug)]
pub(super) struct Switched {
    /// Curves, margins, multipliers; or why there are none.
    pub(super) referee: Result<Referee, Finding>,
    /// One steady period.
    pub(super) steady: Option<Steady>,
}

/// The same for the JSON report.
#[derive(Debug, Serialize)]
pub(super) struct Object {
    stable: Option<bool>,
    stability: Option<&'static str>,
    oscillation_hz: Option<f64>,
    multipliers: Vec<Multiplier>,
    greatest_multiplier: Option<f64>,
    crossovers: Vec<Crossover>,
    phase_crossovers: Vec<PhaseCrossover>,
    modulus_margin: Option<f64>,
    sensitivity_peak: Option<f64>,
    averaged_holds_to_hz: Option<f64>,
    averaged_looked_to_hz: Option<f64>,
    averaged_left_by: Option<&'static str>,
    response: Vec<Response>,
    stress: Vec<Stress>,
    output_ripple_v: Option<f64>,
    output_ripple_capacitive_v: Option<f64>,
    output_ripple_resistive_v: Option<f64>,
    problem: Option<String>,
}

#[derive(Debug, Serialize)]
struct Multiplier {
    re: f64,
    im: f64,
}

#[derive(Debug, Serialize)]
struct Crossover {
    frequency_hz: f64,
    phase_margin_deg: f64,
    falling: bool,
    slope_db_per_decade: f64,
}

#[derive(Debug, Serialize)]
struct PhaseCrossover {
    frequency_hz: f64,
    gain_margin_db: f64,
}

#[derive(Debug, Serialize)]
struct Response {
    frequency_hz: f64,
    plant_db: Option<f64>,
    plant_deg: Option<f64>,
    loop_db: Option<f64>,
    loop_deg: Option<f64>,
    output_impedance_ohm: Option<f64>,
    output_impedance_deg: Option<f64>,
}

#[derive(Debug, Serialize)]
struct Stress {
    name: String,
    unit: &'static str,
    greatest: f64,
    least: f64,
    rms: Option<f64>,
    average: f64,
}

/// The exact results for the JSON report.
pub(super) fn json(switched: &Switched) -> Object {
    let exact = switched.referee.as_ref().ok();
    let margins = exact.map(|exact| &exact.margins);
    let ripple = |part: usize| switched.steady.as_ref().and_then(|steady| steady.ripple_v.get(part).copied());
    Object {
        stable: exact.map(|exact| exact.stability.is_stable()),
        stability: exact.map(|exact| exact.stability.words()),
        oscillation_hz: exact.and_then(|exact| exact.stability.oscillation_hz()),
        multipliers: exact.map(multipliers).unwrap_or_default(),
        greatest_multiplier: exact.and_then(Referee::greatest_multiplier),
        crossovers: margins.map(crossovers).unwrap_or_default(),
        phase_crossovers: margins.map(phase_crossovers).unwrap_or_default(),
        modulus_margin: margins.map(|margins| margins.modulus_margin),
        sensitivity_peak: margins.map(|margins| margins.sensitivity_peak),
        averaged_holds_to_hz: exact.and_then(|exact| exact.reach.frequency_hz),
        averaged_looked_to_hz: exact.map(|exact| exact.reach.looked_to_hz),
        averaged_left_by: exact.and_then(|exact| exact.reach.by).map(word),
        response: exact.map(|exact| response(&exact.curves)).unwrap_or_default(),
        stress: switched.steady.as_ref().map(stress).unwrap_or_default(),
        output_ripple_v: ripple(0),
        output_ripple_capacitive_v: ripple(1),
        output_ripple_resistive_v: ripple(2),
        problem: switched.referee.as_ref().err().map(|finding| finding.message.clone()),
    }
}

fn word(by: ReachedBy) -> &'static str {
    match by {
        ReachedBy::Plant => "plant",
        ReachedBy::Loop => "loop",
    }
}

fn multipliers(exact: &Referee) -> Vec<Multiplier> {
    exact.multipliers.iter().map(|multiplier| Multiplier { re: multiplier.re, im: multiplier.im }).collect()
}

fn crossovers(margins: &Margins) -> Vec<Crossover> {
    let row = |c: &crate::linear::Crossover| Crossover {
        frequency_hz: c.frequency_hz,
        phase_margin_deg: c.phase_margin_deg,
        falling: c.falling,
        slope_db_per_decade: c.slope_db_per_decade,
    };
    margins.crossovers.iter().map(row).collect()
}

fn phase_crossovers(margins: &Margins) -> Vec<PhaseCrossover> {
    let row = |c: &crate::linear::PhaseCrossover| PhaseCrossover {
        frequency_hz: c.frequency_hz,
        gain_margin_db: c.gain_margin_db,
    };
    margins.phase_crossovers.iter().map(row).collect()
}

fn response(curves: &ExactCurves) -> Vec<Response> {
    let row = |(k, frequency): (usize, &f64)| {
        let at = |curve: &[f64]| curve.get(k).copied().filter(|value| value.is_finite());
        Response {
            frequency_hz: *frequency,
            plant_db: at(&curves.plant_db),
            plant_deg: at(&curves.plant_deg),
            loop_db: at(&curves.loop_db),
            loop_deg: at(&curves.loop_deg),
            output_impedance_ohm: at(&curves.output_impedance_ohm),
            output_impedance_deg: at(&curves.output_impedance_deg),
        }
    };
    curves.frequencies_hz.iter().enumerate().map(row).collect()
}

fn stress(steady: &Steady) -> Vec<Stress> {
    let row = |stress: &crate::analysis::Stress| Stress {
        name: stress.name.clone(),
        unit: if stress.unit == Unit::Volt { "V" } else { "A" },
        greatest: stress.peak,
        least: stress.least,
        rms: stress.rms,
        average: stress.average,
    };
    steady.stress.iter().map(row).collect()
}

/// Width of the column of names, and of a column of numbers [characters].
const WIDTHS: (usize, usize) = (26, 16);

fn row(text: &mut String, name: &str, cells: &[&str]) {
    let (names, numbers) = WIDTHS;
    let cells: String = cells.iter().map(|cell| padded(cell, numbers)).collect();
    let _ = writeln!(text, "  {}{}", padded(name, names), cells.trim_end());
}

/// Appends the exact results to the text report, beside the averaged ones.
pub(super) fn text(text: &mut String, switched: &Switched, detail: &Detail) {
    text.push_str("Exact switched model\n");
    let exact = match &switched.referee {
        Ok(exact) => exact,
        Err(finding) => {
            let _ = writeln!(text, "  {}", finding.message);
            if let Some(hint) = &finding.hint {
                let _ = writeln!(text, "  Hint: {hint}");
            }
            text.push('\n');
            return;
        }
    };
    row(text, "", &["averaged", "exact"]);
    let word = |stable: bool| if stable { "stable" } else { "UNSTABLE" };
    let of_exact = match exact.stability {
        stability if stability.is_stable() => "stable".to_owned(),
        stability => format!("UNSTABLE: {}", stability.words()),
    };
    row(text, "Closed loop", &[word(detail.loop_gain.stable()), &of_exact]);
    let both = [&detail.loop_gain.margins, &exact.margins];
    let mut pair = |name: &str, unit: Unit, take: &dyn Fn(&Margins) -> Option<f64>| {
        let cells = both.map(|margins| take(margins).map_or("none".to_owned(), |value| print_digits(value, unit, 4)));
        row(text, name, &[&cells[0], &cells[1]]);
    };
    pair("Crossover", Unit::Hertz, &|m| m.headline_crossover().map(|c| c.frequency_hz));
    pair("Phase margin", Unit::Degree, &|m| m.headline_crossover().map(|c| c.phase_margin_deg));
    pair("Gain margin", Unit::Decibel, &Margins::gain_margin_up_db);
    pair("Modulus margin", Unit::One, &|m| Some(m.modulus_margin));
    // What has wholly died away after a period is left to rounding.
    let number = |value: f64| print_digits(if value.abs() < 1e-12 { 0.0 } else { value }, Unit::One, 4);
    let upper = exact.multipliers.iter().filter(|multiplier| multiplier.im >= 0.0);
    let multipliers = upper.map(|multiplier| match multiplier.im {
        0.0 => number(multiplier.re),
        im => format!("{} ± j{}", number(multiplier.re), number(im)),
    });
    let multipliers = multipliers.collect::<Vec<_>>().join(", ");
    let _ = writeln!(text, "  {}{multipliers}", padded("Multipliers", WIDTHS.0));
    let _ = writeln!(text, "  {}{}\n", padded("Averaged holds to", WIDTHS.0), reach(&exact.reach));
    if let Some(steady) = &switched.steady {
        table(text, steady);
    }
}

fn reach(reach: &Reach) -> String {
    let hertz = |value: f64| print(value, Unit::Hertz);
    match (reach.frequency_hz, reach.by) {
        (None, _) => "nowhere within 1 dB and 5°".to_owned(),
        (Some(_), None) => format!("{}, as far as was looked", hertz(reach.looked_to_hz)),
        (Some(hz), Some(by)) => {
            let by = word(by);
            format!("{}, where the {by} leaves 1 dB and 5° first", print_digits(hz, Unit::Hertz, 3))
        }
    }
}

fn table(text: &mut String, steady: &Steady) {
    let _ = writeln!(text, "What the parts bear over one steady period of {}", print(steady.period_s, Unit::Second));
    // A name may be longer than the column of names, a probe's number behind it included.
    let longest = steady.stress.iter().map(|stress| stress.name.chars().count()).max().unwrap_or(0);
    let names = WIDTHS.0.max(longest + 2);
    let mut row = |name: &str, cells: &[&str]| {
        let cells: String = cells.iter().map(|cell| padded(cell, WIDTHS.1)).collect();
        let _ = writeln!(text, "  {}{}", padded(name, names), cells.trim_end());
    };
    row("", &["greatest", "least", "RMS", "average"]);
    for stress in &steady.stress {
        let number = |value: f64| print_digits(value, stress.unit, 4);
        let rms = stress.rms.map_or(String::new(), number);
        row(&stress.name, &[&number(stress.peak), &number(stress.least), &rms, &number(stress.average)]);
    }
    let volts = |value: f64| print_digits(value, Unit::Volt, 3);
    let [whole, capacitive, resistive] = steady.ripple_v.map(volts);
    let _ = writeln!(
        text,
        "  {}{whole} peak to peak; {capacitive} from the charge of the capacitors, {resistive} across their ESR\n",
        padded("output bank ripple", names)
    );
}
