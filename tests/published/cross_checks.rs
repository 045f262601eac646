//! Definitions put back into themselves: ledgers, margins and window edges of the samples and of random designs.

use crate::common::{assert_absolute, checked, ratio};
use crate::random::Random;
use polewright::analysis::{Analysis, Level, Request, Shown, analyse};
use polewright::converter;
use polewright::design::{Design, sample};

fn request(input: Level, load: Level, frequencies_hz: Vec<f64>) -> Request {
    Request { shown: Shown::Levels(input, load), frequencies_hz, band_frequencies_hz: Vec::new(), step_points: 60 }
}

fn samples() -> Vec<Design> {
    sample::all().iter().map(|sample| sample.design().expect("a sample reads")).collect()
}

/// The ledger adds up to the phase margin it stands beside, at every condition of every sample.
#[test]
fn ledgers_close_on_the_phase_margin() {
    let mut closed = 0;
    for design in samples() {
        let checked = checked(&design);
        for input in Level::ALL {
            for load in Level::ALL {
                let analysis = analyse(&checked, &request(input, load, vec![1e3]));
                let Ok(detail) = analysis.shown else { continue };
                let Some(ledger) = &detail.ledger else { continue };
                let sum: f64 = ledger.rows.iter().map(|row| row.degrees).sum();
                let what = format!("{}, {}", design.title, detail.condition.label);
                assert_absolute(&what, sum, ledger.phase_margin_deg, 1e-9);
                let margin =
                    detail.loop_gain.margins.headline_crossover().expect("a ledger has a crossover").phase_margin_deg;
                assert_absolute(&what, sum, margin, 1e-9);
                closed += 1;
            }
        }
    }
    assert!(closed >= 9, "{closed} ledgers");
}

/// At each crossover found, the curve itself passes through 0 dB with the phase the margin states; at each phase crossover the
/// imaginary part vanishes and the gain is the margin's.
#[test]
fn margins_go_back_into_their_definition() {
    for design in samples() {
        let checked = checked(&design);
        let first = analyse(&checked, &request(Level::Nominal, Level::Nominal, vec![1e3]));
        let Ok(detail) = first.shown else { continue };
        let margins = &detail.loop_gain.margins;
        let crossovers: Vec<f64> = margins.crossovers.iter().map(|c| c.frequency_hz).collect();
        let phase_crossovers: Vec<f64> = margins.phase_crossovers.iter().map(|c| c.frequency_hz).collect();
        let mut frequencies = [crossovers, phase_crossovers, vec![margins.modulus_frequency_hz]].concat();
        let again = analyse(&checked, &request(Level::Nominal, Level::Nominal, std::mem::take(&mut frequencies)));
        let curves = again.shown.expect("as before").curves;
        for (k, crossover) in margins.crossovers.iter().enumerate() {
            assert_absolute("gain at a crossover", ratio(curves.loop_db[k]), 1.0, 1e-8);
            let turned = (180.0 + curves.loop_deg[k] - crossover.phase_margin_deg) / 360.0;
            assert_absolute("phase at a crossover", turned, turned.round(), 1e-9);
        }
        for (k, crossing) in margins.phase_crossovers.iter().enumerate() {
            let at = margins.crossovers.len() + k;
            let half_turns = curves.loop_deg[at] / 180.0;
            assert_absolute("phase at a phase crossover", half_turns, half_turns.round(), 1e-8);
            assert!(half_turns.round().rem_euclid(2.0) > 0.5, "an odd number of half turns");
            assert_absolute("gain margin", -curves.loop_db[at], crossing.gain_margin_db, 1e-6);
        }
        let last = curves.loop_db.len() - 1;
        let (gain, phase) = (ratio(curves.loop_db[last]), curves.loop_deg[last].to_radians());
        let distance = (1.0 + gain * phase.cos()).hypot(gain * phase.sin());
        assert_absolute("modulus margin", distance, margins.modulus_margin, 1e-8);
    }
}

/// The debug text around a number that no result may hold, if there is one. Minus infinity decibels are the one exception: a line response
/// that feed-forward cancels exactly is nothing at all.
pub(crate) fn non_number(analysis: &Analysis) -> Option<String> {
    let mut analysis = analysis.clone();
    if let Ok(detail) = &mut analysis.shown {
        for curve in [&mut detail.curves.line_to_output_db, &mut detail.curves.open_loop_line_to_output_db] {
            if curve.iter().all(|db| *db == f64::NEG_INFINITY) {
                curve.clear();
            }
        }
    }
    let text = format!("{analysis:?}");
    let words = text.split(|c: char| !c.is_alphanumeric());
    let word = words.into_iter().find(|word| *word == "NaN" || *word == "inf")?;
    let at = word.as_ptr() as usize - text.as_ptr() as usize;
    Some(text.chars().skip(at.saturating_sub(300)).take(400).collect())
}

/// A design over a range far wider than sense, its entries within their bounds.
fn random_design(random: &mut Random, topologies: &[&str]) -> Design {
    let mut design = Design::default();
    let choose = |design: &mut Design, path: &str, keys: &[&str], random: &mut Random| {
        design.set_from_text(path, random.pick::<&str>(keys)).expect("an option");
    };
    choose(&mut design, "stage.topology", topologies, random);
    choose(&mut design, "stage.rectifier", &["diode", "synchronous", "emulated"], random);
    choose(&mut design, "stage.load", &["resistor", "current", "power"], random);
    choose(&mut design, "stage.input-capacitor", &["none", "fitted"], random);
    choose(&mut design, "stage.bank", &["1", "2", "3", "4"], random);
    choose(&mut design, "control.feedforward", &["none", "line"], random);
    choose(&mut design, "compensator.type", &["1", "2", "3"], random);
    choose(&mut design, "compensator.amplifier", &["op-amp", "transconductance"], random);
    let own: Vec<_> = design.choice_rows().into_iter().filter(|row| !converter::is_common(row.path)).collect();
    for row in own {
        let keys: Vec<&str> = row.options.iter().map(|option| option.key).collect();
        choose(&mut design, row.path, &keys, random);
    }
    if !design.choices.is("compensator.type", "3") {
        choose(&mut design, "compensator.feedforward-capacitor", &["none", "fitted"], random);
    }
    let vin = random.log(1.0, 500.0);
    let vout = match design.choices.get("stage.topology") {
        Some("buck") => vin * random.between(0.02, 0.9),
        Some("boost") => vin * 1.3 / (1.0 - random.between(0.02, 0.85)),
        _ => vin * random.log(0.05, 5.0),
    };
    let load = random.log(1e-3, 200.0);
    let reference = vout * random.between(0.02, 0.98);
    let lower = random.log(100.0, 1e6);
    let mut set = |path: &str, value: f64| design.values.set(path, value).expect("finite");
    set("stage.input.least", vin * 0.9);
    set("stage.input.nominal", vin);
    set("stage.input.greatest", vin * 1.2);
    set("stage.load.least", load * 0.5);
    set("stage.load.nominal", load);
    set("stage.load.greatest", load * 2.0);
    set("stage.output.voltage", vout);
    set("compensator.reference", reference);
    set("compensator.divider.lower", lower);
    set("compensator.divider.upper", lower * (vout / reference - 1.0));
    let paths: Vec<&str> = design.entries().iter().map(|entry| entry.path).collect();
    for path in paths {
        let range = match path.rsplit('.').next() {
            Some("inductance" | "capacitance") => (1e-8, 1e-1),
            Some("ratio") => (0.01, 50.0),
            Some("coupling") => (1e-3, 0.999),
            Some("resistance") if path.starts_with("stage") => (1e-4, vout / load),
            Some("esr") => (1e-5, 10.0),
            Some("esl") => (1e-11, 1e-6),
            Some("r2" | "r3") => (1.0, 1e7),
            Some("c1" | "c2" | "c3" | "cff") => (1e-13, 1e-4),
            Some("delay") => (1e-10, 1e-5),
            Some("dc-gain") => (10.0, 1e8),
            Some("gain-bandwidth") => (1e3, 1e9),
            Some("gm") => (1e-6, 1.0),
            Some("output-resistance") => (1e2, 1e9),
            Some("switching-frequency") => (1e3, 1e8),
            _ => continue,
        };
        // Nothing at all is as legal as any size for what may be absent.
        let may_be_absent = matches!(path.rsplit('.').next(), Some("esr" | "esl" | "delay"))
            || (path.starts_with("stage") && path.ends_with("resistance") && !path.contains("damping"));
        let value = if may_be_absent && random.between(0.0, 1.0) < 0.3 { 0.0 } else { random.log(range.0, range.1) };
        design.values.set(path, value).expect("finite");
    }
    design
}

/// Whatever is entered, an analysis ends and every number in it is a number; what cannot be computed is a finding.
#[test]
fn random_designs_give_numbers_or_findings() {
    numbers_or_findings(7, 1500, &["buck", "boost", "buck-boost"]);
}

/// The same with a transformer or two inductors.
#[test]
fn random_designs_of_other_topologies_give_numbers_or_findings() {
    numbers_or_findings(8, 1500, &["sepic", "cuk", "flyback"]);
}

fn numbers_or_findings(seed: u64, count: usize, topologies: &[&str]) {
    let mut random = Random::new(seed);
    let (mut usable, mut computed) = (0, 0);
    for _ in 0..count {
        let design = random_design(&mut random, topologies);
        let Ok(checked) = design.check() else { continue };
        usable += 1;
        let fs = design.values.get("stage.switching-frequency").expect("entered");
        let frequencies = [1e-5, 1e-3, 0.1, 0.5].map(|part| part * fs).to_vec();
        let analysis = analyse(&checked, &request(Level::Nominal, Level::Nominal, frequencies));
        computed += usize::from(analysis.shown.is_ok());
        if let Some(text) = non_number(&analysis) {
            panic!("a result is no number: …{text}… in {design:?}");
        }
    }
    assert!(usable * 3 > count * 2, "{usable} designs could be used");
    assert!(computed * 5 > count, "{computed} designs were computed");
}
