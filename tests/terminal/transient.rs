//! `polewright transient` from outside.

use super::{code, number, program, sample_path, text};
use serde_json::Value;
use std::process::Output;

fn transient(arguments: &[&str]) -> Output {
    program().arg("transient").args(arguments).output().expect("the program runs")
}

fn object(output: &Output) -> Value {
    serde_json::from_slice(&output.stdout).expect("one JSON object")
}

#[test]
fn every_event_is_followed_and_its_waveforms_hold_every_extreme() {
    let path = sample_path("gimbal-rail.ron");
    let folder = tempfile::tempdir().expect("a folder");
    for event in ["start-up", "load-step", "line-step", "reference-step", "overload"] {
        let csv = folder.path().join(format!("{event}.csv"));
        let csv = csv.to_str().expect("UTF-8");
        let settings = ["--set", "event.soft-start=1m", "--set", "control.current-limit=8", "--rows", "300"];
        let all = [&[path.as_str(), "--event", event, "--csv", csv, "--json"], settings.as_slice()].concat();
        let output = transient(&all);
        assert_eq!(code(&output), 0, "{event}: {}", text(&output.stderr));
        let object = object(&output);
        assert_eq!((&object["status"], &object["event"]), (&"done".into(), &event.into()));
        let figures = &object["figures"];
        for field in [
            "before_v",
            "after_v",
            "deviation_v",
            "deviation_at_s",
            "rebound_v",
            "least_v",
            "greatest_v",
            "peak_inductor_a",
        ] {
            assert!(figures[field].is_f64(), "{event} {field}: {figures}");
        }
        // Back where reference and divider hold it, but for the reference step's half volt.
        let held = 1.2 * (1.0 + 38.3 / 2.02) + if event == "reference-step" { 0.5 } else { 0.0 };
        assert!((number(&figures["after_v"]) - held).abs() < 0.01 * held, "{event}: {figures}");
        assert_eq!(object["prediction"].is_null(), matches!(event, "start-up" | "overload"), "{event}");
        if event == "load-step" {
            let (is, said) = (number(&figures["deviation_v"]), number(&object["prediction"]["deviation_v"]));
            assert!((is / said - 1.0).abs() < 0.1, "{is} {said}");
        }
        let mut reader = csv::Reader::from_path(csv).expect("written");
        let names: Vec<String> = reader.headers().expect("a head").iter().map(str::to_owned).collect();
        let place = |name: &str| names.iter().position(|n| n == name).unwrap_or_else(|| panic!("{name} in {names:?}"));
        let rows: Vec<Vec<f64>> = reader
            .records()
            .map(|row| row.expect("a row").iter().map(|field| field.parse().expect("a number")).collect())
            .collect();
        assert_eq!(rows.len(), 300, "{event}");
        assert!(rows.is_sorted_by(|a, b| a[0] < b[0]));
        let greatest = |name: &str| {
            let rows = rows.iter().filter(|row| row[0] >= 0.0);
            rows.map(|row| row[place(name)]).fold(f64::NEG_INFINITY, f64::max)
        };
        assert!((greatest("load_voltage_v_greatest") - number(&figures["greatest_v"])).abs() < 1e-3 * held, "{event}");
        let peak = number(&figures["peak_inductor_a"]);
        assert!((greatest("inductor_current_a_greatest") - peak).abs() < 1e-3 * peak, "{event}");

        let output = transient(&[&[path.as_str(), "--event", event], settings.as_slice()].concat());
        let report = text(&output.stdout);
        for told in ["Gimbal rail", "at nominal input 12 V", "Voltage before", "Settling", "Peak inductor current"] {
            assert!(report.contains(told), "{event}: {told} is not in\n{report}");
        }
        assert_eq!(text(&output.stderr), "");
    }
}

/// Absurd cases end with a message or a bounded run, and with numbers.
#[test]
fn absurd_events_end() {
    let (boost, buck) = (sample_path("gimbal-rail.ron"), sample_path("weather-buoy.ron"));
    for (path, arguments) in [
        // A short, and one that lasts longer than what is followed.
        (&boost, &["--event", "overload", "--set", "event.overload.current=1M"][..]),
        (&buck, &["--event", "overload", "--set", "event.overload.current=1M", "--set", "event.overload.time=1"]),
        // Hardly a load.
        (&boost, &["--event", "load-step", "--load-current", "1u", "--span", "1m"]),
        // A comparator that never trips within the duty limit.
        (&buck, &["--event", "start-up", "--set", "stage.inductor.inductance=10", "--span", "1m"]),
        // Steps far beyond what the loop can follow.
        (&boost, &["--event", "line-step", "--set", "event.line-step.change=-12", "--span", "1m"]),
        (&boost, &["--event", "reference-step", "--set", "event.reference-step.change=1000", "--span", "1m"]),
        (&boost, &["--event", "load-step", "--set", "event.load-step.change=-500", "--span", "1m"]),
        (&boost, &["--event", "load-step", "--set", "control.current-limit=1m", "--span", "1m"]),
        (&boost, &["--event", "load-step", "--set", "event.load-step.slew=1e-3", "--span", "1m"]),
    ] {
        let output = transient(&[&[path.as_str(), "--json"], arguments].concat());
        let object = object(&output);
        assert!(code(&output) <= 2, "{arguments:?}");
        let told = object["findings"].as_array().is_some_and(|findings| !findings.is_empty());
        let ran = object["figures"]["after_v"].as_f64().is_some_and(f64::is_finite);
        assert!(ran || told, "{arguments:?}: {object}");
        assert!(!text(&output.stderr).contains("panicked"), "{arguments:?}");
    }
}

#[test]
fn wrong_input_is_told_at_its_place() {
    let path = sample_path("gimbal-rail.ron");
    for (arguments, reason) in [
        (&["--event", "load"][..], "load-step"),
        (&["--event", "load-step", "--set", "event.soft-start=-1m"], "event.soft-start"),
        (&["--event", "load-step", "--set", "event.start-up.prebias=-1"], "event.start-up.prebias"),
        (&["--event", "load-step", "--set", "event.overload.current=0"], "event.overload.current"),
        (&["--event", "load-step", "--set", "event.overload.time=0"], "event.overload.time"),
        (&["--event", "load-step", "--set", "control.current-limit=-2"], "control.current-limit"),
        (&["--event", "load-step", "--set", "control.current-limit=two"], "not a number"),
        (&["--event", "load-step", "--span", "0"], "above 0 s"),
        (&["--event", "load-step", "--input-voltage", "1"], "problem"),
    ] {
        let output = transient(&[&[path.as_str()], arguments].concat());
        assert_eq!(code(&output), 2, "{arguments:?}: {}", text(&output.stdout));
        assert!(text(&output.stderr).contains(reason), "{arguments:?}: {}", text(&output.stderr));
    }
    // A place that cannot be written is told, and the report is there all the same.
    let output = transient(&[&path, "--event", "load-step", "--csv", "/nowhere/at/all.csv"]);
    assert_eq!(code(&output), 2);
    assert!(text(&output.stdout).contains("Deviation") && text(&output.stderr).contains("/nowhere/at/all.csv"));
    assert_eq!(code(&transient(&["/nowhere/none.ron", "--event", "load-step"])), 2);
}
