//! The difference equation for both forms of the report.

use crate::analysis::{Detail, DigitalDetail};
use crate::compensator::{Codes, Method};
use crate::linear::{Margins, Verdict};
use crate::quantity::{Unit, print, print_digits};
use crate::sheet::coefficients::{coefficients, equation};
use serde::Serialize;
use std::fmt::Write as _;

/// The `digital` object of the JSON.
#[derive(Serialize)]
pub(super) struct Digital {
    method: &'static str,
    exact_at_hz: Option<f64>,
    sample_period_s: f64,
    computation_s: f64,
    modulator_delay_s: Option<f64>,
    held: bool,
    input_range_v: f64,
    output_range_v: f64,
    word_length: u32,
    forward_fraction_bits: u32,
    feedback_fraction_bits: u32,
    equation: String,
    feedback: Vec<Coefficient>,
    forward: Vec<Coefficient>,
    lanes: Vec<Lane>,
    before_rounding: Before,
    sampled_loop: Option<Sampled>,
    poles_z: Vec<[f64; 2]>,
}

#[derive(Serialize)]
struct Coefficient {
    value: f64,
    exact: f64,
    code: i64,
}

#[derive(Serialize)]
struct Lane {
    key: &'static str,
    aim_hz: f64,
    as_built_hz: f64,
}

#[derive(Serialize)]
struct Before {
    stable: Option<bool>,
    crossover_hz: Option<f64>,
    phase_margin_deg: Option<f64>,
    gain_margin_db: Option<f64>,
}

#[derive(Serialize)]
struct Sampled {
    crossover_hz: Option<f64>,
    phase_margin_deg: Option<f64>,
    gain_margin_db: Option<f64>,
    modulus_margin: f64,
}

fn method(method: Method) -> &'static str {
    match method {
        Method::Tustin => "tustin",
        Method::Prewarped(_) => "tustin-prewarped",
        Method::Matched => "matched",
    }
}

fn listed(codes: &Codes, exact: &[f64]) -> Vec<Coefficient> {
    let each = codes.values().into_iter().zip(&codes.codes).zip(exact);
    each.map(|((value, code), exact)| Coefficient { value, exact: *exact, code: *code }).collect()
}

/// The object of a condition; none without a difference equation.
pub(super) fn object(detail: &Detail) -> Option<Digital> {
    let DigitalDetail { digital, codes, exact, lanes, modulator_delay_s, poles_z, before_rounding, .. } =
        detail.digital.as_ref()?;
    let before = &before_rounding.margins;
    let sampled = |margins: &Margins| Sampled {
        crossover_hz: margins.headline_crossover().map(|c| c.frequency_hz),
        phase_margin_deg: margins.headline_crossover().map(|c| c.phase_margin_deg),
        gain_margin_db: margins.gain_margin_up_db(),
        modulus_margin: margins.modulus_margin.min(1.0),
    };
    Some(Digital {
        method: method(digital.method),
        exact_at_hz: if let Method::Prewarped(f) = digital.method { Some(f) } else { None },
        sample_period_s: digital.period_s,
        computation_s: digital.computation_s,
        modulator_delay_s: *modulator_delay_s,
        held: digital.held,
        input_range_v: digital.input_range,
        output_range_v: digital.output_range,
        word_length: digital.bits,
        forward_fraction_bits: codes.forward.fraction_bits,
        feedback_fraction_bits: codes.feedback.fraction_bits,
        equation: equation(codes),
        feedback: listed(&codes.feedback, &exact.feedback),
        forward: listed(&codes.forward, &exact.forward),
        lanes: lanes
            .iter()
            .map(|lane| Lane { key: lane.key, aim_hz: lane.aim_hz, as_built_hz: lane.as_built_hz })
            .collect(),
        before_rounding: Before {
            stable: match before_rounding.verdict {
                Verdict::Stable { .. } => Some(true),
                Verdict::Unstable { .. } => Some(false),
                Verdict::Undecided { .. } => None,
            },
            crossover_hz: before.headline_crossover().map(|c| c.frequency_hz),
            phase_margin_deg: before.headline_crossover().map(|c| c.phase_margin_deg),
            gain_margin_db: before.gain_margin_up_db(),
        },
        sampled_loop: detail.loop_gain.sampled.as_ref().map(sampled),
        poles_z: poles_z.iter().map(|z| [z.re, z.im]).collect(),
    })
}

/// The section of the text report; empty without a difference equation.
pub(super) fn text(detail: &Detail) -> String {
    let Some(found) = &detail.digital else { return String::new() };
    let mut text = String::from("Difference equation\n");
    for line in coefficients(&found.digital, &found.codes, &found.exact) {
        let _ = writeln!(text, "  {}", line.trim_end());
    }
    let seconds = |value: f64| print(value, Unit::Second);
    let mut delays =
        format!("every {}; {} to update", seconds(found.digital.period_s), seconds(found.digital.computation_s));
    match found.modulator_delay_s {
        Some(delay) => {
            let _ = write!(delays, ", {} to the pulse's edge", print_digits(delay, Unit::Second, 4));
        }
        None => delays.push_str(", held for a period"),
    }
    let _ = writeln!(text, "  {}{delays}", super::text::padded("Sampled", 26));
    for (name, margins) in [
        ("Before rounding", Some(&found.before_rounding.margins)),
        ("Sampled, bands folded", detail.loop_gain.sampled.as_ref()),
    ] {
        let Some(margins) = margins else { continue };
        let said = match margins.headline_crossover() {
            Some(crossover) => format!(
                "{} of phase margin at {}, gain margin {}",
                print_digits(crossover.phase_margin_deg, Unit::Degree, 4),
                print_digits(crossover.frequency_hz, Unit::Hertz, 4),
                margins.gain_margin_up_db().map_or("none".into(), |db| print_digits(db, Unit::Decibel, 4))
            ),
            None => "no crossover".to_owned(),
        };
        let _ = writeln!(text, "  {}{said}", super::text::padded(name, 26));
    }
    for lane in &found.lanes {
        let name = format!("{} wanted, as built", lane.key.replace('-', " "));
        let said = format!(
            "{}, {}",
            print_digits(lane.aim_hz, Unit::Hertz, 5),
            print_digits(lane.as_built_hz, Unit::Hertz, 5)
        );
        let _ = writeln!(text, "  {}{said}", super::text::padded(&name, 26));
    }
    text.push('\n');
    text
}
