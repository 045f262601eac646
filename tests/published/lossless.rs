//! A thousand random lossless stages per topology against the textbook's closed forms.
//!
//! *Source*: Erickson & Maksimovic, Fundamentals of Power Electronics, 3rd ed., Table 8.2 (its forms from memory): canonical small-signal
//! parameters of buck, boost and buck-boost in continuous conduction with a resistive load and one capacitor without ESR. Behind a
//! transformer a buck sees n times the primary's voltage (ibid. 6.3.1 to 6.3.3, from memory): all of the input, half of it in a half-bridge.

use crate::common::{assert_relative, at_one_condition, checked, lossless};
use crate::random::Random;
use polewright::converter::StageCondition;
use polewright::linear::Zpk;

/// Gd0 [V], Gg0, ω0 [rad/s], Q, ωz [rad/s] of the table.
fn table(
    topology: &str,
    vin: f64,
    vout: f64,
    load: f64,
    inductance: f64,
    capacitance: f64,
) -> (f64, f64, f64, f64, Option<f64>) {
    let resistance = vout / load;
    let tank = (inductance * capacitance).sqrt();
    let damping = resistance * (capacitance / inductance).sqrt();
    match topology {
        "buck" => (vin, vout / vin, 1.0 / tank, damping, None),
        "boost" => {
            let d = 1.0 - vin / vout;
            let off = 1.0 - d;
            (vout / off, 1.0 / off, off / tank, off * damping, Some(off * off * resistance / inductance))
        }
        _ => {
            let d = vout / (vin + vout);
            let off = 1.0 - d;
            (vout / (d * off), d / off, off / tank, off * damping, Some(off * off * resistance / (d * inductance)))
        }
    }
}

fn agree(topology: &str, seed: u64) {
    agree_as(topology, topology, None, seed);
}

/// A topology that is one of the table's, its primary given a share of the input through a transformer or not.
fn agree_as(topology: &str, form: &str, primary: Option<f64>, seed: u64) {
    let mut random = Random::new(seed);
    for _ in 0..1000 {
        let input = random.log(2.0, 150.0);
        let ratio = primary.map(|share| (share, random.log(0.1, 5.0)));
        // What the form's own input is for each volt of it.
        let seen = ratio.map_or(1.0, |(share, turns)| share * turns);
        let vin = input * seen;
        let vout = match form {
            "buck" => vin * random.between(0.05, 0.95),
            "boost" => vin / (1.0 - random.between(0.05, 0.9)),
            _ => vin * random.log(0.1, 8.0),
        };
        let load = random.log(0.01, 100.0);
        let inductance = random.log(50e-9, 10e-3);
        let capacitance = random.log(100e-9, 50e-3);
        let mut design = lossless(
            topology,
            &[
                ("stage.output.voltage", vout),
                ("stage.inductor.inductance", inductance),
                ("stage.bank.1.capacitance", capacitance),
                ("compensator.reference", vout / 2.0),
                ("compensator.divider.upper", 10e3),
                ("compensator.divider.lower", 10e3),
            ],
        );
        if let Some((_, turns)) = ratio {
            for (path, value) in [
                ("stage.transformer.ratio", turns),
                ("stage.transformer.leakage", 0.0),
                ("stage.transformer.magnetising", 1.0),
            ] {
                design.values.set(path, value).expect("finite");
            }
        }
        at_one_condition(&mut design, input, load);
        let stage = checked(&design).stage;
        let condition = StageCondition { input_voltage: input, load_current: load, output_voltage: vout };
        let model = stage.averaged(&condition).expect("an operating point").stage;
        let zpk = |input: &str| {
            let (row, column) = (model.output("output voltage").expect("named"), model.input(input).expect("named"));
            Zpk::from_state_space(&model, row, column).expect("roots")
        };
        let (control, line) = (zpk("duty"), zpk("input voltage"));
        let (gd0, gg0, omega, q, zero) = table(form, vin, vout, load, inductance, capacitance);
        let tolerance = 1e-6;
        assert_relative("Gd0", control.dc_gain().expect("finite"), gd0, tolerance);
        assert_relative("Gg0", line.dc_gain().expect("finite"), gg0 * seen, tolerance);
        let [one, other] = control.poles.as_slice() else { panic!("two poles") };
        let squared = (one * other).re;
        assert_relative("resonance", squared.sqrt(), omega, tolerance);
        assert_relative("Q", squared.sqrt() / -(one + other).re, q, tolerance);
        match (zero, control.zeros.as_slice()) {
            (None, []) => {}
            (Some(wanted), [found]) => assert_relative("RHP zero", found.re, wanted, tolerance),
            (wanted, found) => panic!("zeros {found:?}, wanted {wanted:?}"),
        }
    }
}

#[test]
fn buck_equals_the_closed_forms() {
    agree("buck", 1);
}

#[test]
fn boost_equals_the_closed_forms() {
    agree("boost", 2);
}

#[test]
fn buck_boost_equals_the_closed_forms() {
    agree("buck-boost", 3);
}

#[test]
fn bucks_behind_a_transformer_equal_the_closed_forms() {
    agree_as("forward", "buck", Some(1.0), 4);
    agree_as("push-pull", "buck", Some(1.0), 5);
    agree_as("half-bridge", "buck", Some(0.5), 6);
    agree_as("full-bridge", "buck", Some(1.0), 7);
}

#[test]
fn four_switches_equal_the_closed_forms_of_their_region() {
    agree_as("four-switch", "buck", None, 8);
    agree_as("four-switch", "boost", None, 9);
}
