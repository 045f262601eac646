//! Every topology × control mode × conduction mode through operating point, analysis, steps, file round trip and terminal.

use crate::common::{analysed, at_one_condition, checked};
use crate::cross_checks::non_number;
use polewright::converter::{self, Conduction, Reach, StageCondition, Topology};
use polewright::design::{Design, file};
use serde_json::Value;
use std::process::Command;

const MODES: [&str; 4] = ["voltage", "peak-current", "valley-current", "average-current"];

/// A rectifier, the load over the boundary load, and how the stage then conducts.
const CONDUCTION: [(&str, f64, Conduction); 5] = [
    ("diode", 3.0, Conduction::Continuous),
    ("emulated", 3.0, Conduction::Continuous),
    ("synchronous", 0.3, Conduction::ForcedContinuous),
    ("diode", 0.3, Conduction::Discontinuous),
    ("emulated", 0.3, Conduction::Discontinuous),
];

/// 12 V into an output the topology can give, at a load so many times that of the boundary between conduction modes.
fn design_of(topology: &Topology, mode: &str, rectifier: &str, over_boundary: f64) -> Design {
    let mut design = Design::default();
    for (path, key) in [
        ("stage.topology", topology.key),
        ("control.mode", mode),
        ("stage.rectifier", rectifier),
        ("control.slope", "share"),
    ] {
        design.set_from_text(path, key).unwrap_or_else(|finding| panic!("{finding:?}"));
    }
    let output = match topology.reach {
        Reach::BelowInput => 5.0,
        Reach::AboveInput => 24.0,
        // Away from the input where a stage changes its region.
        Reach::Any if topology.switching.len() > 1 => 7.0,
        Reach::Any => 12.0,
    };
    let values = [
        ("stage.output.voltage", output),
        ("compensator.reference", output / 4.0),
        ("compensator.divider.upper", 30e3),
        ("compensator.divider.lower", 10e3),
        // Slow enough for all.
        ("compensator.r2", 150.0),
        ("compensator.c1", 1e-6),
        ("compensator.c2", 33e-9),
        ("control.slope.share", 0.8),
        ("control.duty.least", 0.0),
        ("control.blanking", 20e-9),
        ("control.delay", 20e-9),
    ];
    for (path, value) in values {
        design.values.set(path, value).expect("finite");
    }
    at_one_condition(&mut design, 12.0, 1.0);
    // A synchronous rectifier has no boundary; a diode's is near it.
    let mut blocking = design.clone();
    if rectifier == "synchronous" {
        blocking.set_from_text("stage.rectifier", "emulated").expect("an option");
    }
    let condition = StageCondition { input_voltage: 12.0, load_current: 1.0, output_voltage: output };
    let boundary = checked(&blocking).stage.boundary_load(&condition).expect("a boundary");
    at_one_condition(&mut design, 12.0, boundary * over_boundary);
    design.title = format!("{} {mode} {rectifier} × {over_boundary}", topology.key);
    design
}

pub(crate) fn each(try_one: impl Fn(&Design, Conduction)) {
    let mut count = 0;
    for topology in converter::registry() {
        for mode in MODES {
            for (rectifier, over_boundary, conduction) in CONDUCTION {
                try_one(&design_of(topology, mode, rectifier, over_boundary), conduction);
                count += 1;
            }
        }
    }
    assert_eq!(count, converter::registry().len() * MODES.len() * CONDUCTION.len());
}

#[test]
fn every_mode_is_analysed() {
    let stable = std::cell::Cell::new(0);
    each(|design, conduction| {
        let analysis = analysed(design, &[1.0, 1e3, 1e5], 50);
        assert_eq!(non_number(&analysis), None, "{}", design.title);
        let detail = analysis.shown.unwrap_or_else(|finding| panic!("{}: {finding:?}", design.title));
        let point = &detail.operating_point;
        assert_eq!(point.conduction, conduction, "{}", design.title);
        assert_eq!(point.second_duty.is_some(), conduction == Conduction::Discontinuous, "{}", design.title);
        assert!(point.duty > 0.0 && point.duty + point.second_duty.unwrap_or(0.0) < 1.0, "{}", design.title);
        let programmed = ["peak-current", "valley-current"].iter().any(|mode| design.choices.is("control.mode", mode));
        let sampled = programmed && conduction != Conduction::Discontinuous;
        assert_eq!(detail.control.sampling.is_some(), sampled, "{}", design.title);
        let average = design.choices.is("control.mode", "average-current");
        assert_eq!(detail.control.inner.is_some(), average, "{}", design.title);
        assert_eq!(detail.curves.loop_db.len(), 3, "{}", design.title);
        for step in [&detail.steps.load, &detail.steps.line, &detail.steps.reference] {
            assert_eq!(step.is_some(), detail.loop_gain.stable(), "{}", design.title);
        }
        stable.set(stable.get() + usize::from(detail.loop_gain.stable()));
    });
    // One compensator need not suit all, but the steps of most are walked through.
    assert!(stable.get() >= 50, "{} stable", stable.get());
}

#[test]
fn every_mode_goes_through_a_file() {
    each(|design, _| {
        let mut bytes = Vec::new();
        file::write(design, &mut bytes).unwrap_or_else(|error| panic!("{}: {error:?}", design.title));
        let back = file::read(&mut bytes.as_slice()).unwrap_or_else(|error| panic!("{}: {error:?}", design.title));
        assert_eq!(back, *design, "{}", design.title);
    });
}

/// A number in the text that is none, if there is one; prose of the findings has no such words.
pub(crate) fn no_number(text: &str) -> Option<&str> {
    text.split(|c: char| !c.is_alphanumeric()).find(|word| matches!(*word, "NaN" | "inf"))
}

#[test]
fn every_mode_goes_through_the_terminal() {
    let folder = tempfile::tempdir().expect("a folder");
    let mut paths = Vec::new();
    let (titles, conductions) = (std::cell::RefCell::new(Vec::new()), std::cell::RefCell::new(Vec::new()));
    each(|design, conduction| {
        titles.borrow_mut().push(design.title.clone());
        conductions.borrow_mut().push(conduction);
        let path = folder.path().join(format!("{}.polewright", titles.borrow().len()));
        file::save(design, &path).unwrap_or_else(|error| panic!("{}: {error:?}", design.title));
    });
    for k in 1..=titles.borrow().len() {
        paths.push(folder.path().join(format!("{k}.polewright")));
    }
    let run = |json: bool| {
        let mut command = Command::new(env!("CARGO_BIN_EXE_polewright"));
        command.arg("check").args(&paths);
        if json {
            command.arg("--json");
        }
        let output = command.output().expect("the program starts");
        assert!(matches!(output.status.code(), Some(0 | 1)), "{}", String::from_utf8_lossy(&output.stderr));
        String::from_utf8(output.stdout).expect("text")
    };
    assert_eq!(no_number(&run(false)), None);
    let report = run(true);
    assert_eq!(no_number(&report), None);
    let content: Value = serde_json::from_str(&report).expect("valid JSON");
    let objects = content.as_array().expect("an array");
    assert_eq!(objects.len(), paths.len());
    for ((object, title), conduction) in objects.iter().zip(titles.borrow().iter()).zip(conductions.borrow().iter()) {
        assert_eq!(object["title"].as_str(), Some(title.as_str()));
        assert_ne!(object["status"].as_str(), Some("unusable"), "{title}");
        assert_eq!(object["operating_point"]["conduction"].as_str(), Some(conduction.word()), "{title}");
        let stable = object["loop"]["stable"].as_bool();
        assert_eq!(object["load_step"]["deviation_v"].is_number(), stable == Some(true), "{title}");
    }
}
