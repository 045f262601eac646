//! Bucks behind a transformer, the four-switch buck-boost and interleaved phases, without losses, against the textbook's closed forms.
//!
//! *Source*: Erickson & Maksimovic, Fundamentals of Power Electronics, 3rd ed., Table 8.2 (its forms from memory), the input being that
//! of the secondary (6.3: n·Vin, half of it for the half-bridge), the inductance that of all phases in parallel; in discontinuous
//! conduction Table 5.2 with K = 2·L·f/R, f the frequency of the pulses. Leakage and magnetising current: own derivations, beside the check.

use crate::common::{assert_relative, at_one_condition, checked, lossless};
use crate::random::Random;
use polewright::converter::{Conduction, FurtherValue, OperatingPoint, Stage, StageCondition};
use polewright::design::Design;
use polewright::linear::Zpk;

/// Topology, share of the input at the primary, pulses per period of one switch.
const BRIDGES: [(&str, f64, f64); 4] =
    [("forward", 1.0, 1.0), ("push-pull", 1.0, 2.0), ("half-bridge", 0.5, 2.0), ("full-bridge", 1.0, 2.0)];

fn design(topology: &str, output: f64, values: &[(&str, f64)]) -> Design {
    let mut design = lossless(topology, &[("stage.output.voltage", output), ("compensator.reference", output / 2.0)]);
    let divider = [("compensator.divider.upper", 10e3), ("compensator.divider.lower", 10e3)];
    for (path, value) in divider.iter().chain(values) {
        design.values.set(path, *value).expect("finite");
    }
    design
}

fn stage(design: &mut Design, input: f64, load: f64) -> (Stage, StageCondition) {
    at_one_condition(design, input, load);
    let stage = checked(design).stage;
    let condition = StageCondition { input_voltage: input, load_current: load, output_voltage: stage.output_voltage };
    (stage, condition)
}

/// Gd0 [V], Gg0, ω0 [rad/s], Q, ωz [rad/s].
type Forms = (f64, f64, f64, f64, Option<f64>);

fn compare(told: &str, stage: &Stage, condition: &StageCondition, forms: Forms) {
    let model = stage.averaged(condition).expect("an operating point").stage;
    let zpk = |input: &str| {
        let (row, column) = (model.output("output voltage").expect("named"), model.input(input).expect("named"));
        Zpk::from_state_space(&model, row, column).expect("roots")
    };
    let (control, line) = (zpk("duty"), zpk("input voltage"));
    let (gd0, gg0, omega, q, zero) = forms;
    let close = |what: &str, value, wanted| assert_relative(&format!("{told}: {what}"), value, wanted, 1e-6);
    close("Gd0", control.dc_gain().expect("finite"), gd0);
    close("Gg0", line.dc_gain().expect("finite"), gg0);
    let [one, other] = control.poles.as_slice() else { panic!("{told}: two poles") };
    let squared = (one * other).re;
    close("resonance", squared.sqrt(), omega);
    close("Q", squared.sqrt() / -(one + other).re, q);
    match (zero, control.zeros.as_slice()) {
        (None, []) => {}
        (Some(wanted), [found]) => close("RHP zero", found.re, wanted),
        (wanted, found) => panic!("{told}: zeros {found:?}, wanted {wanted:?}"),
    }
}

fn buck(input: f64, ratio: f64, vout: f64, load: f64, l: f64, c: f64) -> Forms {
    (ratio * input, vout / input, 1.0 / (l * c).sqrt(), vout / load * (c / l).sqrt(), None)
}

fn boost(input: f64, vout: f64, load: f64, l: f64, c: f64) -> Forms {
    let (off, r) = (input / vout, vout / load);
    (vout / off, 1.0 / off, off / (l * c).sqrt(), off * r * (c / l).sqrt(), Some(off * off * r / l))
}

fn buck_boost(input: f64, vout: f64, load: f64, l: f64, c: f64) -> Forms {
    let (d, r) = (vout / (input + vout), vout / load);
    let off = 1.0 - d;
    (vout / (d * off), d / off, off / (l * c).sqrt(), off * r * (c / l).sqrt(), Some(off * off * r / (d * l)))
}

/// A thousand of each: the buck's forms with the secondary's input.
#[test]
fn bucks_behind_a_transformer_equal_the_closed_forms() {
    for (k, (topology, share, _)) in BRIDGES.into_iter().enumerate() {
        let mut random = Random::new(11 + k as u64);
        for _ in 0..1000 {
            let (vin, n) = (random.log(5.0, 400.0), random.log(0.02, 4.0));
            let vout = n * share * vin * random.between(0.05, if topology == "forward" { 0.49 } else { 0.95 });
            let (load, l, c) = (random.log(0.01, 100.0), random.log(50e-9, 10e-3), random.log(100e-9, 50e-3));
            let values = [
                ("stage.inductor.inductance", l),
                ("stage.bank.1.capacitance", c),
                ("stage.transformer.ratio", n),
                ("stage.transformer.magnetising", random.log(1e-6, 1.0)),
                ("stage.transformer.leakage", 0.0),
                ("control.duty.greatest", if topology == "forward" { 0.5 } else { 1.0 }),
            ];
            let (stage, condition) = stage(&mut design(topology, vout, &values), vin, load);
            compare(topology, &stage, &condition, buck(vin, n * share, vout, load, l, c));
            assert_relative("D", stage.textbook(&condition).duty, vout / (n * share * vin), 1e-12);
        }
    }
}

/// A thousand in each region: a buck above the output, a boost below it.
#[test]
fn four_switches_equal_buck_and_boost() {
    let mut random = Random::new(21);
    for k in 0..2000 {
        let (vin, load) = (random.log(2.0, 100.0), random.log(0.01, 100.0));
        let (l, c) = (random.log(50e-9, 10e-3), random.log(100e-9, 50e-3));
        let bucks = k % 2 == 0;
        let vout = if bucks { vin * random.between(0.05, 0.95) } else { vin / (1.0 - random.between(0.05, 0.9)) };
        let values = [("stage.inductor.inductance", l), ("stage.bank.1.capacitance", c)];
        let (stage, condition) = stage(&mut design("four-switch", vout, &values), vin, load);
        let forms = if bucks { buck(vin, 1.0, vout, load, l, c) } else { boost(vin, vout, load, l, c) };
        compare("four-switch", &stage, &condition, forms);
        let point = stage.averaged(&condition).expect("an operating point").operating_point;
        let region = point.further.iter().find(|figure| figure.key == "region").expect("said");
        assert_eq!(region.value, FurtherValue::Word(if bucks { "buck" } else { "boost" }));
    }
}

/// A thousand of each: the one-phase forms with L/N.
#[test]
fn interleaved_phases_equal_the_closed_forms() {
    let mut random = Random::new(31);
    for k in 0..3000 {
        let (vin, load, n) = (random.log(2.0, 100.0), random.log(0.01, 100.0), random.between(2.0, 16.99).floor());
        let (l, c) = (random.log(50e-9, 10e-3), random.log(100e-9, 50e-3));
        let (topology, vout) = match k % 3 {
            0 => ("buck", vin * random.between(0.05, 0.95)),
            1 => ("boost", vin / (1.0 - random.between(0.05, 0.9))),
            _ => ("buck-boost", vin * random.log(0.1, 8.0)),
        };
        let values = [("stage.inductor.inductance", l), ("stage.bank.1.capacitance", c), ("stage.phases", n)];
        let (stage, condition) = stage(&mut design(topology, vout, &values), vin, load);
        let forms = match topology {
            "buck" => buck(vin, 1.0, vout, load, l / n, c),
            "boost" => boost(vin, vout, load, l / n, c),
            _ => buck_boost(vin, vout, load, l / n, c),
        };
        compare(topology, &stage, &condition, forms);
    }
}

/// Discontinuous conduction: D = M·√(K/(1 − M)) of the secondary; in the boost region √(K·M·(M − 1)). Large capacitors, as the form has
/// no ripple.
#[test]
fn duty_ratio_in_discontinuous_conduction_is_the_textbooks() {
    let mut random = Random::new(41);
    for k in 0..1000 {
        let (topology, share, pulses) = if k % 5 == 4 { ("four-switch", 1.0, 1.0) } else { BRIDGES[k % 5] };
        let four = topology == "four-switch";
        let (vin, n) = (random.log(5.0, 300.0), if four { 1.0 } else { random.log(0.05, 4.0) });
        let above = four && k % 2 == 0;
        let m: f64 = if above { random.between(1.2, 5.0) } else { random.between(0.05, 0.8) };
        let vout = m * n * share * vin;
        // Below the boundary of K: 1 − M of a buck, (M − 1)/M³ of a boost.
        let boundary = if above { (m - 1.0) / m.powi(3) } else { 1.0 - m };
        let k_factor = boundary * random.between(0.05, 0.8);
        let (load, fs) = (random.log(0.01, 10.0), random.log(20e3, 1e6));
        let duty = if above { (k_factor * m * (m - 1.0)).sqrt() } else { m * (k_factor / (1.0 - m)).sqrt() };
        if topology == "forward" && duty > 0.49 {
            continue;
        }
        let values = [
            ("stage.switching-frequency", fs),
            ("stage.inductor.inductance", k_factor * vout / load / (2.0 * fs * pulses)),
            ("stage.bank.1.capacitance", 1e3 * load / (vout * fs)),
            ("stage.transformer.ratio", n),
            ("control.duty.greatest", if topology == "forward" { 0.5 } else { 1.0 }),
        ];
        let mut design = design(topology, vout, &values);
        design.set_from_text("stage.rectifier", "emulated").expect("an option");
        let (stage, condition) = stage(&mut design, vin, load);
        let point = stage.averaged(&condition).expect("an operating point").operating_point;
        assert_eq!(point.conduction, Conduction::Discontinuous, "{topology} {m} {k_factor}");
        assert_relative(topology, point.duty, duty, 1e-6);
    }
}

fn further(point: &OperatingPoint, key: &str) -> f64 {
    match point.further.iter().find(|figure| figure.key == key).unwrap_or_else(|| panic!("no {key}")).value {
        FurtherValue::Number(value, _) => value,
        FurtherValue::Word(word) => panic!("{word} is no number"),
    }
}

/// A worked point by hand: 48 V, n = 0.5, 5 V at 10 A, L 4.7 µH, Lm 200 µH, 100 kHz per switch. Seen input Vs = n·share·48, D = 5/Vs, pulse
/// period T; ripple (Vs − 5)·D·T/L; switch peak n·(10 + ripple/2) and the magnetising current on top, all of share·48·D·T/Lm where the core
/// is reset, half of it where the flux alternates. Input: D·n·share·10.
#[test]
fn currents_of_bucks_behind_a_transformer_by_hand() {
    for (topology, share, pulses) in BRIDGES {
        let values = [
            ("stage.switching-frequency", 100e3),
            ("stage.inductor.inductance", 4.7e-6),
            ("stage.bank.1.capacitance", 10.0),
            ("stage.transformer.ratio", 0.5),
            ("stage.transformer.magnetising", 200e-6),
            ("control.duty.greatest", if topology == "forward" { 0.5 } else { 1.0 }),
        ];
        let (stage, condition) = stage(&mut design(topology, 5.0, &values), 48.0, 10.0);
        let point = stage.averaged(&condition).expect("an operating point").operating_point;
        let (seen, period) = (0.5 * share * 48.0, 1e-5 / pulses);
        let duty = 5.0 / seen;
        let ripple = (seen - 5.0) * duty * period / 4.7e-6;
        let swing = share * 48.0 * duty * period / 200e-6;
        let on_top = if topology == "forward" { swing } else { swing / 2.0 };
        let close = |what: &str, value, wanted| assert_relative(&format!("{topology} {what}"), value, wanted, 1e-9);
        close("duty", point.duty, duty);
        close("ripple", point.inductors[0].current.ripple, ripple);
        close("magnetising", further(&point, "magnetising-swing"), swing);
        close("switch peak", point.switch.peak, 0.5 * (10.0 + ripple / 2.0) + on_top);
        close("input", point.input_current, duty * 0.5 * share * 10.0);
        close("sense ratio", point.sense_ratio, 0.5);
        // Volt-seconds over Lm as a ramp on the inductor's current: half of it where the flux alternates.
        let kept = if topology == "forward" { 1.0 } else { 0.5 };
        close("natural ramp", point.natural_ramp, kept * share * 48.0 / 200e-6 / 0.5);
        if pulses > 1.0 {
            // One of two rectifiers: i in every second pulse, i/2 between pulses.
            close("rectifier", point.rectifier.average, 10.0 / 2.0);
            let square = 100.0 + ripple * ripple / 12.0;
            close("rectifier RMS", point.rectifier.rms, (square * (duty / 2.0 + (1.0 - duty) / 4.0)).sqrt());
            let pulse = 0.25 * square * duty;
            // The magnetising current's swing lies on the inductor's.
            let both = (0.5 * 10.0_f64).powi(2) + (0.5 * ripple + swing).powi(2) / 12.0;
            assert!(pulse > 0.0);
            close("switch RMS", point.switch.rms, (both * duty / 2.0).sqrt());
            close("pulses", further(&point, "pulse-frequency"), 200e3);
        }
    }
}

/// Leakage: as a pulse begins, the primary's current rises to n·I against the whole primary voltage, while both rectifiers conduct and
/// the secondary stays at nothing. That takes Lleak·n·I/V of every pulse, so D = Vout/(n·V) + Lleak·n·I/(V·T) (common practice).
#[test]
fn leakage_delays_every_pulse() {
    for (topology, share, pulses) in BRIDGES {
        let leakage = 0.8e-6;
        let values = [
            ("stage.switching-frequency", 100e3),
            ("stage.inductor.inductance", 1e-3),
            ("stage.bank.1.capacitance", 1.0),
            ("stage.transformer.ratio", 0.6),
            ("stage.transformer.leakage", leakage),
            ("control.duty.greatest", if topology == "forward" { 0.5 } else { 1.0 }),
        ];
        let (stage, condition) = stage(&mut design(topology, 5.0, &values), 48.0, 10.0);
        let point = stage.averaged(&condition).expect("an operating point").operating_point;
        let (volts, period) = (share * 48.0, 1e-5 / pulses);
        let lost = leakage * 0.6 * 10.0 / (volts * period);
        assert_relative(topology, point.duty, 5.0 / (0.6 * volts) + lost, 1e-9);
        assert_relative(topology, further(&point, "duty-lost"), lost, 1e-9);
    }
}
