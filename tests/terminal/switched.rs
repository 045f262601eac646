//! The exact switched model in the reports: what they print is what the library gives, and the exit code follows it.

use super::{check, code, json, number, program, sample_path, text};
use polewright::analysis::{Level, Request, Shown, referee, steady};
use polewright::design::file::load;
use polewright::design::sample;
use serde_json::Value;
use std::path::Path;

#[test]
fn every_sample_has_its_exact_side_in_both_reports() {
    for sample in sample::all() {
        let path = sample_path(sample.file);
        let output = check(&[&path, "--switched", "--json", "--at", "1k,10k"]);
        let report = &json(&output)[0];
        let exact = &report["switched"];
        let design = load(Path::new(&path)).expect("readable").check().expect("usable");
        let shown = Shown::Levels(Level::Nominal, Level::Nominal);
        let mut request = Request::spanning(shown, design.stage.switching_frequency, 2);
        request.frequencies_hz = vec![1e3, 1e4];
        let wanted = match referee(&design, &request) {
            Ok(wanted) => wanted,
            Err(finding) => {
                assert_eq!(exact["problem"], Value::from(finding.message), "{}", sample.file);
                continue;
            }
        };
        assert_eq!(exact["stable"], Value::from(wanted.stability.is_stable()));
        assert!(wanted.stability.is_stable() || code(&output) == 1, "{}", sample.file);
        assert_eq!(exact["multipliers"].as_array().expect("a list").len(), wanted.multipliers.len());
        let same = |value: &Value, wanted: f64| {
            // The reader of the JSON rounds the last digit.
            assert!((number(value) - wanted).abs() <= 1e-12 * wanted.abs(), "{}: {value}, {wanted}", sample.file);
        };
        same(&exact["greatest_multiplier"], wanted.greatest_multiplier().expect("there are states"));
        same(&exact["modulus_margin"], wanted.margins.modulus_margin);
        same(&exact["response"][1]["loop_db"], wanted.curves.loop_db[1]);
        same(&exact["response"][0]["output_impedance_ohm"], wanted.curves.output_impedance_ohm[0]);
        for (row, crossover) in exact["crossovers"].as_array().expect("a list").iter().zip(&wanted.margins.crossovers) {
            same(&row["frequency_hz"], crossover.frequency_hz);
            same(&row["phase_margin_deg"], crossover.phase_margin_deg);
        }
        match wanted.reach.frequency_hz {
            Some(hz) => same(&exact["averaged_holds_to_hz"], hz),
            None => assert!(exact["averaged_holds_to_hz"].is_null()),
        }
        let period = steady(&design, shown).expect("as before");
        for (row, stress) in exact["stress"].as_array().expect("a list").iter().zip(&period.stress) {
            assert_eq!(row["name"], Value::from(stress.name.clone()));
            same(&row["greatest"], stress.peak);
            same(&row["average"], stress.average);
        }
        same(&exact["output_ripple_v"], period.ripple_v[0]);
        let plain = check(&[&path, "--switched"]);
        let printed = text(&plain.stdout);
        for word in
            ["Exact switched model", "Multipliers", "Averaged holds to", "What the parts bear", "output bank ripple"]
        {
            assert!(printed.contains(word), "{}: {word}\n{printed}", sample.file);
        }
        for stress in &period.stress {
            // Name and number stand apart, and a current at rest is none.
            assert!(printed.contains(&format!("\n  {}  ", stress.name)), "{}: {}\n{printed}", sample.file, stress.name);
            let greatest = stress.peak.abs().max(stress.least.abs());
            for value in [stress.peak, stress.least, stress.average] {
                assert!(value == 0.0 || value.abs() >= 1e-9 * greatest, "{}: {} {value}", sample.file, stress.name);
            }
        }
    }
}

#[test]
fn without_being_asked_there_is_none() {
    let path = sample_path("gimbal-rail.ron");
    assert!(json(&check(&[&path, "--json"]))[0]["switched"].is_null());
    assert!(!text(&check(&[&path]).stdout).contains("Exact switched model"));
}

#[test]
fn a_duty_ratio_out_of_reach_is_told_in_few_digits() {
    let path = sample_path("hive-scale.ron");
    let output = check(&[&path, "--switched", "--set", "control.duty.greatest=0.1234567891"]);
    let told = format!("{}{}", text(&output.stdout), text(&output.stderr));
    let told = told.split_whitespace().collect::<Vec<_>>().join(" ");
    assert_eq!(code(&output), 2, "{told}");
    assert!(told.contains("gives 0.02 to 0.123."), "{told}");
}

/// Common practice: a buck in peak current mode without a ramp doubles its period above half the duty ratio.
#[test]
fn a_switched_loop_that_is_not_stable_is_not_met() {
    let set: Vec<String> = [
        "stage.topology=buck",
        "stage.input.least=11",
        "stage.input.nominal=12",
        "stage.input.greatest=13",
        "stage.output.voltage=7.2",
        "control.mode=peak-current",
        "control.slope=rate",
        "control.slope.rate=0",
        "compensator.divider.upper=10.1k",
        "compensator.divider.lower=2.02k",
        "compensator.r2=200",
    ]
    .iter()
    .flat_map(|setting| ["--set".to_owned(), (*setting).to_owned()])
    .collect();
    let path = sample_path("gimbal-rail.ron");
    let arguments: Vec<&str> =
        [path.as_str(), "--switched", "--json"].into_iter().chain(set.iter().map(String::as_str)).collect();
    let output = check(&arguments);
    assert_eq!(code(&output), 1);
    let report = &json(&output)[0];
    assert_eq!(report["switched"]["stability"], Value::from("period doubling"), "{}", report["switched"]);
    let told = report["findings"].as_array().expect("a list").iter();
    let told: Vec<&str> = told.filter_map(|finding| finding["message"].as_str()).collect();
    assert!(told.iter().any(|message| message.contains("period doubling")), "{told:?}");
}

/// What is set and plays no part is said; a file that cannot be written is told and not named as written.
#[test]
fn idle_settings_and_unwritable_waveforms_are_told() {
    let sample = sample_path("harbour-light.ron");
    let told = check(&[&sample, "--set", "stage.transformer.ratio=0.5"]);
    assert!(text(&told.stdout).contains("plays no part"), "{}", text(&told.stdout));
    let told = check(&[&sample, "--set", "stage.inductor.inductance=20u"]);
    assert!(!text(&told.stdout).contains("plays no part"), "{}", text(&told.stdout));
    let folder = tempfile::tempdir().expect("a folder");
    let path = folder.path().join("missing").join("x.csv");
    let path = path.to_str().expect("a path");
    let ended =
        program().args(["transient", sample.as_str(), "--event", "load-step", "--csv", path]).output().expect("runs");
    assert!(!ended.status.success() && text(&ended.stderr).contains("x.csv"), "{}", text(&ended.stderr));
    assert!(!text(&ended.stdout).contains("Waveforms:"), "{}", text(&ended.stdout));
    assert!(std::fs::read_dir(folder.path()).expect("a folder").next().is_none());
}
