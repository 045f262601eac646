//! A topology that the registry has in tests alone comes through rows, file, check, analysis, schematic and report without being
//! named anywhere else.

use super::{CheckRequest, Outcome, check};
use crate::converter::{self, StageCondition};
use crate::design::{self, Design, all_choices, all_entries, file};
use crate::figure::{Numbers, stage_schematic};
use serde_json::Value;

const KEY: &str = "made-up";
const ROW: &str = "stage.made-up.resistance";
const CHOICE: &str = "stage.made-up";

fn made_up() -> Design {
    let mut design = design::sample::built_in();
    design.set_from_text("stage.topology", KEY).expect("registered");
    design
}

#[test]
fn its_rows_come_and_go_with_it() {
    assert!(all_entries().any(|entry| entry.path == ROW) && all_choices().any(|choice| choice.path == CHOICE));
    let has = |design: &Design| design.entries().iter().any(|row| row.path == ROW);
    let asks = |design: &Design| design.choice_rows().iter().any(|row| row.path == CHOICE);
    let name = |design: &Design| {
        let rows = design.entries();
        rows.into_iter().find(|row| row.path == "stage.inductor.inductance").expect("applies").name
    };
    for topology in converter::registry().iter().filter(|topology| topology.key != KEY) {
        let mut design = Design::default();
        design.set_from_text("stage.topology", topology.key).expect("registered");
        assert!(!has(&design) && !asks(&design) && design.choices.get(CHOICE).is_none(), "{}", topology.key);
        assert_ne!(name(&design), "Made-up inductor");
    }
    let mut design = made_up();
    assert!(has(&design) && asks(&design));
    assert_eq!(name(&design), "Made-up inductor");
    assert_eq!((design.values.get(ROW), design.choices.get(CHOICE)), (Some(0.05), Some("fitted")));
    design.set_from_text(CHOICE, "none").expect("an option");
    assert!(!has(&design) && asks(&design));
    // What was entered comes back with the choice.
    design.set_from_text(CHOICE, "fitted").expect("an option");
    design.set_from_text(ROW, "70m").expect("a number");
    design.set_from_text("stage.topology", "boost").expect("registered");
    design.set_from_text("stage.topology", KEY).expect("registered");
    assert_eq!(design.values.get(ROW), Some(0.07));
}

#[test]
fn what_is_wrong_with_its_rows_is_told_there() {
    for (text, reason) in [("0", "above 0 Ω"), ("-1", "above 0 Ω"), ("1e30", "beyond")] {
        let mut design = made_up();
        design.set_from_text(ROW, text).expect("a number");
        let problems = design.check().expect_err("unusable");
        assert_eq!(problems.len(), 1, "{problems:?}");
        assert_eq!(problems[0].place, ROW);
        assert!(problems[0].message.contains(reason), "{}", problems[0].message);
        design.set_from_text(ROW, "50m").expect("a number");
        assert!(design.check().is_ok());
    }
    let mut design = made_up();
    let before = design.clone();
    assert_eq!(design.set_from_text(ROW, "ten").expect_err("no number").place, ROW);
    let slip = design.set_from_text("stage.made-up.resistence", "1").expect_err("a slip");
    assert!(slip.hint.is_some_and(|hint| hint.contains(ROW)));
    assert!(
        design.set_from_text(CHOICE, "fited").expect_err("a slip").hint.is_some_and(|hint| hint.contains("fitted"))
    );
    assert_eq!(design, before);
    // Its voltages and what its model leaves out are told, too.
    let findings = design.check().expect("usable").findings;
    assert!(findings.iter().any(|f| f.place == ROW && f.message.contains("noise")), "{findings:?}");
    assert!(findings.iter().any(|f| f.message.starts_with("Caution") && f.message.contains("71.8")), "{findings:?}");
}

/// D' = (Vin + √(Vin² − 4·R·I·V)) / (2·V) of a boost with a resistance R ahead of it, and nothing else that loses (from V·D' = Vin −
/// R·I/D').
#[test]
fn its_netlist_is_solved_and_drawn() {
    let mut design = made_up();
    for (path, value) in [
        ("stage.source.resistance", 0.0),
        ("stage.inductor.resistance", 0.0),
        ("stage.switch.resistance", 0.0),
        ("stage.synchronous.resistance", 0.0),
        ("stage.bank.1.esr", 0.0),
        (ROW, 0.3),
    ] {
        design.values.set(path, value).expect("finite");
    }
    let stage = design.check().expect("usable").stage;
    let (vin, load, v) = (12.0, 1.0, stage.output_voltage);
    let condition = StageCondition { input_voltage: vin, load_current: load, output_voltage: v };
    let point = stage.averaged(&condition).expect("a point").operating_point;
    let off = (vin + f64::sqrt(vin * vin - 4.0 * 0.3 * load * v)) / (2.0 * v);
    assert!((point.duty - (1.0 - off)).abs() < 1e-9, "{}", point.duty);
    assert!(point.conduction_losses.iter().any(|loss| loss.name == "made-up resistor"));
    let figure = stage_schematic(&Numbers { design: &design, condition: None }, 400.0).expect("known");
    assert!(figure.places.iter().any(|place| place.name.starts_with("Made-up resistor")));
}

#[test]
fn it_goes_through_a_file_and_a_report() {
    let mut design = made_up();
    design.set_from_text(ROW, "20m").expect("a number");
    let mut bytes = Vec::new();
    file::write(&design, &mut bytes).expect("written");
    assert_eq!(file::read(&mut bytes.as_slice()).expect("read"), design);
    let folder = tempfile::tempdir().expect("a folder");
    let path = folder.path().join("made-up.ron");
    std::fs::write(&path, bytes).expect("written");
    let request = |settings: &[(&str, &str)]| CheckRequest {
        files: vec![path.clone()],
        json: true,
        settings: settings.iter().map(|(path, text)| ((*path).to_owned(), (*text).to_owned())).collect(),
        at_hz: None,
        input_voltage: None,
        load_current: None,
        load_sweep: false,
        switched: false,
    };
    let run = |settings: &[(&str, &str)]| {
        let (mut out, mut err) = (Vec::new(), Vec::new());
        let outcome = check(&request(settings), &mut out, &mut err).expect("written");
        let report: Value = serde_json::from_slice(&out).expect("JSON");
        (outcome, report[0].clone())
    };
    let (outcome, report) = run(&[]);
    assert_eq!(outcome, Outcome::Met, "{report}");
    let duty = |report: &Value| report["operating_point"]["duty"].as_f64().expect("a number");
    let named = |mark: &Value| mark["name"].as_str() == Some("Made-up resonance");
    assert!(report["landmarks"].as_array().is_some_and(|marks| marks.iter().any(named)), "{report}");
    let (_, more) = run(&[(ROW, "0.4")]);
    assert!(duty(&more) > duty(&report) + 0.01);
    let (_, none) = run(&[(CHOICE, "none")]);
    assert!(duty(&none) < duty(&report));
    let (outcome, wrong) = run(&[(ROW, "0")]);
    assert_eq!(outcome, Outcome::Unusable);
    assert_eq!(wrong["findings"][0]["where"].as_str(), Some(ROW), "{wrong}");
}
