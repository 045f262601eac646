//! What is said of wrong or doubtful entries of transformers, regions and phases; nothing entered is lost by it.

use crate::common::{at_one_condition, checked, design, lossless, nominal};
use polewright::analysis::{Level, Request, Shown, analyse};
use polewright::design::Design;
use polewright::finding::{Finding, Severity};

fn of(topology: &str, output: f64) -> Design {
    let values = [
        ("stage.output.voltage", output),
        ("compensator.reference", output / 4.0),
        ("compensator.divider.upper", 30e3),
        ("compensator.divider.lower", 10e3),
        ("control.duty.greatest", if topology == "forward" { 0.49 } else { 0.9 }),
    ];
    design(&[("stage.topology", topology)], &values)
}

/// Each new entry with what it must not be, and a word of the reason.
#[test]
fn unusable_entries_are_named_at_their_place() {
    let phased = ["buck", "boost", "buck-boost"].map(|topology| (topology, "stage.phases"));
    let transformed = ["forward", "push-pull", "half-bridge", "full-bridge"];
    let mut tries: Vec<(&str, &str, &str, &str)> = Vec::new();
    for (topology, path) in phased {
        for (text, reason) in
            [("0", "from 1 to 16"), ("17", "from 1 to 16"), ("-2", "from 1 to 16"), ("1.5", "not a whole number")]
        {
            tries.push((topology, path, text, reason));
        }
    }
    for topology in transformed {
        tries.extend([
            (topology, "stage.transformer.ratio", "0", "from"),
            (topology, "stage.transformer.ratio", "-1", "from"),
            (topology, "stage.transformer.magnetising", "0", "above 0"),
            (topology, "stage.transformer.leakage", "-1u", "0"),
        ]);
    }
    tries.extend([
        ("forward", "stage.transformer.reset", "0", "from"),
        ("forward", "stage.transformer.reset", "21", "from"),
    ]);
    for (topology, path, text, reason) in tries {
        let mut design = of(topology, if topology == "boost" { 24.0 } else { 3.0 });
        design.set_from_text(path, text).expect("a number");
        let before = design.clone();
        let problems = design.check().expect_err("a problem");
        let told = format!("{topology} {path} {text}: {problems:?}");
        assert!(problems.len() == 1 && problems[0].place == path && problems[0].is_problem(), "{told}");
        assert!(problems[0].message.contains(reason) && problems[0].hint.is_some(), "{told}");
        assert_eq!(design, before, "{told}");
    }
    // Text that is no number stays out, with a reason.
    let mut design = of("buck", 3.0);
    assert_eq!(design.set_from_text("stage.phases", "many").expect_err("no number").place, "stage.phases");
}

/// An output above what the transformer gives at any input is refused before anything is computed.
#[test]
fn an_output_beyond_the_turns_ratio_is_refused() {
    let mut design = of("half-bridge", 3.0);
    design.set_from_text("stage.transformer.ratio", "0.1").expect("a number");
    let problems = design.check().expect_err("a problem");
    assert_eq!(problems[0].place, "stage.output.voltage");
    assert!(problems[0].message.contains("Half-bridge"), "{problems:?}");
}

fn outcome(design: &Design) -> Result<f64, Finding> {
    let shown = Shown::Levels(Level::Nominal, Level::Nominal);
    let request = Request { shown, frequencies_hz: vec![1e3], band_frequencies_hz: Vec::new(), step_points: 20 };
    analyse(&checked(design), &request).shown.map(|detail| detail.operating_point.duty)
}

/// Reset: D ≤ 1/(1 + Nr/Np) (Erickson & Maksimovic, 6.3.2, from memory). A modulator that gives more is remarked on, with the value that
/// mends it; a condition that needs more has no result and says so.
#[test]
fn a_core_that_does_not_reset_is_told() {
    let mut design = lossless(
        "forward",
        &[
            ("stage.output.voltage", 5.0),
            ("compensator.reference", 1.25),
            ("compensator.divider.upper", 30e3),
            ("compensator.divider.lower", 10e3),
            ("stage.transformer.ratio", 0.5),
            ("stage.transformer.reset", 1.5),
            ("control.duty.greatest", 0.8),
        ],
    );
    at_one_condition(&mut design, 40.0, 5.0);
    let findings = checked(&design).findings;
    let told = findings.iter().find(|finding| finding.place == "control.duty.greatest").expect("told");
    assert!(told.severity == Severity::Notice && told.message.contains("bears 0.4"), "{told}");
    let remedy = told.remedy.as_ref().expect("a remedy");
    assert_eq!(remedy.values, [("control.duty.greatest".to_owned(), 0.4)]);
    assert!((outcome(&design).expect("D 0.25") - 0.25).abs() < 1e-9);
    // 24 V need D 5/12, above 0.4.
    at_one_condition(&mut design, 24.0, 5.0);
    let why = outcome(&design).expect_err("no reset");
    assert_eq!(why.place, "stage.transformer.reset");
    assert!(why.message.contains("0.417") && why.message.contains("reset"), "{why}");
    design.values.set("stage.transformer.reset", 1.0).expect("finite");
    assert!(outcome(&design).is_ok());
}

/// Four switches near Vin = Vout: neither region holds the condition within the duty limits, and that is all that is said of it.
#[test]
fn a_condition_between_the_regions_is_told() {
    let mut design = lossless(
        "four-switch",
        &[
            ("stage.output.voltage", 12.0),
            ("compensator.reference", 1.25),
            ("compensator.divider.upper", 86e3),
            ("compensator.divider.lower", 10e3),
            ("control.duty.least", 0.05),
            ("control.duty.greatest", 0.9),
        ],
    );
    for (input, between) in [(12.5, true), (12.01, true), (12.0, true), (11.7, true), (14.0, false), (10.0, false)] {
        at_one_condition(&mut design, input, 1.0);
        match outcome(&design) {
            Ok(_) => assert!(!between, "{input} V"),
            Err(why) => {
                assert!(between && why.is_problem(), "{input} V: {why}");
                assert!(why.message.contains("between the buck and the boost region"), "{why}");
                assert!(why.message.contains("left out") && why.hint.is_some(), "{why}");
            }
        }
    }
    // With losses a buck cannot give 12 V from 12.05 V at any duty ratio.
    design.values.set("stage.inductor.resistance", 0.1).expect("finite");
    at_one_condition(&mut design, 12.05, 1.0);
    assert!(outcome(&design).expect_err("between").message.contains("between the buck and the boost region"));
}

/// What a model leaves out is said beside its results, at the entry it belongs to.
#[test]
fn what_is_left_out_is_said() {
    let said = |topology: &str, place: &str| {
        let findings = checked(&of(topology, 3.0)).findings;
        assert!(
            findings.iter().any(|f| f.place == place && f.severity == Severity::Note),
            "{topology} {place}: {findings:?}"
        );
    };
    for topology in ["push-pull", "half-bridge", "full-bridge"] {
        said(topology, "stage.rectifier");
        said(topology, "stage.transformer.leakage");
        said(topology, "stage.transformer.magnetising");
    }
    said("forward", "stage.transformer.leakage");
    said("half-bridge", "stage.topology");
    said("full-bridge", "stage.topology");
    said("four-switch", "stage.topology");
}

/// The magnetising current takes the place of compensation: of two full bridges beyond the subharmonic boundary the one with enough of it
/// is not. Deviations obey (m1 + μ)·z² + (m1 + m2 − μ)·z + m2 = 0 with slopes at the primary, the inductor's m1 up, m2 down, and the
/// magnetising current's μ, whose sign turns with every pulse (own derivation): stable for m2 < m1 + μ.
#[test]
fn the_magnetising_current_is_a_ramp_of_its_own() {
    let bridge = |magnetising: f64| {
        let mut design = lossless(
            "full-bridge",
            &[
                ("stage.output.voltage", 12.0),
                ("compensator.reference", 3.0),
                ("compensator.divider.upper", 30e3),
                ("compensator.divider.lower", 10e3),
                ("stage.switching-frequency", 100e3),
                ("stage.inductor.inductance", 10e-6),
                ("stage.bank.1.capacitance", 10e-3),
                ("stage.transformer.ratio", 0.5),
                ("stage.transformer.magnetising", magnetising),
            ],
        );
        for (path, key) in [("control.mode", "peak-current"), ("control.slope", "rate")] {
            design.set_from_text(path, key).expect("an option");
        }
        design.values.set("control.slope.rate", 0.0).expect("finite");
        at_one_condition(&mut design, 40.0, 10.0);
        nominal(&design, &[1e3]).control.sampling.expect("sampled")
    };
    // D 0.6: m1 = (20 − 12)/10 µH, m2 = 12/10 µH, at the primary half of that; μ = 40/Lm.
    let (m1, m2): (f64, f64) = (0.5 * 8.0 / 10e-6, 0.5 * 12.0 / 10e-6);
    let boundary = 40.0 / (m2 - m1);
    for (share, stable) in [(0.99, true), (1.01, false), (0.2, true), (20.0, false)] {
        let mu = 40.0 / (share * boundary);
        // Roots of the recursion.
        let (a, b, c) = (m1 + mu, m1 + m2 - mu, m2);
        let inner = b * b - 4.0 * a * c;
        let largest = if inner < 0.0 {
            (c / a).sqrt()
        } else {
            let root = inner.sqrt();
            ((-b + root) / (2.0 * a)).abs().max(((-b - root) / (2.0 * a)).abs())
        };
        assert_eq!(largest < 1.0, stable, "{share}");
        let sampling = bridge(share * boundary);
        assert_eq!(sampling.subharmonic(), !stable, "{share}: {sampling:?}");
        // 1/(π·Qp) = mc·(1 − D) − ½ (Ridley 1991) with half of μ as the ramp.
        let mc = 1.0 + mu / 2.0 / m1;
        assert!((sampling.damping - (mc * 0.4 - 0.5)).abs() < 1e-3, "{share}: {}", sampling.damping);
    }
}
