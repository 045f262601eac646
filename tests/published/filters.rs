//! Input filters and second stages: worked examples of textbooks, and nodal equations written by hand.

use crate::common::{
    PUBLISHED, PUBLISHED_DEG, analysed, assert_absolute, assert_relative, at_one_condition, checked, lossless, nominal,
    ratio,
};
use crate::registry::of_topology;
use crate::textbook::{buck, printed_network, set};
use polewright::analysis::loop_model::{LoopModel, Shared};
use polewright::analysis::{Curves, Level, Request, Shown, analyse};
use polewright::converter;
use polewright::design::Design;
use polewright::linear::{Complex, Verdict};

/// An input filter without resistances, as the books draw it [H, F].
fn with_filter(design: &mut Design, inductance: f64, capacitance: f64) {
    design.set_from_text("stage.input-filter", "fitted").expect("an option");
    set(
        design,
        &[
            ("stage.input-filter.inductance", inductance),
            ("stage.input-filter.resistance", 0.0),
            ("stage.input-capacitor.capacitance", capacitance),
            ("stage.input-capacitor.esr", 0.0),
        ],
    );
}

/// A resistor [Ω] in series with a capacitor [F] across the input capacitor.
fn damped(design: &mut Design, resistance: f64, capacitance: f64) {
    design.set_from_text("stage.input-filter.damping", "capacitor").expect("an option");
    set(
        design,
        &[
            ("stage.input-filter.damping.resistance", resistance),
            ("stage.input-filter.damping.capacitance", capacitance),
        ],
    );
}

/// The buck of Erickson & Maksimovic 3rd ed., 9.5.4, with its printed compensator behind the input filter of 17.3 or a smaller one
/// (recomputed: averaged equations by hand and an exact switched orbit agree). One healthy-looking crossover says nothing: the
/// undamped filter makes the loop unstable at its own resonance.
#[test]
fn the_buck_behind_input_filters() {
    let mut design = buck();
    printed_network(&mut design, Some(500.0));
    with_filter(&mut design, 330e-6, 470e-6);
    let detail = nominal(&design, &[100.0]);
    let [crossover] = detail.loop_gain.margins.crossovers.as_slice() else { panic!("one crossover") };
    assert_relative("crossover", crossover.frequency_hz, 5337.0, PUBLISHED);
    assert_absolute("phase margin", crossover.phase_margin_deg, 48.3, PUBLISHED_DEG);
    let Verdict::Unstable { frequency_hz, growth_per_s, .. } = detail.loop_gain.verdict else { panic!("unstable") };
    assert_relative("oscillation", frequency_hz, 399.0, PUBLISHED);
    assert_relative("growth, as a frequency", growth_per_s / std::f64::consts::TAU, 16.7, PUBLISHED);

    damped(&mut design, 0.666, 1184e-6);
    let detail = nominal(&design, &[100.0]);
    let [crossover] = detail.loop_gain.margins.crossovers.as_slice() else { panic!("one crossover") };
    assert_relative("crossover, damped", crossover.frequency_hz, 5330.0, PUBLISHED);
    assert_absolute("phase margin, damped", crossover.phase_margin_deg, 48.4, PUBLISHED_DEG);
    assert!(detail.loop_gain.stable());
}

/// The same loop behind 31 µH and 47 µF (recomputed): three crossovers, one of them with a margin below zero, and yet stable.
#[test]
fn three_crossovers_of_a_stable_loop() {
    let mut design = buck();
    printed_network(&mut design, Some(500.0));
    with_filter(&mut design, 31e-6, 47e-6);
    let wanted = [
        [(3590.0, 30.2), (4290.0, -79.3), (6090.0, 53.7)],
        // Damped by 1.7 Ω and 29 µF.
        [(3310.0, 52.5), (3800.0, 89.4), (5760.0, 56.2)],
    ];
    for (k, wanted) in wanted.iter().enumerate() {
        if k == 1 {
            damped(&mut design, 1.7, 29e-6);
        }
        let detail = nominal(&design, &[100.0]);
        let crossovers = &detail.loop_gain.margins.crossovers;
        assert_eq!(crossovers.len(), 3, "{crossovers:?}");
        for (j, (crossover, (frequency, margin))) in crossovers.iter().zip(wanted).enumerate() {
            assert_relative("crossover", crossover.frequency_hz, *frequency, PUBLISHED);
            assert_absolute("phase margin", crossover.phase_margin_deg, *margin, PUBLISHED_DEG);
            assert_eq!(crossover.falling, j != 1);
        }
        assert!(detail.loop_gain.stable());
        if k == 0 {
            // Slowest oscillating pair −250 ± j3989 Hz.
            let checked = checked(&design);
            let shared = Shared::new(&checked).expect("solvable");
            let condition = converter::StageCondition { input_voltage: 28.0, load_current: 5.0, output_voltage: 15.0 };
            let closed = LoopModel::new(&checked.stage, &shared, &condition).expect("a loop").closed(&shared);
            let poles = closed.expect("joined").poles().expect("poles");
            let oscillating = poles.iter().filter(|p| p.im > 0.0).max_by(|p, q| p.re.total_cmp(&q.re));
            let pair = oscillating.expect("a pair") / std::f64::consts::TAU;
            assert_absolute("growth of the slowest pair, as a frequency", pair.re, -250.0, 1.5);
            assert_relative("its frequency", pair.im, 3989.0, PUBLISHED);
        }
    }
}

/// The numbers of the filter example itself (Erickson & Maksimovic 3rd ed., 17.3, quoted): 30 V, D 0.5, 100 µH, 100 µF, 3 Ω behind
/// 330 µH and 470 µF. R/D² is the converter's input resistance at rest; the least ZD lies at the output's resonance (printed 1.33 Ω,
/// asymptotic; recomputed 1.265 Ω).
#[test]
fn the_filter_against_the_buck() {
    let mut design = lossless(
        "buck",
        &[
            ("stage.output.voltage", 15.0),
            ("stage.switching-frequency", 100e3),
            ("stage.inductor.inductance", 100e-6),
            ("stage.bank.1.capacitance", 100e-6),
            ("control.ramp.amplitude", 4.0),
            ("compensator.reference", 5.0),
            ("compensator.divider.upper", 96e3),
            ("compensator.divider.lower", 48e3),
        ],
    );
    at_one_condition(&mut design, 30.0, 5.0);
    with_filter(&mut design, 330e-6, 470e-6);
    let detail = nominal(&design, &[1.0, 404.0, 1592.0]);
    assert_relative("duty ratio", detail.operating_point.duty, 0.5, 1e-9);
    let found = detail.input_filter.expect("a filter");
    assert_relative("resonance", found.result.resonance_hz, 404.1, 1e-3);
    assert_relative("R0f", found.result.characteristic_impedance_ohm, 0.838, 1e-3);
    let [open, nulled, _] = found.result.margins;
    assert_relative("R/D² at rest", found.curves.open_loop_ohm[0], 12.0, 1e-3);
    assert_relative("ZN of a buck is −R/D² throughout", nulled.converter_ohm, 12.0, 1e-9);
    assert_absolute("its phase", found.curves.nulled_deg[2].abs(), 180.0, 1e-9);
    assert_relative("least ZD", found.curves.open_loop_ohm[2], 1.265, 2e-3);
    // Without damping the peak is bounded by nothing but rounding: the criterion is violated at the filter's resonance.
    assert_relative("where the criterion is violated", open.frequency_hz, 404.1, 2e-3);
    assert!(open.margin_db < -40.0 && nulled.margin_db < -40.0);
    // Damped to 1 Ω: below the least ZD by 1.265/1, at most.
    damped(&mut design, 0.666, 1184e-6);
    let found = nominal(&design, &[269.0]).input_filter.expect("a filter").result;
    assert_relative("peak", found.peak_ohm, 1.0, 2e-3);
    assert_relative("peak at", found.peak_hz, 269.0, PUBLISHED);
    assert!(found.margins.iter().take(2).all(|m| m.margin_db > 0.0), "{found:?}");
}

/// Nodal equations by hand for the filter's impedance with everything fitted, either damping branch: against the curve.
#[test]
fn filter_impedance_by_nodal_equations() {
    let (rs, l, dcr, c, esr) = (0.05, 4.7e-6, 0.012, 22e-6, 0.004);
    let (rd, cd, ld) = (0.3, 100e-6, 1.2e-6);
    for branch in ["none", "capacitor", "inductor"] {
        let mut design = buck();
        with_filter(&mut design, l, c);
        design.set_from_text("stage.input-filter.damping", branch).expect("an option");
        set(
            &mut design,
            &[
                ("stage.source.resistance", rs),
                ("stage.input-filter.resistance", dcr),
                ("stage.input-capacitor.esr", esr),
                ("stage.input-filter.damping.resistance", rd),
                ("stage.input-filter.damping.capacitance", cd),
                ("stage.input-filter.damping.inductance", ld),
            ],
        );
        let frequencies = [10.0, 1e3, 8e3, 15.65e3, 40e3];
        let curves = nominal(&design, &frequencies).input_filter.expect("a filter").curves;
        for (k, f) in frequencies.iter().enumerate() {
            let s = Complex::new(0.0, std::f64::consts::TAU * f);
            let mut series = s * l + dcr;
            let mut shunt = (s * c).inv() + esr;
            match branch {
                "capacitor" => shunt = (shunt.inv() + ((s * cd).inv() + rd).inv()).inv(),
                "inductor" => series = (series.inv() + (s * ld + rd).inv()).inv(),
                _ => {}
            }
            let zo = ((series + rs).inv() + shunt.inv()).inv();
            assert_relative("|Zo|", curves.filter_ohm[k], zo.norm(), 1e-9);
            assert_absolute("its phase", curves.filter_deg[k], zo.arg().to_degrees(), 1e-7);
        }
    }
}

/// Two routes (the extra element theorem, Middlebrook 1976; Erickson & Maksimovic 3rd ed., app. C; memory): the loop gain derived from
/// the netlist with its filter is the one without it times (1 + Zo/ZN)/(1 + Zo/ZD), for every topology, control mode and conduction
/// mode; and the closed-loop input impedance is what that theorem makes of ZD, ZN and T.
#[test]
fn the_extra_element_theorem() {
    for topology in ["buck", "boost", "buck-boost"] {
        for mode in ["voltage", "peak-current", "valley-current", "average-current"] {
            for load in [2.0, 0.02] {
                let mut design = Design::default();
                for (path, key) in [
                    ("stage.topology", topology),
                    ("control.mode", mode),
                    ("stage.input-filter", "fitted"),
                    ("stage.input-filter.damping", "capacitor"),
                ] {
                    design.set_from_text(path, key).expect("an option");
                }
                let output = if topology == "buck" { 5.0 } else { 24.0 };
                set(
                    &mut design,
                    &[
                        ("stage.output.voltage", output),
                        ("compensator.reference", output / 4.0),
                        ("compensator.divider.upper", 30e3),
                        ("compensator.divider.lower", 10e3),
                        ("stage.input-capacitor.esr", 0.0),
                        ("control.delay", 50e-9),
                    ],
                );
                if mode == "valley-current" || mode == "peak-current" {
                    design.set_from_text("control.slope", "rate").expect("an option");
                    set(&mut design, &[("control.slope.rate", 200e3)]);
                }
                at_one_condition(&mut design, 12.0, load);
                let frequencies = [100.0, 2e3, 7e3, 11e3, 30e3, 100e3];
                let with = nominal(&design, &frequencies);
                // The same stage at the filter's terminals; the source's resistance is the winding's.
                let drop = 0.01 * with.operating_point.input_current;
                let mut bare = design.clone();
                bare.set_from_text("stage.input-filter", "none").expect("an option");
                at_one_condition(&mut bare, 12.0 - drop, load);
                let without = nominal(&bare, &frequencies);
                assert_relative("duty", without.operating_point.duty, with.operating_point.duty, 1e-9);
                assert_eq!(without.operating_point.conduction, with.operating_point.conduction);
                let z = with.input_filter.expect("a filter").curves;
                for k in 0..frequencies.len() {
                    let polar = |ohm: &[f64], deg: &[f64]| Complex::from_polar(ohm[k], deg[k].to_radians());
                    let loop_of = |c: &Curves| Complex::from_polar(ratio(c.loop_db[k]), c.loop_deg[k].to_radians());
                    let (zo, zd) = (polar(&z.filter_ohm, &z.filter_deg), polar(&z.open_loop_ohm, &z.open_loop_deg));
                    let zn = polar(&z.nulled_ohm, &z.nulled_deg);
                    let t = loop_of(&without.curves);
                    let expected = t * (zo / zn + 1.0) / (zo / zd + 1.0);
                    let off = (loop_of(&with.curves) / expected - 1.0).norm();
                    assert!(off < 1e-6, "{topology} {mode} {load} A at {} Hz: {off:e}", frequencies[k]);
                    let zi = polar(&z.closed_loop_ohm, &z.closed_loop_deg);
                    let expected = (zd.inv() + t / zn) / (t + 1.0);
                    assert!((zi * expected - 1.0).norm() < 1e-6, "{topology} {mode}");
                }
            }
        }
    }
}

/// A loop the filter makes unstable is told so, by the filter's resonance; the remedy that comes with it is one press, and mends it.
#[test]
fn the_remedy_mends_what_the_filter_spoils() {
    let mut design = buck();
    printed_network(&mut design, Some(500.0));
    with_filter(&mut design, 330e-6, 470e-6);
    let analysis = analysed(&design, &[100.0], 20);
    let told = &analysis.findings[0];
    assert!(told.is_problem() && told.place == "stage.input-filter", "{told:?}");
    assert!(told.message.contains("because of the input filter") && told.message.contains("404 Hz"), "{told:?}");
    assert!(analysis.findings.iter().any(|f| f.message.contains("criterion is violated")), "{:?}", analysis.findings);
    let result = analysis.conditions[4].outcome.as_ref().expect("computed").input_filter.expect("a filter");
    assert_eq!(result.stable_without, Some(true));
    let remedy = told.remedy.as_ref().expect("a remedy");
    for (path, key) in &remedy.choices {
        design.set_from_text(path, key).expect("an option");
    }
    for (path, value) in &remedy.values {
        design.values.set(path, *value).expect("finite");
    }
    let mended = analysed(&design, &[100.0], 20);
    assert!(mended.conditions.iter().all(|c| c.outcome.as_ref().is_ok_and(|s| s.loop_gain.stable())));
    let margin = mended.conditions[4].outcome.as_ref().expect("computed").input_filter.expect("a filter");
    assert!(margin.least_margin().margin_db > 5.9, "{margin:?}");
    assert!(!mended.findings.iter().any(|f| f.place == "stage.input-filter"), "{:?}", mended.findings);
}

/// A load behind a second stage whose bank is sensed: closed-loop responses at the load by nodal equations, from the loop's own
/// numbers. Above the crossover nothing but the second stage and the bank stands at the load.
#[test]
fn output_impedance_beyond_the_sense_point() {
    let (lo, dcr, co, esr) = (1e-6, 0.01, 22e-6, 0.005);
    let mut design = buck();
    printed_network(&mut design, Some(500.0));
    design.set_from_text("stage.output-filter", "fitted").expect("an option");
    design.set_from_text("stage.load", "current").expect("an option");
    set(
        &mut design,
        &[
            ("stage.output-filter.inductance", lo),
            ("stage.output-filter.resistance", dcr),
            ("stage.output-filter.capacitance", co),
            ("stage.output-filter.esr", esr),
            ("stage.bank.1.esr", 0.01),
        ],
    );
    let frequencies = [50.0, 1e3, 5e3, 20e3, 34e3];
    for sense in ["bank", "load"] {
        design.set_from_text("stage.output-filter.sense", sense).expect("an option");
        let detail = nominal(&design, &frequencies);
        let drop = if sense == "bank" { 5.0 * dcr } else { 0.0 };
        assert_absolute("the load's voltage", detail.operating_point.load_voltage, 15.0 - drop, 1e-12);
        let step = detail.steps.load.as_ref().expect("stable");
        assert_absolute("before the step", step.initial_v, 15.0 - drop, 1e-12);
        let c = &detail.curves;
        for (k, f) in frequencies.iter().enumerate() {
            let s = Complex::new(0.0, std::f64::consts::TAU * f);
            let (series, shunt) = (s * lo + dcr, (s * co).inv() + esr);
            // The buck's own output: inductor beside bank; it drives the second stage.
            let bank = (s * 500e-6).inv() + 0.01;
            let own = ((s * 50e-6).inv() + bank.inv()).inv();
            let duty_gain = 28.0 / 4.0;
            // Sensed voltage from control, and the divider into the second stage.
            let chain = series + shunt;
            let at_bank = (own.inv() + chain.inv()).inv() / (s * 50e-6) * duty_gain;
            let over = shunt / chain;
            let network = Complex::from_polar(ratio(c.compensator_db[k]), c.compensator_deg[k].to_radians());
            // Injected current at the load, loop open: at the load and at the bank.
            let open = (shunt.inv() + (series + own).inv()).inv();
            let open_bank = open * own / (series + own);
            let (sensed_from_control, sensed_from_load) =
                if sense == "bank" { (at_bank, open_bank) } else { (at_bank * over, open) };
            let t = sensed_from_control * network;
            let closed = open - at_bank * over * network * sensed_from_load / (t + 1.0);
            assert_relative("output impedance", c.output_impedance_ohm[k], closed.norm(), 1e-6);
            let plant = Complex::from_polar(ratio(c.plant_db[k]), c.plant_deg[k].to_radians());
            assert!((plant / sensed_from_control - 1.0).norm() < 1e-6);
            assert_relative("open loop", c.open_loop_output_impedance_ohm[k], open.norm(), 1e-6);
        }
    }
}

/// Every topology behind every input filter and before every second stage, in every control mode: computed, through the file and back.
#[test]
fn every_topology_with_every_filter() {
    for topology in converter::registry() {
        for (input, damping) in [("none", "none"), ("fitted", "none"), ("fitted", "capacitor"), ("fitted", "inductor")]
        {
            for (output, across, sense) in
                [("none", "none", "load"), ("fitted", "none", "load"), ("fitted", "resistor", "bank")]
            {
                for mode in ["voltage", "peak-current", "valley-current", "average-current"] {
                    let mut design = of_topology(topology.key, topology.reach);
                    let choices = [
                        ("stage.input-filter", input),
                        ("stage.input-filter.damping", damping),
                        ("stage.output-filter", output),
                        ("stage.output-filter.damping", across),
                        ("stage.output-filter.sense", sense),
                        ("control.mode", mode),
                    ];
                    for (path, key) in choices {
                        design.set_from_text(path, key).expect("an option");
                    }
                    let mut text = Vec::new();
                    polewright::design::file::write(&design, &mut text).expect("written");
                    let back = polewright::design::file::read(&mut text.as_slice()).expect("read");
                    assert_eq!(back, design, "{choices:?}");
                    let request = Request {
                        shown: Shown::Levels(Level::Nominal, Level::Greatest),
                        frequencies_hz: vec![1e3, 1e4],
                        band_frequencies_hz: Vec::new(),
                        step_points: 20,
                    };
                    let analysis = analyse(&checked(&design), &request);
                    let detail =
                        analysis.shown.unwrap_or_else(|finding| panic!("{} {choices:?}: {finding:?}", topology.key));
                    assert_eq!(detail.input_filter.is_some(), input == "fitted");
                    let inductors = usize::from(input == "fitted")
                        + usize::from(damping == "inductor")
                        + usize::from(output == "fitted");
                    let own = 1 + usize::from(topology.entry("stage.second-inductor.inductance").is_some());
                    assert_eq!(detail.operating_point.inductors.len(), own + inductors);
                    let finite = |values: &[f64]| values.len() == 2 && values.iter().all(|v| v.is_finite());
                    let c = &detail.curves;
                    assert!(finite(&c.loop_db) && finite(&c.output_impedance_ohm) && finite(&c.line_to_output_db));
                    if let Some(filter) = &detail.input_filter {
                        let z = &filter.curves;
                        for curve in [&z.filter_ohm, &z.open_loop_ohm, &z.nulled_ohm, &z.closed_loop_ohm] {
                            assert!(finite(curve), "{choices:?}: {z:?}");
                        }
                        assert!(filter.result.margins.iter().all(|m| m.margin_db.is_finite()), "{filter:?}");
                    }
                }
            }
        }
    }
}
