//! Wrong input for every entry of isolated feedback: named at its place, nothing lost; and findings where usable numbers do not go together.

use super::{Analysis, Level, Request, Shown, analyse};
use crate::design::{Design, entry, sample};
use crate::finding::{Finding, Severity};

fn lock(pairs: &[(&str, &str)]) -> Design {
    let canal = sample::all().iter().find(|sample| sample.file == "canal-lock.ron").unwrap();
    let mut design = canal.design().unwrap();
    for (path, text) in pairs {
        design.set_from_text(path, text).unwrap();
    }
    design
}

fn analysis(pairs: &[(&str, &str)]) -> Analysis {
    let shown = Shown::Levels(Level::Nominal, Level::Nominal);
    analyse(&lock(pairs).check().unwrap(), &Request::spanning(shown, 150e3, 20))
}

fn finding<'a>(analysis: &'a Analysis, place: &str, severity: Severity) -> &'a Finding {
    let found = analysis.findings.iter().find(|f| f.place == place && f.severity == severity);
    found.unwrap_or_else(|| panic!("{place}: {:#?}", analysis.findings))
}

#[test]
fn unusable_numbers_are_named_at_their_place() {
    let fixed = ("compensator.opto.fast-path", "none");
    let capacitance = ("compensator.opto.speed", "capacitance");
    for (choice, path, text) in [
        (None, "compensator.opto.transfer-ratio.least", "0"),
        (None, "compensator.opto.transfer-ratio.least", "95 %"),
        (None, "compensator.opto.transfer-ratio.nominal", "0"),
        (None, "compensator.opto.transfer-ratio.greatest", "80 %"),
        (None, "compensator.opto.led-resistor", "0"),
        (None, "compensator.opto.led-resistor", "100k"),
        (None, "compensator.opto.bias-resistor", "0"),
        (None, "compensator.opto.pull-up", "-1k"),
        (None, "compensator.opto.supply", "0"),
        (None, "compensator.opto.supply", "0.2"),
        (None, "compensator.opto.saturation", "-1"),
        (None, "compensator.opto.led-drop", "0"),
        (None, "compensator.opto.led-resistance", "-5"),
        (None, "compensator.opto.pole", "0"),
        (None, "compensator.opto.pole-at", "0"),
        (Some(capacitance), "compensator.opto.capacitance", "0"),
        (Some(fixed), "compensator.opto.led-supply", "0"),
        (Some(fixed), "compensator.opto.led-supply", "3"),
        (None, "compensator.shunt.dc-gain", "0.1"),
        (None, "compensator.shunt.gain-bandwidth", "0"),
        (None, "compensator.shunt.least-current", "0"),
        (None, "compensator.shunt.least-voltage", "0"),
        (None, "compensator.shunt.least-voltage", "12"),
    ] {
        let mut design = lock(&choice.into_iter().collect::<Vec<_>>());
        design.set_from_text(path, text).unwrap();
        let problems = design.check().unwrap_err();
        assert_eq!(problems.len(), 1, "{path} {text}: {problems:?}");
        assert_eq!(problems[0].place, path);
        assert!(problems[0].hint.is_some(), "{}", problems[0]);
        // Nothing is lost: with the row's usual value it is a design again.
        let row = entry(path).unwrap();
        design.values.set(path, row.default).unwrap();
        assert!(design.check().is_ok(), "{path}: {:?}", design.check());
    }
}

#[test]
fn what_does_not_fit_another_amplifier_is_kept_and_left_alone() {
    let mut design = lock(&[("compensator.opto.transfer-ratio.least", "200 %")]);
    assert!(design.check().is_err());
    design.set_from_text("compensator.amplifier", "op-amp").unwrap();
    assert!(design.check().is_ok());
    design.set_from_text("compensator.amplifier", "shunt-regulator").unwrap();
    assert_eq!(design.values.get("compensator.opto.transfer-ratio.least"), Some(2.0));
    let type_one = lock(&[("compensator.type", "1")]).check().unwrap_err();
    assert_eq!(type_one[0].place, "compensator.type");
    assert!(lock(&[("compensator.type", "1"), ("compensator.opto.fast-path", "none")]).check().is_ok());
}

/// An LED resistor too great for the control voltage that the conditions need at the least ratio; its remedy mends it.
#[test]
fn an_led_resistor_too_great_is_a_problem_that_mends_itself() {
    let found = analysis(&[("compensator.opto.led-resistor", "6.8k")]);
    let problem = finding(&found, "compensator.opto.led-resistor", Severity::Problem);
    assert!(problem.message.contains("least transfer ratio"), "{problem}");
    let mended = problem.remedy.as_ref().unwrap().values[0].1;
    let found = analysis(&[("compensator.opto.led-resistor", &mended.to_string())]);
    let again = found.findings.iter().find(|f| f.place == "compensator.opto.led-resistor" && f.is_problem());
    assert_eq!(again, None);
}

/// Enough current for the conditions, not enough to pull to saturation: a notice.
#[test]
fn no_way_down_to_saturation_is_a_notice() {
    let found = analysis(&[("compensator.opto.led-resistor", "3.9k")]);
    let notice = finding(&found, "compensator.opto.led-resistor", Severity::Notice);
    assert!(notice.message.contains("saturation") && notice.remedy.is_some(), "{notice}");
}

/// A bias resistor that leaves the regulator too little where the LED is nearly dark.
#[test]
fn a_bias_resistor_that_starves_the_regulator_is_a_problem_that_mends_itself() {
    let found = analysis(&[("compensator.opto.bias-resistor", "4.7k")]);
    let problem = finding(&found, "compensator.opto.bias-resistor", Severity::Problem);
    assert!(problem.message.contains("least current"), "{problem}");
    let mended = problem.remedy.as_ref().unwrap().values[0].1;
    let found = analysis(&[("compensator.opto.bias-resistor", &mended.to_string())]);
    assert!(!found.findings.iter().any(|f| f.place == "compensator.opto.bias-resistor"));
}

#[test]
fn a_control_voltage_beyond_supply_or_saturation_is_a_problem() {
    let found = analysis(&[("compensator.opto.supply", "3.3")]);
    finding(&found, "compensator.opto.supply", Severity::Problem);
    let found = analysis(&[("compensator.opto.saturation", "2.5")]);
    finding(&found, "compensator.opto.saturation", Severity::Problem);
}

#[test]
fn an_unstable_end_of_the_ratio_is_a_problem_and_a_missed_margin_a_notice() {
    let wide =
        [("compensator.opto.transfer-ratio.greatest", "1000 %"), ("compensator.opto.transfer-ratio.least", "5 %")];
    let found = analysis(&wide);
    assert!(found.conditions.iter().all(|c| c.outcome.as_ref().is_ok_and(|s| s.loop_gain.stable())));
    let [least, greatest] = ["least", "greatest"].map(|end| format!("compensator.opto.transfer-ratio.{end}"));
    finding(&found, &greatest, Severity::Problem);
    finding(&found, &least, Severity::Notice);
    // The spread is told whatever it is.
    finding(&found, "compensator.opto.transfer-ratio.nominal", Severity::Note);
}

/// Two routes: the loop at an end of the ratio is the nominal loop of a design whose nominal ratio it is.
#[test]
fn the_ends_of_the_ratio_are_loops_of_their_own() {
    let found = analysis(&[]);
    let ends = found.conditions[4].outcome.as_ref().unwrap().isolated.clone().unwrap().ends;
    for (end, ratio) in ends.iter().zip(["63 %", "125 %"]) {
        let own = analysis(&[
            ("compensator.opto.transfer-ratio.least", "10 %"),
            ("compensator.opto.transfer-ratio.greatest", "1000 %"),
            ("compensator.opto.transfer-ratio.nominal", ratio),
        ]);
        let margins = &own.conditions[4].outcome.as_ref().unwrap().loop_gain.margins;
        let crossover = margins.headline_crossover().unwrap();
        let (hz, deg) = end.headline().unwrap();
        assert!((hz / crossover.frequency_hz - 1.0).abs() < 1e-7, "{hz} and {}", crossover.frequency_hz);
        assert!((deg - crossover.phase_margin_deg).abs() < 1e-5);
        assert_eq!(end.stable(), own.conditions[4].outcome.as_ref().unwrap().loop_gain.stable());
    }
}

/// Definition: the ledger closes on the phase margin, a fast path ahead of the second stage counted.
#[test]
fn the_ledger_closes_over_both_paths() {
    for fast in ["bank", "load", "none"] {
        let found = analysis(&[("compensator.opto.fast-path", fast)]);
        let detail = found.shown.as_ref().unwrap();
        let ledger = detail.ledger.as_ref().unwrap();
        let crossover = detail.loop_gain.margins.headline_crossover().unwrap();
        assert!((ledger.phase_margin_deg - crossover.phase_margin_deg).abs() < 1e-6, "{fast}");
        assert_eq!(ledger.rows.iter().any(|row| row.label == "fast path at the bank"), fast == "bank");
        assert!(ledger.rows.iter().any(|row| row.label.starts_with("optocoupler")), "{fast}");
    }
}
