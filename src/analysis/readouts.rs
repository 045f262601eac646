//! The neutral list of read-outs that window, terminal and sheet print.

use super::analyse::NO_GAIN_DB;
use super::requirement::worst_shown;
use super::result::{ConditionResult, Detail, InnerResult, Readout, RequirementVerdict, Worst};
use crate::design::Asked;
use crate::quantity::{Unit, print};

/// A row of the list before its values are known.
struct Row {
    key: &'static str,
    name: &'static str,
    unit: Unit,
    asked: Option<Asked>,
    absent: &'static str,
    help: &'static str,
    take: fn(&Detail) -> Option<f64>,
}

static ROWS: &[Row] = &[
    Row {
        key: "crossover",
        name: "Crossover",
        unit: Unit::Hertz,
        asked: Some(Asked::CrossoverGreatest),
        absent: "none",
        help: "Where the loop gain falls through 0 dB; of several crossovers the one with the least phase margin.",
        take: |d| d.loop_gain.margins.headline_crossover().map(|c| c.frequency_hz),
    },
    Row {
        key: "phase-margin",
        name: "Phase margin",
        unit: Unit::Degree,
        asked: Some(Asked::PhaseMargin),
        absent: "none",
        help: "180° plus the loop's phase at the crossover, between −180° and 180°.",
        take: |d| d.loop_gain.margins.headline_crossover().map(|c| c.phase_margin_deg),
    },
    Row {
        key: "gain-margin",
        name: "Gain margin",
        unit: Unit::Decibel,
        asked: Some(Asked::GainMargin),
        absent: "none below ½ fs",
        help: "How much the loop gain may rise before the loop oscillates: −|T| in decibels where the phase is −180° − k·360°.",
        take: |d| d.loop_gain.margins.gain_margin_up_db(),
    },
    Row {
        key: "gain-reduction",
        name: "Gain may fall",
        unit: Unit::Decibel,
        asked: None,
        absent: "any",
        help: "How much the loop gain may fall before the loop oscillates; only a conditionally stable loop has such a limit.",
        take: |d| d.loop_gain.margins.gain_margin_down_db(),
    },
    Row {
        key: "modulus-margin",
        name: "Modulus margin",
        unit: Unit::One,
        asked: Some(Asked::ModulusMargin),
        absent: "none",
        help: "Least distance of the loop gain from −1: min |1 + T|. Its inverse is the peak sensitivity Ms.",
        take: |d| Some(d.loop_gain.margins.modulus_margin),
    },
    Row {
        key: "delay-margin",
        name: "Delay margin",
        unit: Unit::Second,
        asked: None,
        absent: "infinite",
        help: "Additional delay the loop bears: least over the crossovers of (phase margin mod 360°) / (360°·f).",
        take: |d| if d.loop_gain.stable() { d.loop_gain.margins.delay_margin_s } else { None },
    },
    Row {
        key: "gain-at-half-switching",
        name: "Gain at ½ switching",
        unit: Unit::Decibel,
        asked: None,
        absent: "none",
        help: "Loop gain at half the switching frequency; the averaged model ends there.",
        take: |d| Some(d.loop_gain.gain_at_half_switching_db).filter(|db| *db > NO_GAIN_DB),
    },
    Row {
        key: "right-half-plane-ratio",
        name: "RHP zero / crossover",
        unit: Unit::One,
        asked: Some(Asked::RightHalfPlaneRatio),
        absent: "no RHP zero",
        help: "Lowest right-half-plane zero over the crossover. Common practice: three to five at least.",
        take: |d| d.right_half_plane_ratio(),
    },
    Row {
        key: "load-step-deviation",
        name: "Load step",
        unit: Unit::Volt,
        asked: Some(Asked::LoadStepDeviation),
        absent: "unstable",
        help: "Signed extreme of the output against its value before the load step; linear prediction.",
        take: |d| d.steps.load.as_ref().map(|s| s.deviation_v),
    },
    Row {
        key: "settling",
        name: "Settles in",
        unit: Unit::Second,
        asked: Some(Asked::Settling),
        absent: "does not settle",
        help: "Last exit from the settling band around the final value after the load step.",
        take: |d| d.steps.load.as_ref().and_then(|s| s.settling_s),
    },
    Row {
        key: "control-voltage",
        name: "Control voltage",
        unit: Unit::Volt,
        asked: None,
        absent: "none",
        help: "Control voltage that holds the operating point: sensed current and ramp at the comparator, or what the inner loop asks for.",
        take: |d| Some(d.control.control_voltage),
    },
    Row {
        key: "sampling-quality",
        name: "Qp at ½ switching",
        unit: Unit::One,
        asked: None,
        absent: "subharmonic",
        help: "Quality factor of the sampling pair, 1 / (π·(mc·D' − ½)) without sense filter, D' the share of the period that is not sensed. Common practice: near 1; none beyond the subharmonic boundary.",
        take: |d| d.control.sampling.and_then(|s| s.quality()),
    },
    Row {
        key: "slope-factor",
        name: "Slope factor mc",
        unit: Unit::One,
        asked: None,
        absent: "none",
        help: "1 + compensating ramp / slope of the sensed current.",
        take: |d| d.control.sampling.map(|s| s.slope_factor),
    },
    Row {
        key: "fast-multiplier",
        name: "Fast multiplier α",
        unit: Unit::One,
        asked: None,
        absent: "none",
        help: "By how much a small deviation of the current is multiplied every period; it dies out while α is between −1 and 1.",
        take: |d| d.control.sampling.map(|s| s.fast_multiplier),
    },
    Row {
        key: "compensating-ramp",
        name: "Compensating ramp",
        unit: Unit::VoltPerSecond,
        asked: None,
        absent: "none",
        help: "Slope of the ramp at the comparator; one ramp for all conditions.",
        take: |d| d.ramp,
    },
    Row {
        key: "ramp-share",
        name: "Ramp / current's slope",
        unit: Unit::Fraction,
        asked: None,
        absent: "none",
        help: "The ramp as a share of the slope it works against: the down-slope in peak, the up-slope in valley current mode.",
        take: |d| d.control.sampling.map(|s| s.ramp_share),
    },
    Row {
        key: "inner-crossover",
        name: "Inner crossover",
        unit: Unit::Hertz,
        asked: None,
        absent: "none",
        help: "Where the inner current loop's gain falls through 0 dB, the control voltage at rest.",
        take: |d| inner(d)?.margins.headline_crossover().map(|c| c.frequency_hz),
    },
    Row {
        key: "inner-phase-margin",
        name: "Inner phase margin",
        unit: Unit::Degree,
        asked: None,
        absent: "none",
        help: "180° plus the inner loop's phase at its crossover.",
        take: |d| inner(d)?.margins.headline_crossover().map(|c| c.phase_margin_deg),
    },
    Row {
        key: "inner-gain-margin",
        name: "Inner gain margin",
        unit: Unit::Decibel,
        asked: None,
        absent: "none below ½ fs",
        help: "How much the inner loop's gain may rise before it oscillates.",
        take: |d| inner(d)?.margins.gain_margin_up_db(),
    },
];

fn inner(detail: &Detail) -> Option<&InnerResult> {
    detail.control.inner.as_ref()
}

/// Whether a row says anything about a condition in its control mode; the rows above the control's always do.
fn belongs(key: &str, detail: Option<&Detail>) -> bool {
    let programmed = detail.is_some_and(|d| d.ramp.is_some());
    let sampled = detail.is_some_and(|d| d.control.sampling.is_some());
    let average = detail.is_some_and(|d| d.control.inner.is_some());
    match key {
        "control-voltage" => programmed || average,
        "compensating-ramp" => programmed,
        "sampling-quality" | "slope-factor" | "fast-multiplier" | "ramp-share" => sampled,
        "inner-crossover" | "inner-phase-margin" | "inner-gain-margin" => average,
        _ => true,
    }
}

/// The read-outs of the shown condition, `settling_band` as a share of the output, with the worst of the nine and the requirements beside them.
pub(super) fn readouts(
    detail: Option<&Detail>,
    conditions: &[ConditionResult],
    verdicts: &[RequirementVerdict],
    settling_band: f64,
) -> Vec<Readout> {
    let within = format!("stays within ±{}", print(settling_band, Unit::Fraction));
    let stable = detail.is_some_and(|d| d.loop_gain.stable());
    let shown = |row: &Row| {
        let requirements: Vec<_> = verdicts.iter().filter(|v| v.readout == row.key).cloned().collect();
        let of_margins =
            matches!(row.key, "crossover" | "phase-margin" | "gain-margin" | "gain-reduction" | "modulus-margin");
        let of_step = matches!(row.key, "load-step-deviation" | "settling");
        Readout {
            key: row.key,
            name: row.name,
            unit: row.unit,
            value: detail.and_then(row.take).filter(|v| v.is_finite()),
            absent: match detail {
                None => "not computed",
                Some(_) if of_margins && !stable => "unstable",
                Some(d) if of_step && stable && d.steps.load.is_none() => "no step",
                Some(_) => row.absent,
            },
            greyed: !stable && of_margins,
            worst: row.asked.and_then(|asked| worst_shown(asked, conditions)),
            range: (row.key == "crossover").then(|| range(conditions)).flatten(),
            requirements,
            at_zero: (row.key == "settling").then(|| within.clone()),
            help: row.help,
        }
    };
    let useful = |r: &Readout| (r.value.is_some() || r.key != "gain-reduction") && belongs(r.key, detail);
    ROWS.iter().map(shown).filter(useful).collect()
}

/// Least and greatest crossover over the conditions.
fn range(conditions: &[ConditionResult]) -> Option<[Worst; 2]> {
    Some([worst_shown(Asked::CrossoverLeast, conditions)?, worst_shown(Asked::CrossoverGreatest, conditions)?])
}
