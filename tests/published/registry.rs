//! Everything registered goes through every view: each topology with each choice, each sample through analysis and terminal.

use crate::common::{assert_relative, checked};
use polewright::analysis::{Level, Request, Shown, analyse, load_sweep};
use polewright::converter::{self, Conduction, Reach};
use polewright::design::file::{read, write};
use polewright::design::{CheckedDesign, Design, sample};
use serde_json::Value;
use std::path::PathBuf;
use std::process::{Command, Output};

fn terminal(arguments: &[&str]) -> Output {
    Command::new(env!("CARGO_BIN_EXE_polewright")).args(arguments).output().expect("the program starts")
}

fn sample_path(file: &str) -> String {
    let path = PathBuf::from(env!("CARGO_MANIFEST_DIR")).join("sample-designs").join(file);
    path.to_str().expect("a plain path").to_owned()
}

/// A design of this topology that its reach allows, from the defaults.
pub(crate) fn of_topology(key: &str, reach: Reach) -> Design {
    let mut design = Design::default();
    design.set_from_text("stage.topology", key).expect("registered");
    let input = design.values.get("stage.input.greatest").expect("a default");
    // Away from the input where a stage changes its region.
    let regions = converter::find(key).map_or(0, |topology| topology.switching.len());
    let output = match reach {
        Reach::Any if regions > 1 => 1.4 * input,
        Reach::BelowInput => 0.3 * input,
        Reach::AboveInput => 1.6 * input,
        Reach::Any => input,
    };
    design.values.set("stage.output.voltage", output).expect("finite");
    design.values.set("compensator.reference", output / 4.0).expect("finite");
    design.values.set("compensator.divider.upper", 30e3).expect("finite");
    design.values.set("compensator.divider.lower", 10e3).expect("finite");
    design
}

#[test]
fn every_topology_with_every_choice() {
    for topology in converter::registry() {
        for rectifier in ["diode", "synchronous", "emulated"] {
            for load in ["resistor", "current", "power"] {
                for kind in ["1", "2", "3"] {
                    for amplifier in ["op-amp", "transconductance"] {
                        let mut design = of_topology(topology.key, topology.reach);
                        let choices = [
                            ("stage.rectifier", rectifier),
                            ("stage.load", load),
                            ("compensator.type", kind),
                            ("compensator.amplifier", amplifier),
                        ];
                        for (path, key) in choices {
                            design.set_from_text(path, key).expect("an option");
                        }
                        let request = Request {
                            shown: Shown::Levels(Level::Nominal, Level::Greatest),
                            frequencies_hz: vec![1e3, 1e4],
                            band_frequencies_hz: Vec::new(),
                            step_points: 20,
                        };
                        let analysis = analyse(&checked(&design), &request);
                        let detail = analysis.shown.unwrap_or_else(|finding| panic!("{choices:?}: {finding:?}"));
                        assert!((0.0..1.0).contains(&detail.operating_point.duty));
                        assert_eq!(detail.curves.loop_db.len(), 2);
                        at_light_load(&checked(&design), request, rectifier);
                    }
                }
            }
        }
    }
}

/// Every topology in every control mode and conduction mode gives numbers or a reason, and comes back from its file alike.
#[test]
fn every_topology_in_every_control_mode() {
    let modes = ["voltage", "peak-current", "valley-current", "average-current"];
    let options = [
        [("stage.rectifier", "diode"), ("control.sense", "gain"), ("control.slope", "quality")],
        [("stage.rectifier", "emulated"), ("control.sense", "transconductance"), ("control.slope", "share")],
        [("stage.rectifier", "synchronous"), ("control.sense", "gain"), ("control.slope", "rate")],
    ];
    for topology in converter::registry() {
        for mode in modes {
            for choices in options {
                for inner in ["op-amp", "transconductance"] {
                    let mut design = of_topology(topology.key, topology.reach);
                    for (path, key) in
                        choices.into_iter().chain([("control.mode", mode), ("control.inner.amplifier", inner)])
                    {
                        design.set_from_text(path, key).expect("an option");
                    }
                    design.values.set("stage.load.least", 1e-3).expect("finite");
                    let mut file = Vec::new();
                    write(&design, &mut file).expect("written");
                    assert_eq!(read(&mut file.as_slice()).expect("read"), design);
                    let request = Request {
                        shown: Shown::Levels(Level::Nominal, Level::Greatest),
                        frequencies_hz: vec![1e3, 1e5],
                        band_frequencies_hz: Vec::new(),
                        step_points: 20,
                    };
                    let analysis = analyse(&checked(&design), &request);
                    let told = format!("{} {mode} {choices:?}", topology.key);
                    let detail = analysis.shown.unwrap_or_else(|finding| panic!("{told}: {finding:?}"));
                    assert!(detail.control.control_voltage.is_finite() && detail.curves.plant_db[0].is_finite());
                    for condition in &analysis.conditions {
                        match &condition.outcome {
                            Ok(summary) => assert!(summary.control.control_voltage.is_finite(), "{told}"),
                            Err(why) => {
                                assert!(why.place == "control.slope" && mode == "valley-current", "{told}: {why}");
                            }
                        }
                    }
                }
            }
        }
    }
}

/// The same design where its current rests, if its rectifier lets it: every result is there, in the mode of that rectifier.
fn at_light_load(design: &CheckedDesign, request: Request, rectifier: &str) {
    let [_, input_voltage, _] = design.stage.input_voltages;
    let shown = Shown::At { input_voltage, load_current: 0.01 };
    let analysis = analyse(design, &Request { shown, ..request });
    let place = analysis.place();
    let detail = analysis.shown.unwrap_or_else(|finding| panic!("{place}: {finding:?}"));
    let point = &detail.operating_point;
    let wanted = if rectifier == "synchronous" { Conduction::ForcedContinuous } else { Conduction::Discontinuous };
    assert_eq!(point.conduction, wanted, "{place}");
    assert_eq!(point.second_duty.is_some(), detail.boundary_load.is_some());
    assert!(detail.boundary_load.is_none_or(|boundary| boundary > 0.01), "{place}");
    assert_eq!(detail.landmarks.iter().any(|mark| mark.key == "low-pole"), point.second_duty.is_some());
    assert!(detail.curves.loop_db.iter().all(|gain| gain.is_finite()));
    // Right-half-plane zeros are those of the circuit, none made of rounding.
    let fs = design.stage.switching_frequency;
    assert!(detail.right_half_plane_zero_hz.is_none_or(|zero| zero < 1e3 * fs), "{place}");
    let buck = design.stage.topology().reach == Reach::BelowInput;
    assert!(!buck || detail.right_half_plane_zero_hz.is_none(), "{place}: {:?}", detail.right_half_plane_zero_hz);
    let sweep = load_sweep(design, 5).unwrap_or_else(|finding| panic!("{place}: {finding:?}"));
    assert!(sweep.lines.iter().flat_map(|line| &line.points).all(|point| point.outcome.is_ok()), "{place}");
}

#[test]
fn samples_on_disk_are_the_samples_built_in() {
    let folder = PathBuf::from(env!("CARGO_MANIFEST_DIR")).join("sample-designs");
    let mut on_disk: Vec<String> = std::fs::read_dir(folder)
        .expect("the folder")
        .map(|entry| entry.expect("readable").file_name().into_string().expect("a plain name"))
        .collect();
    on_disk.sort();
    let mut built_in: Vec<String> = sample::all().iter().map(|sample| sample.file.to_owned()).collect();
    built_in.sort();
    assert_eq!(on_disk, built_in);
    assert!(built_in.len() >= 8);
}

/// The terminal gives the numbers of the analysis, for every sample.
#[test]
fn every_sample_through_the_terminal() {
    for sample in sample::all() {
        let design = sample.design().expect("a sample reads");
        let request = Request {
            shown: Shown::Levels(Level::Nominal, Level::Nominal),
            frequencies_hz: vec![1e3],
            band_frequencies_hz: Vec::new(),
            step_points: 20,
        };
        let analysis = analyse(&checked(&design), &request);
        let output = terminal(&["check", &sample_path(sample.file), "--json", "--at", "1k"]);
        let wanted_code = i32::from(!analysis.all_met());
        assert_eq!(
            output.status.code(),
            Some(wanted_code),
            "{}: {}",
            sample.file,
            String::from_utf8_lossy(&output.stderr)
        );
        let content: Value = serde_json::from_slice(&output.stdout).expect("valid JSON");
        let object = &content.as_array().expect("an array")[0];
        assert_eq!(object["title"].as_str(), Some(design.title.as_str()));
        let detail = analysis.shown.unwrap_or_else(|finding| panic!("{}: {finding:?}", sample.file));
        assert_eq!(object["loop"]["stable"].as_bool(), Some(detail.loop_gain.stable()), "{}", sample.file);
        // The JSON reader may round the last digit otherwise than it was written.
        let duty = object["operating_point"]["duty"].as_f64().expect("a number");
        assert_relative(sample.file, duty, detail.operating_point.duty, 2.0 * f64::EPSILON);
        let reported = object["response"][0]["loop_db"].as_f64().expect("a number");
        assert_relative("loop gain", reported, detail.curves.loop_db[0], 2.0 * f64::EPSILON);
        let crossovers = object["loop"]["crossovers"].as_array().expect("a list");
        let wanted = &detail.loop_gain.margins.crossovers;
        assert_eq!(crossovers.len(), wanted.len(), "{}", sample.file);
        for (found, wanted) in crossovers.iter().zip(wanted) {
            let found = found["frequency_hz"].as_f64().expect("a number");
            assert_relative("crossover", found, wanted.frequency_hz, 2.0 * f64::EPSILON);
        }
    }
}

#[test]
fn one_sample_is_unstable_on_purpose_and_says_so() {
    let mut unstable = 0;
    for sample in sample::all() {
        let output = terminal(&["check", &sample_path(sample.file), "--json"]);
        let content: Value = serde_json::from_slice(&output.stdout).expect("valid JSON");
        if content[0]["loop"]["stable"].as_bool() == Some(false) {
            unstable += 1;
            assert!(!sample.design().expect("reads").notes.is_empty(), "{} has a note", sample.file);
            let findings = content[0]["findings"].as_array().expect("a list");
            let says = |finding: &Value| {
                finding["message"].as_str().is_some_and(|text| text.to_lowercase().contains("unstable"))
            };
            assert!(findings.iter().any(says), "{}: {findings:?}", sample.file);
        }
    }
    assert_eq!(unstable, 1);
}
