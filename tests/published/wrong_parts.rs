//! Wrong input for the rows that only some topologies have: named at its path, nothing lost, mended by a usable value.
//!
//! *Source*: what each part can be, by definition: a turns ratio and a part are positive, a resistance is none or positive, a coupling
//! factor is below one.

use crate::common::{checked, design};
use polewright::design::{Design, entry, file};

/// A topology with its choices, a path, a text that cannot be used and the reason.
type Wrong = (&'static str, &'static [(&'static str, &'static str)], &'static str, &'static str, &'static str);

const WRONG: [Wrong; 22] = [
    ("flyback", &[], "stage.transformer.ratio", "0", "from 0.001 to 1000"),
    ("flyback", &[], "stage.transformer.ratio", "-0.5", "from 0.001 to 1000"),
    ("flyback", &[], "stage.transformer.ratio", "1e6", "from 0.001 to 1000"),
    ("flyback", &[], "stage.inductor.inductance", "0", "Magnetising inductance must be above 0 H"),
    ("flyback", &[], "stage.inductor.resistance", "-1m", "0 Ω or above"),
    ("sepic", &[], "stage.second-inductor.inductance", "0", "above 0 H"),
    ("sepic", &[], "stage.second-inductor.inductance", "-3u", "above 0 H"),
    ("sepic", &[], "stage.second-inductor.resistance", "-1m", "0 Ω or above"),
    ("sepic", &[], "stage.coupling-capacitor.capacitance", "0", "above 0 F"),
    ("sepic", &[], "stage.coupling-capacitor.esr", "-1m", "0 Ω or above"),
    ("sepic", &[("stage.inductors", "coupled")], "stage.inductors.coupling", "1", "from 0 to 0.999"),
    ("sepic", &[("stage.inductors", "coupled")], "stage.inductors.coupling", "1.2", "from 0 to 0.999"),
    ("sepic", &[("stage.inductors", "coupled")], "stage.inductors.coupling", "-0.1", "from 0 to 0.999"),
    ("sepic", DAMPED, "stage.coupling-capacitor.damping.capacitance", "0", "above 0 F"),
    ("sepic", DAMPED, "stage.coupling-capacitor.damping.resistance", "0", "above 0 Ω"),
    ("cuk", &[], "stage.inductor.inductance", "-1u", "Inductor L1, input side must be above 0 H"),
    ("cuk", &[], "stage.second-inductor.inductance", "0", "above 0 H"),
    ("cuk", &[], "stage.coupling-capacitor.capacitance", "-1u", "above 0 F"),
    ("cuk", &[], "stage.coupling-capacitor.esr", "-1", "0 Ω or above"),
    ("cuk", &[("stage.inductors", "coupled")], "stage.inductors.coupling", "1", "from 0 to 0.999"),
    ("cuk", DAMPED, "stage.coupling-capacitor.damping.capacitance", "-1u", "above 0 F"),
    ("cuk", DAMPED, "stage.coupling-capacitor.damping.resistance", "-1", "above 0 Ω"),
];

const DAMPED: &[(&str, &str)] = &[("stage.coupling-capacitor.damping", "capacitor")];

fn usable(topology: &str, choices: &[(&str, &str)]) -> Design {
    let chosen: Vec<_> = [("stage.topology", topology)].iter().chain(choices).copied().collect();
    let output = [
        ("stage.output.voltage", 12.0),
        ("compensator.reference", 2.5),
        ("compensator.divider.upper", 38e3),
        ("compensator.divider.lower", 10e3),
    ];
    design(&chosen, &output)
}

#[test]
fn wrong_parts_are_named_and_nothing_is_lost() {
    for (topology, choices, path, text, reason) in WRONG {
        let mut design = usable(topology, choices);
        checked(&design);
        design.set_from_text(path, text).expect("a number");
        let problems = design.check().expect_err("unusable");
        assert_eq!(problems.len(), 1, "{path} {text}: {problems:?}");
        let problem = &problems[0];
        assert!(problem.is_problem() && problem.hint.is_some(), "{problem:?}");
        assert_eq!(problem.place, path);
        assert!(problem.message.contains(reason), "{}", problem.message);
        // It is kept, in a file too, until it is mended.
        let mut bytes = Vec::new();
        file::write(&design, &mut bytes).expect("written");
        assert_eq!(file::read(&mut bytes.as_slice()).expect("read"), design);
        design.values.set(path, entry(path).expect("a row").default).expect("finite");
        checked(&design);
    }
}

/// A row that nobody filled in is missed at its path, with a value offered.
#[test]
fn missing_parts_are_asked_for() {
    for (topology, path) in [
        ("flyback", "stage.transformer.ratio"),
        ("sepic", "stage.second-inductor.inductance"),
        ("cuk", "stage.coupling-capacitor.capacitance"),
    ] {
        let mut design = usable(topology, &[]);
        design.values.remove(path);
        let problems = design.check().expect_err("missing");
        assert_eq!((problems.len(), problems[0].place.as_str()), (1, path), "{problems:?}");
        let remedy = problems[0].remedy.clone().expect("a value is offered");
        for (path, value) in &remedy.values {
            design.values.set(path, *value).expect("finite");
        }
        checked(&design);
    }
}

/// Texts that are no numbers or no options change nothing.
#[test]
fn texts_that_are_none_change_nothing() {
    let mut design = usable("sepic", &[]);
    let before = design.clone();
    for path in ["stage.second-inductor.inductance", "stage.coupling-capacitor.esr"] {
        for text in ["", "two", "NaN", "inf", "3,3u", "1 V"] {
            assert_eq!(design.set_from_text(path, text).expect_err("no number").place, path);
        }
    }
    let slip = design.set_from_text("stage.inductors", "copled").expect_err("no option");
    assert!(slip.place == "stage.inductors" && slip.hint.is_some_and(|hint| hint.contains("coupled")));
    let slip = design.set_from_text("stage.coupling-capacitor.capacitence", "1u").expect_err("no path");
    assert!(slip.hint.is_some_and(|hint| hint.contains("stage.coupling-capacitor.capacitance")));
    assert_eq!(design, before);
}

/// Voltages inside a circuit that no terminal shows: the open switch of a flyback holds off the input and the output seen from the
/// primary side, n = Ns/Np; SEPIC and Ćuk hold off input and output together. Energy ½·C·V²: 47 µF at 375 V hold 3.305 J.
#[test]
fn hazardous_voltages_are_cautioned_wherever_they_are() {
    let caution = |design: &Design| {
        let findings = checked(design).findings;
        findings.into_iter().find(|finding| finding.message.starts_with("Caution")).map(|finding| finding.message)
    };
    let inputs = |design: &mut Design, volts: f64| {
        for level in ["least", "nominal", "greatest"] {
            design.values.set(&format!("stage.input.{level}"), volts).expect("finite");
        }
    };
    // 12 V behind a ratio of 0.2 are 60 V at the primary, above 40 V of input.
    let mut low = usable("flyback", &[]);
    inputs(&mut low, 40.0);
    assert_eq!(caution(&low), None);
    low.values.set("stage.transformer.ratio", 0.2).expect("finite");
    assert!(caution(&low).is_some_and(|told| told.contains("100 V")));
    // Rectified mains.
    let mut mains = usable("flyback", &[("stage.input-capacitor", "fitted")]);
    inputs(&mut mains, 375.0);
    for (path, value) in [("stage.transformer.ratio", 0.1), ("stage.input-capacitor.capacitance", 47e-6)] {
        mains.values.set(path, value).expect("finite");
    }
    let told = caution(&mains).expect("375 V");
    assert!(told.contains("495 V") && told.contains("input capacitor at 375 V 3.305 J"), "{told}");
    for topology in ["sepic", "cuk"] {
        let mut two = usable(topology, &[]);
        inputs(&mut two, 47.0);
        assert_eq!(caution(&two), None, "{topology}");
        inputs(&mut two, 49.0);
        assert!(caution(&two).is_some_and(|told| told.contains("61 V")), "{topology}");
    }
}

/// What the flyback's model leaves out stands beside its results.
#[test]
fn the_leakage_left_out_is_told() {
    let findings = checked(&usable("flyback", &[])).findings;
    let told = findings.iter().find(|finding| finding.message.contains("leakage")).expect("told");
    assert_eq!(told.place, "stage.transformer.ratio");
    assert!(!checked(&usable("sepic", &[])).findings.iter().any(|finding| finding.message.contains("leakage")));
}
