//! The exact switched loop held against what must be true of it: slopes of the steady-state curve, the sampled current loop, averaging.
//!
//! *Source*: a small change held for ever is the slope of the exact steady-state curve, by definition. α = −(1 − r)/(D'/D + r) of the
//! sampled current loop with r = ramp over down-slope: Ridley 1991; Erickson & Maksimovic, Fundamentals of Power Electronics, 3rd
//! ed., 18.7 (quoted).

use crate::common::{
    analysed, assert_absolute, at_one_condition, checked, design, exact_loop, lossless, try_exact_loop,
};
use crate::reference::polar;
use polewright::converter::{Conduction, StageCondition, registry};
use polewright::design::Design;
use polewright::linear::Complex;
use polewright::switched::{
    Configuration, Goal, Instability, Orbit, Phase, Quantity, Stability, Start, SwitchedSystem, inputs,
};

/// A design of a topology that its defaults fit: an output it reaches, the divider for it, a type II with little ripple.
fn usual(topology: &str, mode: &str, rectifier: &str, load: f64) -> Design {
    let reaches_up =
        registry().iter().any(|t| t.key == topology && t.reach != polewright::converter::Reach::BelowInput);
    let output = if reaches_up { 24.0 } else { 3.3 };
    let mut design = design(
        &[
            ("stage.topology", topology),
            ("stage.rectifier", rectifier),
            ("control.mode", mode),
            ("compensator.type", "2"),
            ("compensator.amplifier", "op-amp"),
            ("stage.input-capacitor", "none"),
        ],
        &[
            ("stage.output.voltage", output),
            ("compensator.reference", 2.5),
            ("compensator.divider.upper", 10e3 * (output / 2.5 - 1.0)),
            ("compensator.divider.lower", 10e3),
            ("compensator.r2", 1e3),
            ("compensator.c1", 10e-9),
            // Its slow pole far above the slow changes below.
            ("compensator.op-amp.dc-gain", 1e3),
            ("compensator.c2", 1e-9),
            ("stage.bank.1.esl", 0.0),
            ("control.duty.greatest", 1.0),
        ],
    );
    at_one_condition(&mut design, 12.0, load);
    design.title = format!("{topology} {mode} {rectifier} {load} A");
    design
}

const MODES: [&str; 4] = ["voltage", "peak-current", "valley-current", "average-current"];

fn each_usual(mut check: impl FnMut(&Design)) {
    for topology in registry() {
        for mode in MODES {
            for (rectifier, load) in [("synchronous", 2.0), ("diode", 2.0), ("diode", 0.05)] {
                check(&usual(topology.key, mode, rectifier, load));
            }
        }
    }
}

/// Slope of the mean output over one input, from the exact orbits a little to either side; the rule of Richardson takes the square of
/// the step out.
fn slope(system: &SwitchedSystem, start: Start, input: &str, step: f64, row: usize) -> f64 {
    let column = system.input(input).expect("an input");
    let mean = |change: f64| {
        let mut moved = system.clone();
        moved.steady_inputs[column] += change;
        let orbit = Orbit::find(&moved, start, Goal::AsDriven).expect("an orbit");
        orbit.figures().expect("figures")[row].mean
    };
    let central = |h: f64| (mean(h) - mean(-h)) / (2.0 * h);
    (4.0 * central(step / 2.0) - central(step)) / 3.0
}

fn nearly(what: &str, found: Complex, wanted: f64) {
    let error = (found.re - wanted).abs() / wanted.abs();
    assert!(error < 1e-6, "{what}: {found}, slope {wanted}, off by {error:e}");
}

/// The low-frequency limit of the plant is the slope of the exact steady-state curve over the control voltage.
#[test]
fn a_slow_change_of_the_control_voltage_walks_along_the_steady_curve() {
    let mut count = 0;
    each_usual(|design| {
        let Ok(exact) = try_exact_loop(design, None) else { return };
        let orbit = exact.open.orbit();
        let mut system = orbit.system.clone();
        system.steady_inputs.clone_from(&orbit.inputs);
        let start = Start { duty: orbit.duty, second_duty: second_duty(orbit) };
        let control = orbit.inputs[system.input(inputs::CONTROL).expect("an input")];
        let wanted =
            slope(&system, start, inputs::CONTROL, 2e-3 * control.abs().max(0.05), system.places.stage.output_voltage);
        let slow = 1e-9 / system.period_s;
        let found = exact.reader(Quantity::Plant).expect("a plant").at(slow).expect("a value");
        nearly(&design.title, found, wanted);
        count += 1;
    });
    assert!(count >= 30, "only {count} designs");
}

fn second_duty(orbit: &Orbit) -> Option<f64> {
    let freewheels = |p: &&Phase| p.configuration == Configuration::Freewheeling;
    let share = orbit.phases.iter().filter(freewheels).map(|p| p.length_s).sum::<f64>() / orbit.system.period_s;
    (orbit.conduction == Conduction::Discontinuous).then_some(share)
}

/// The same with the loop closed and its ripple fed back: reference and line, and the load.
#[test]
fn slow_changes_of_reference_line_and_load_walk_along_the_closed_loop_s_steady_curve() {
    let mut count = 0;
    each_usual(|design| {
        let Ok(exact) = try_exact_loop(design, None) else { return };
        let orbit = exact.closed.orbit();
        let start = Start { duty: orbit.duty, second_duty: second_duty(orbit) };
        let (system, row) = (&orbit.system, orbit.system.places.stage.load_voltage);
        let slow = 1e-9 / system.period_s;
        let read = |quantity| exact.reader(quantity).expect("a reading").at(slow).expect("a value");
        nearly(
            &format!("{}: reference", design.title),
            read(Quantity::ReferenceToOutput),
            slope(system, start, inputs::REFERENCE, 5e-3, row),
        );
        // Line and load barely move the mean behind an integrator; what they do move is told from rounding by large steps.
        let absolute = |what: &str, found: Complex, wanted: f64, scale: f64| {
            assert_absolute(&format!("{}: {what}", design.title), found.re, wanted, 1e-6 * scale.max(wanted.abs()));
        };
        let output = orbit.figures().expect("figures")[row].mean;
        absolute(
            "line",
            read(Quantity::LineToOutput),
            slope(system, start, inputs::INPUT_VOLTAGE, 0.05, row),
            1e-3 * output,
        );
        // At a light load the mean moves by less than rounding leaves of it.
        if orbit.conduction != Conduction::Discontinuous {
            let wanted = slope(system, start, inputs::LOAD_CURRENT, 0.02, row);
            absolute("load", -read(Quantity::OutputImpedance), wanted, 1e-3 * output);
        }
        count += 1;
    });
    assert!(count >= 30, "only {count} designs");
}

/// C7's buck and boost in peak current mode without losses, an output capacitance that does not move, and a ramp of r times the down-slope.
pub(crate) fn current_loop(topology: &str, (input, output): (f64, f64), r: f64) -> Design {
    let mut design = lossless(
        topology,
        &[
            ("stage.output.voltage", output),
            ("stage.switching-frequency", 100e3),
            ("stage.inductor.inductance", 5e-6),
            ("stage.bank.1.capacitance", 1.0),
            ("stage.bank.1.count", 1e3),
            ("control.sense.gain", 0.1),
            ("control.sense.filter", 0.0),
            ("control.sense.divider", 1.0),
            ("control.sense.offset", 0.0),
            ("control.blanking", 0.0),
            ("control.slope.share", r),
            ("compensator.reference", 2.5),
            ("compensator.divider.upper", 10e3 * (output / 2.5 - 1.0)),
            ("compensator.divider.lower", 10e3),
        ],
    );
    for (path, key) in [("control.mode", "peak-current"), ("control.slope", "share")] {
        design.set_from_text(path, key).expect("an option");
    }
    at_one_condition(&mut design, input, 20.0);
    design.title = format!("{topology} r {r}");
    design
}

/// The fast multiplier of the open loop: the one that the current loop alone gives.
fn fast_multiplier(design: &Design) -> f64 {
    let exact = exact_loop(design, None);
    let stability = Stability::new(&exact.open).expect("multipliers");
    // The bank's own multiplier stands within a hair of 1.
    stability.multipliers.iter().filter(|m| (m.re - 1.0).abs() > 1e-3).map(|m| m.re).next().unwrap_or(0.0)
}

/// *Tolerance*: 1e-6, as a thousand farads move less than that within a period.
#[test]
fn the_current_loop_s_multiplier_is_alpha() {
    let alpha = |duty: f64, r: f64| -(1.0 - r) / ((1.0 - duty) / duty + r);
    for r in [0.1, 0.5, 1.0, 5.0] {
        let found = fast_multiplier(&current_loop("buck", (10.0, 5.0), r));
        assert_absolute(&format!("buck, r {r}"), found, alpha(0.5, r), 1e-6);
    }
    for (output, duty) in [(25.0, 0.6), (15.0, 1.0 / 3.0)] {
        let found = fast_multiplier(&current_loop("boost", (10.0, output), 0.0));
        assert_absolute(&format!("boost to {output} V"), found, alpha(duty, 0.0), 1e-6);
    }
}

/// Without a ramp the period doubles at a duty ratio of one half, wherever that is sought from.
#[test]
fn the_period_doubles_at_half_the_duty_ratio_without_a_ramp() {
    let mut low = 4.0;
    let mut high = 6.0;
    for _ in 0..40 {
        let middle = f64::midpoint(low, high);
        if fast_multiplier(&current_loop("buck", (10.0, middle), 0.0)) < -1.0 { high = middle } else { low = middle }
    }
    let exact = exact_loop(&current_loop("buck", (10.0, high), 0.0), None);
    assert_absolute("duty ratio", exact.open.orbit().duty, 0.5, 1e-6);
    let beyond = exact_loop(&current_loop("buck", (10.0, 6.0), 0.0), None);
    let stability = Stability::new(&beyond.open).expect("multipliers");
    assert!(matches!(stability.instability, Some(Instability::PeriodDoubling { multiplier }) if multiplier < -1.0));
    // A ramp of a sixth of the down-slope is the boundary at 0.6 (mc 1.25).
    assert_absolute("boundary", fast_multiplier(&current_loop("buck", (10.0, 6.0), 1.0 / 6.0)), -1.0, 1e-6);
}

/// Absurd conditions end with a message or an orbit of finite numbers.
#[test]
fn absurd_cases_end_with_a_message() {
    for mode in MODES {
        for (input, load) in [(12.0, 1e-9), (12.0, 1e6), (1e-3, 1.0), (24.0, 1.0), (1e6, 1.0)] {
            let mut design = usual("boost", mode, "diode", 1.0);
            at_one_condition(&mut design, input, load);
            let Ok(checked) = design.check() else { continue };
            let condition = StageCondition {
                input_voltage: input,
                load_current: load,
                output_voltage: checked.stage.output_voltage,
            };
            match try_exact_loop(&design, Some(condition)) {
                Err(finding) => assert!(finding.message.len() > 20),
                Ok(exact) => {
                    assert!(exact.closed.orbit().duty.is_finite());
                    assert!(exact.closed.orbit().figures().expect("figures").iter().all(|f| f.rms.is_finite()));
                }
            }
        }
    }
}

#[test]
fn near_multiples_of_half_the_switching_frequency_readings_are_undefined() {
    let exact = exact_loop(&usual("boost", "voltage", "synchronous", 2.0), None);
    let fs = exact.closed.orbit().system.period_s.recip();
    let reader = exact.reader(Quantity::LoopGain).expect("a reading");
    for (share, defined) in
        [(0.1, true), (0.494, true), (0.496, false), (0.5, false), (0.98, true), (0.995, false), (3.05, true)]
    {
        assert_eq!(reader.defined(share * fs), defined, "{share}");
    }
    assert!(checked(&usual("boost", "voltage", "synchronous", 2.0)).stage.switching_frequency > 0.0);
}

/// How far an averaged response is from the exact one [dB, °].
fn apart(averaged: Complex, exact: Complex) -> (f64, f64) {
    let ratio = averaged / exact;
    (20.0 * ratio.norm().log10().abs(), ratio.arg().to_degrees().abs())
}

/// The frequency [Hz] up to which averaged plant and closed-loop output impedance stay within so many dB and degrees of the exact ones.
fn holds_to(design: &Design, (gain_db, phase_deg): (f64, f64), shares: (f64, f64)) -> Option<f64> {
    const POINTS: i32 = 24;
    let exact = try_exact_loop(design, None).ok()?;
    let fs = exact.closed.orbit().system.period_s.recip();
    let (low, high) = shares;
    let frequencies: Vec<f64> =
        (0..POINTS).map(|k| fs * low * (high / low).powf(f64::from(k) / f64::from(POINTS - 1))).collect();
    let curves = analysed(design, &frequencies, 10).shown.expect("the nominal condition").curves;
    let mut plant = exact.reader(Quantity::Plant).expect("a plant");
    let mut impedance = exact.reader(Quantity::OutputImpedance).expect("an impedance");
    let mut held = 0.0;
    for (k, f) in frequencies.iter().enumerate() {
        let pairs = [
            (polar(curves.plant_db[k], curves.plant_deg[k]), plant.at(*f)),
            (
                Complex::from_polar(curves.output_impedance_ohm[k], curves.output_impedance_deg[k].to_radians()),
                impedance.at(*f),
            ),
        ];
        for (averaged, exact) in pairs {
            let (db, deg) = apart(averaged, exact.expect("a value"));
            if db > gain_db || deg > phase_deg {
                return Some(held);
            }
        }
        held = *f;
    }
    Some(held)
}

/// Averaged against exact over the whole registry. Voltage mode holds to a tenth of the switching frequency, peak current mode and valley
/// current mode in continuous conduction to a third. Valley current mode that starts from rest samples late by what its ramp takes, and
/// average current mode lets ripple through to its comparator: they hold as far as is stated here.
#[test]
fn averaging_holds_over_the_registry_as_far_as_stated() {
    let mut count = 0;
    each_usual(|design| {
        let mode = design.choices.get("control.mode").expect("chosen");
        let rests = design.title.ends_with("0.05 A");
        let (apart, highest) = match (mode, rests) {
            ("voltage", _) => ((0.5, 3.0), 0.1),
            ("peak-current", _) | ("valley-current", false) => ((1.0, 6.0), 0.333),
            ("valley-current", true) => ((1.0, 6.0), 0.1),
            (_, false) => ((1.0, 6.0), 0.05),
            (_, true) => ((1.0, 6.0), 0.0025),
        };
        let Some(held) = holds_to(design, apart, (1e-3, highest)) else { return };
        let fs = design.values.get("stage.switching-frequency").unwrap_or(300e3);
        assert!(held > 0.999 * highest * fs, "{}: averaging holds to {held} Hz only", design.title);
        count += 1;
    });
    assert!(count >= 50, "only {count} designs");
}

/// The exact multipliers of a double-ended stage in peak current mode with a magnetising current that turns sign: straight lines give
/// z² − ((μ − M)/S)·z − 1 + (μ + M)/S = 0 with S = m1 + μ + ramp, M = m1 + m2 and μ the magnetising slope, all as the switch sees
/// them (own derivation from m[k+1] = −(m[k] + μ·T·d)). A forward's, reset every period, is an external ramp: α with r = (μ + ramp)/m2.
///
/// *Tolerance*: 1e-4; drops and a finite bank bend the straight lines by so much.
#[test]
fn a_magnetising_current_counts_in_peak_current_mode() {
    for topology in registry().iter().filter(|t| t.magnetising_ramp > 0.0) {
        let (input, output, ratio, fs) = (48.0, 6.0, 0.5, 100e3);
        let mut design = lossless(
            topology.key,
            &[
                ("stage.output.voltage", output),
                ("stage.switching-frequency", fs),
                ("stage.transformer.ratio", ratio),
                ("stage.transformer.magnetising", 100e-6),
                ("stage.transformer.leakage", 0.0),
                ("stage.inductor.inductance", 10e-6),
                ("stage.bank.1.capacitance", 1.0),
                ("stage.bank.1.count", 1e3),
                ("control.sense.gain", 0.1),
                ("control.sense.filter", 0.0),
                ("control.sense.divider", 1.0),
                ("control.sense.offset", 0.0),
                ("control.blanking", 0.0),
                ("control.slope.rate", 0.0),
                ("compensator.reference", 2.5),
                ("compensator.divider.upper", 10e3 * (output / 2.5 - 1.0)),
                ("compensator.divider.lower", 10e3),
            ],
        );
        for (path, key) in [("control.mode", "peak-current"), ("control.slope", "rate")] {
            design.set_from_text(path, key).expect("an option");
        }
        at_one_condition(&mut design, input, 20.0);
        design.title = topology.name.to_owned();
        let exact = exact_loop(&design, None);
        let orbit = exact.open.orbit();
        let (index, inputs) =
            (orbit.system.state_names.iter().position(|name| name == "magnetising current"), &orbit.inputs);
        let index = index.expect("a magnetising current");
        let slope = |configuration, row: usize| {
            let piece = orbit.system.piece(configuration);
            let x = &orbit.starts[usize::from(configuration == Configuration::Freewheeling)];
            (piece.c.row(row) * (&piece.a * x + &piece.b * inputs))[0]
        };
        let sensed = orbit.system.places.sensed_current;
        let mu = {
            let piece = orbit.system.piece(Configuration::Conducting);
            (piece.a.row(index) * &orbit.starts[0] + piece.b.row(index) * inputs)[0]
        };
        // While the rectifier conducts the sensed row holds the inductor's share alone.
        let (m1, m2) = (slope(Configuration::Conducting, sensed) - mu, -slope(Configuration::Freewheeling, sensed));
        let mut wanted = if topology.magnetising_ramp < 1.0 {
            let (s, m) = (m1 + mu, m1 + m2);
            let (sum, product) = ((mu - m) / s, (mu + m) / s - 1.0);
            let root = Complex::new(sum * sum / 4.0 - product, 0.0).sqrt();
            vec![sum / 2.0 + root, sum / 2.0 - root]
        } else {
            vec![Complex::new(-(m2 - mu) / (m1 + mu), 0.0)]
        };
        let found = Stability::new(&exact.open).expect("multipliers").multipliers;
        wanted.retain(|w| !found.iter().any(|m| (m - w).norm() < 1e-4));
        assert!(wanted.is_empty(), "{}: {wanted:?} are missing in {found:?}", topology.key);
    }
}

/// Every sample at all its conditions has a steady period, or a finding that names what keeps it from one; where averaging calls the loop
/// stable by a wide margin and little ripple reaches the comparator, the multipliers do, too.
#[test]
fn samples_have_their_orbits_at_every_condition() {
    let (mut found, mut refused) = (0, 0);
    for sample in polewright::design::sample::all() {
        let design = sample.design().expect("a sample opens");
        let checked = checked(&design);
        if checked.compensator.digital().is_some() {
            continue;
        }
        let stage = &checked.stage;
        for input_voltage in stage.input_voltages {
            for load_current in stage.load_currents {
                let condition = StageCondition { input_voltage, load_current, output_voltage: stage.output_voltage };
                match try_exact_loop(&design, Some(condition)) {
                    Ok(exact) => {
                        found += 1;
                        let growth = Stability::new(&exact.closed).expect("multipliers").growth_per_period();
                        assert!(growth.is_finite(), "{} at {condition:?}", sample.title);
                    }
                    Err(finding) => {
                        println!("{} at {input_voltage} V, {load_current} A: {}", sample.title, finding.message);
                        refused += 1;
                    }
                }
            }
        }
    }
    println!("{found} orbits, {refused} refused");
    assert!(found > 10 * refused, "{found} orbits, {refused} refused");
}
