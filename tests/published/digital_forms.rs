//! Difference equations through analysis, file and terminal: every topology, control mode and conduction mode with every form and method.

use crate::common::{analysed, checked};
use crate::cross_checks::non_number;
use crate::every_mode::{each, no_number};
use polewright::analysis::{Analysis, Goal, LedgerRole, Level, Shown, place_by_k_factor, place_by_rules};
use polewright::design::{Design, file, sample};
use std::collections::BTreeSet;

const FORMS: [(&str, &str); 4] = [("2", "1"), ("2", "2"), ("3", "1"), ("3", "2")];
const METHODS: [&str; 3] = ["tustin", "tustin-prewarped", "matched"];

fn choose(design: &mut Design, pairs: &[(&str, &str)]) {
    for (path, text) in pairs {
        design.set_from_text(path, text).unwrap_or_else(|finding| panic!("{finding:?}"));
    }
}

/// A slow difference equation in place of the design's compensator.
fn digital(design: &Design, (order, zeros): (&str, &str), method: &str) -> Design {
    let mut design = design.clone();
    choose(
        &mut design,
        &[
            ("compensator.amplifier", "digital"),
            ("compensator.digital.order", order),
            ("compensator.digital.zeros", zeros),
            ("compensator.digital.method", method),
            ("compensator.digital.gain", "30"),
            ("compensator.digital.zero-1", "900"),
            ("compensator.digital.zero-2", "30k"),
            ("compensator.digital.pole-1", "20k"),
            ("compensator.digital.pole-2", "60k"),
            ("compensator.digital.prewarp", "5k"),
            ("compensator.digital.bits", "24"),
            ("compensator.digital.input-range", "10"),
            ("compensator.digital.output-range", "10"),
        ],
    );
    design
}

#[test]
fn every_mode_with_every_form_is_analysed_filed_and_judged() {
    let (stable, count) = (std::cell::Cell::new(0), std::cell::Cell::new(0));
    each(|design, _| {
        let turn = count.get();
        let design = digital(design, FORMS[turn % FORMS.len()], METHODS[turn % METHODS.len()]);
        count.set(turn + 1);
        let analysis = analysed(&design, &[1.0, 1e3, 40e3], 50);
        let title = &design.title;
        assert_eq!(non_number(&analysis), None, "{title}");
        let detail = analysis.shown.as_ref().unwrap_or_else(|finding| panic!("{title}: {finding:?}"));
        let found = detail.digital.as_ref().unwrap_or_else(|| panic!("{title}: no equation"));
        let largest = found.poles_z.iter().map(|z| z.norm()).fold(0.0, f64::max);
        assert_eq!(detail.loop_gain.stable(), largest < 1.0, "{title}: {largest}");
        for step in [&detail.steps.load, &detail.steps.line, &detail.steps.reference] {
            assert_eq!(step.is_some(), detail.loop_gain.stable(), "{title}");
        }
        stable.set(stable.get() + usize::from(detail.loop_gain.stable()));
        let mut bytes = Vec::new();
        file::write(&design, &mut bytes).unwrap_or_else(|error| panic!("{title}: {error:?}"));
        let back = file::read(&mut bytes.as_slice()).unwrap_or_else(|error| panic!("{title}: {error:?}"));
        assert_eq!(back, design, "{title}");
    });
    assert!(stable.get() * 2 > count.get(), "{} of {} stable", stable.get(), count.get());
}

fn buck(pairs: &[(&str, &str)]) -> Design {
    let mut design = sample::all()[1].design().expect("read");
    choose(
        &mut design,
        &[
            ("control.feedforward", "none"),
            ("compensator.amplifier", "digital"),
            ("compensator.digital.gain", "4k"),
            ("compensator.digital.zero-1", "7k"),
            ("compensator.digital.zero-2", "9k"),
            ("compensator.digital.pole-1", "120k"),
            ("compensator.digital.pole-2", "240k"),
        ],
    );
    choose(&mut design, pairs);
    design
}

fn at(design: &Design, frequency_hz: f64) -> (f64, f64) {
    let analysis = analysed(design, &[frequency_hz], 20);
    let curves = &analysis.shown.expect("a result").curves;
    (curves.loop_db[0], curves.loop_deg[0])
}

/// Definition: a delay of td turns the loop by −360°·f·td and leaves its gain. Computation adds itself, the modulator D·T.
#[test]
fn delays_turn_the_loop_by_their_angle() {
    let frequency = 41.3e3;
    let without = at(&buck(&[("compensator.digital.computation", "0"), ("control.delay", "0")]), frequency);
    let with = at(&buck(&[("compensator.digital.computation", "700n"), ("control.delay", "130n")]), frequency);
    assert!((with.0 - without.0).abs() < 1e-9);
    assert!((with.1 - without.1 + 360.0 * frequency * 830e-9).abs() < 1e-7, "{with:?} {without:?}");
    // The same loop without sampling: a continuous aim, no delay but the comparator's, so what is left is the modulator's D·T.
    let design = buck(&[("compensator.digital.computation", "0"), ("control.delay", "0")]);
    let analysis = analysed(&design, &[frequency], 20);
    let detail = analysis.shown.expect("a result");
    let duty = detail.operating_point.duty;
    let mut analog = design.clone();
    choose(&mut analog, &[("compensator.amplifier", "op-amp")]);
    let plain = analysed(&analog, &[frequency], 20).shown.expect("a result");
    let turned = detail.curves.plant_deg[0] - plain.curves.plant_deg[0];
    assert!((turned + 360.0 * frequency * duty / 500e3).abs() < 1e-7, "{turned} for {duty}");
}

/// The ledger adds up to the phase margin, and its delays are −360°·f·td each.
#[test]
fn the_ledger_closes_with_its_delays_apart() {
    for pairs in [
        &[][..],
        &[("control.mode", "peak-current"), ("compensator.digital.gain", "2k")],
        &[("control.mode", "average-current")],
    ] {
        let analysis: Analysis = analysed(&buck(pairs), &[1e3], 20);
        let detail = analysis.shown.expect("a result");
        let ledger = detail.ledger.expect("a crossover");
        let sum: f64 = ledger.rows.iter().map(|row| row.degrees).sum();
        assert!((sum - ledger.phase_margin_deg).abs() < 1e-9, "{sum}");
        let row = |label: &str| ledger.rows.iter().find(|row| row.label == label).map(|row| (row.degrees, row.role));
        let f = ledger.frequency_hz;
        let digital = detail.digital.expect("an equation");
        let near = |label: &str, seconds: f64| {
            let (degrees, role) = row(label).unwrap_or_else(|| panic!("{label}: {:?}", ledger.rows));
            assert_eq!(role, LedgerRole::Delay);
            assert!((degrees + 360.0 * f * seconds).abs() < 1e-6, "{label} {degrees}");
        };
        near("computation", 500e-9);
        match digital.modulator_delay_s {
            Some(delay) => near("modulator", delay),
            None => near("hold of the converter", 0.5 / 500e3),
        }
        assert!(row("sampling").is_some());
    }
}

/// Rounding: few bits move lanes and say so, an integrator lost to rounding is named, with the way to keep it.
#[test]
fn rounding_that_hurts_is_told() {
    let told = |pairs: &[(&str, &str)], place: &str, words: &str| {
        let analysis = analysed(&buck(pairs), &[1e3], 20);
        let found = analysis.findings.iter().find(|f| f.place == place && f.message.contains(words));
        assert!(found.is_some(), "{words}: {:?}", analysis.findings);
        found.cloned().expect("there")
    };
    told(&[("compensator.digital.bits", "9")], "compensator.digital.bits", "Rounded to words of 9 bits");
    let off = &[
        ("compensator.digital.bits", "10"),
        ("compensator.digital.rounding", "nearest"),
        ("compensator.digital.pole-1", "38k"),
    ];
    let lost = told(off, "compensator.digital.rounding", "Rounding moves the integrator's pole");
    assert!(lost.remedy.is_some());
    let calm = analysed(&buck(&[("compensator.digital.bits", "24")]), &[1e3], 20);
    assert!(!calm.findings.iter().any(|f| f.message.contains("ounding m")), "{:?}", calm.findings);
}

/// Wrong input for every entry of a difference equation: named at its place with a hint, and what was entered is still there.
#[test]
fn unusable_entries_are_problems_at_their_place() {
    for (pairs, place, words) in [
        (&[("compensator.digital.bits", "1")][..], "compensator.digital.bits", "from 2 to 32"),
        (&[("compensator.digital.bits", "12.5")], "compensator.digital.bits", "whole number"),
        (&[("compensator.digital.bits", "33")], "compensator.digital.bits", "from 2 to 32"),
        (&[("compensator.digital.fraction-bits", "-1")], "compensator.digital.fraction-bits", "from 0 to 62"),
        (&[("compensator.digital.fraction-bits", "2.5")], "compensator.digital.fraction-bits", "whole number"),
        (
            &[("compensator.digital.fraction-bits", "15")],
            "compensator.digital.fraction-bits",
            "overflows a word of 16 bits",
        ),
        (
            &[("compensator.digital.fraction-bits", "0"), ("compensator.digital.gain", "1")],
            "compensator.digital.fraction-bits",
            "is zero",
        ),
        (
            &[("compensator.digital.feedback-fraction-bits", "-3")],
            "compensator.digital.feedback-fraction-bits",
            "from 0 to 62",
        ),
        (
            &[("compensator.digital.pole-1", "10k"), ("compensator.digital.feedback-fraction-bits", "15")],
            "compensator.digital.feedback-fraction-bits",
            "overflows",
        ),
        (
            &[("compensator.digital.bits", "4"), ("compensator.digital.gain", "400k")],
            "compensator.digital.bits",
            "even without fraction bits",
        ),
        (&[("compensator.digital.computation", "-1n")], "compensator.digital.computation", "0 s or above"),
        (&[("compensator.digital.computation", "2.1u")], "compensator.digital.computation", "more than a period"),
        (&[("compensator.digital.pole-1", "251k")], "compensator.digital.pole-1", "above half the sampling frequency"),
        (&[("compensator.digital.pole-2", "1M")], "compensator.digital.pole-2", "above half the sampling frequency"),
        (&[("compensator.digital.zero-1", "300k")], "compensator.digital.zero-1", "above half the sampling frequency"),
        (&[("compensator.digital.zero-2", "0")], "compensator.digital.zero-2", "must be from"),
        (&[("compensator.digital.gain", "-5")], "compensator.digital.gain", "must be from"),
        (
            &[("compensator.digital.method", "tustin-prewarped"), ("compensator.digital.prewarp", "250k")],
            "compensator.digital.prewarp",
            "above half",
        ),
        (&[("compensator.digital.input-range", "0")], "compensator.digital.input-range", "must be from"),
        (
            &[("compensator.digital.input-range", "0.5")],
            "compensator.digital.input-range",
            "beyond the converter's input range",
        ),
        (
            &[("control.mode", "peak-current"), ("compensator.digital.output-range", "0")],
            "compensator.digital.output-range",
            "must be from",
        ),
    ] {
        let design = buck(pairs);
        let problems = design.check().expect_err(place);
        let found = problems.iter().find(|p| p.place == place).unwrap_or_else(|| panic!("{place}: {problems:?}"));
        assert!(found.message.contains(words) && found.hint.is_some(), "{found}");
        let (path, text) = pairs[pairs.len() - 1];
        let held = design
            .values
            .get(path)
            .map_or_else(|| design.choices.get(path).map(str::to_owned), |v| Some(v.to_string()));
        assert!(held.is_some(), "{path} {text} is lost");
    }
    // The way out of an overflow mends it.
    let mut design = buck(&[("compensator.digital.fraction-bits", "15")]);
    let remedy = design.check().expect_err("an overflow").remove(0).remedy.expect("a remedy");
    for (path, value) in &remedy.values {
        design.values.set(path, *value).expect("finite");
    }
    checked(&design);
}

#[test]
fn the_terminal_tells_the_equation() {
    let design = buck(&[]);
    let folder = tempfile::tempdir().expect("a folder");
    let path = folder.path().join("digital.ron");
    let mut bytes = Vec::new();
    file::write(&design, &mut bytes).expect("written");
    std::fs::write(&path, bytes).expect("written");
    let run = |json: bool| {
        let mut command = std::process::Command::new(env!("CARGO_BIN_EXE_polewright"));
        command.arg("check").arg(&path);
        if json {
            command.arg("--json");
        }
        String::from_utf8(command.output().expect("runs").stdout).expect("text")
    };
    let text = run(false);
    assert!(text.contains("Difference equation") && text.contains("u[n] = a1*u[n-1]"), "{text}");
    assert_eq!(no_number(&text), None);
    let json: serde_json::Value = serde_json::from_str(&run(true)).expect("JSON");
    let digital = &json[0]["digital"];
    assert_eq!(digital["feedback"].as_array().map(Vec::len), Some(3));
    let code = digital["forward"][0]["code"].as_f64().expect("a code");
    let scale = 2f64.powf(digital["forward_fraction_bits"].as_f64().expect("bits"));
    assert!((code / scale - digital["forward"][0]["value"].as_f64().expect("a value")).abs() < 1e-12);
    assert!(digital["sampled_loop"]["phase_margin_deg"].is_number());
}

/// Definition: the K factor's goal is |T| = 1 and 180° + phase at the crossover; met as far as rounding to 24 bits lets it. The rules cross where asked.
#[test]
fn placing_meets_its_goal_in_every_form() {
    let goal = Goal { crossover_hz: 22e3, phase_margin_deg: 52.0 };
    let shown = Shown::Levels(Level::Nominal, Level::Nominal);
    for (order, zeros) in FORMS {
        for method in METHODS {
            // A current command leaves a plant that one zero is enough for.
            let mut pairs = vec![
                ("compensator.digital.order", order),
                ("compensator.digital.zeros", zeros),
                ("compensator.digital.method", method),
                ("compensator.digital.bits", "24"),
            ];
            if zeros == "1" {
                pairs.push(("control.mode", "peak-current"));
            }
            let design = buck(&pairs);
            let read = checked(&design);
            let placement = place_by_k_factor(&read, &BTreeSet::new(), shown, goal)
                .unwrap_or_else(|finding| panic!("{pairs:?}: {finding}"));
            let mut placed = design.clone();
            placement.compensator.write(&mut placed.values);
            let (gain_db, phase_deg) = at(&placed, goal.crossover_hz);
            assert!(gain_db.abs() < 2e-3, "{pairs:?}: {gain_db} dB");
            assert!((180.0 + phase_deg - 52.0).abs() < 2e-2, "{pairs:?}: {phase_deg}°");
            let ruled = place_by_rules(&read, &BTreeSet::new(), shown, goal).expect("placed");
            let mut placed = design.clone();
            ruled.placement.compensator.write(&mut placed.values);
            assert!(at(&placed, goal.crossover_hz).0.abs() < 2e-3, "{pairs:?}");
            assert!(ruled.reasons.len() == ruled.placement.lanes.len(), "{pairs:?}: {:?}", ruled.reasons);
        }
    }
}

/// A lane goes where it is asked to as far as its word lets it, and never above half the sampling frequency.
#[test]
fn lanes_are_moved_and_stop_at_half_the_sampling_frequency() {
    let compensator = checked(&buck(&[])).compensator;
    for (key, wanted, reached) in
        [("zero-1", 5.5e3, 5.5e3), ("pole-2", 170e3, 170e3), ("pole-1", 400e3, 250e3), ("gain", 2e3, 2e3)]
    {
        let placed = compensator.move_lane(key, wanted, &BTreeSet::new());
        assert!((placed.as_built_hz / reached - 1.0).abs() < 0.01, "{key}: {}", placed.as_built_hz);
        assert_eq!(placed.why.is_some(), reached < wanted, "{key}: {:?}", placed.why);
    }
    let beyond = compensator.move_lane("gain", 1e9, &BTreeSet::new());
    assert!(beyond.why.is_some_and(|why| why.contains("overflow")));
    assert!(beyond.compensator.digital().is_some_and(|digital| digital.fixed_point().is_some()));
}

#[test]
fn the_exact_side_says_that_it_is_not_offered() {
    let read = checked(&buck(&[]));
    let shown = Shown::Levels(Level::Nominal, Level::Nominal);
    let refused = polewright::analysis::steady(&read, shown).expect_err("not offered");
    assert!(refused.message.contains("not offered"), "{refused}");
}
