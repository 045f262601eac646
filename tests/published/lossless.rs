//! A thousand random lossless stages per topology against the textbook's closed forms.
//!
//! *Source*: Erickson & Maksimovic, Fundamentals of Power Electronics, 3rd ed., Table 8.2 (its forms from memory): canonical small-signal
//! parameters of buck, boost and buck-boost in continuous conduction with a resistive load and one capacitor without ESR.

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
    let mut random = Random::new(seed);
    for _ in 0..1000 {
        let vin = random.log(2.0, 150.0);
        let vout = match topology {
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
        at_one_condition(&mut design, vin, load);
        let stage = checked(&design).stage;
        let condition = StageCondition { input_voltage: vin, load_current: load, output_voltage: vout };
        let model = stage.averaged(&condition).expect("an operating point").stage;
        let zpk = |input: &str| {
            let (row, column) = (model.output("output voltage").expect("named"), model.input(input).expect("named"));
            Zpk::from_state_space(&model, row, column).expect("roots")
        };
        let (control, line) = (zpk("duty"), zpk("input voltage"));
        let (gd0, gg0, omega, q, zero) = table(topology, vin, vout, load, inductance, capacitance);
        let tolerance = 1e-6;
        assert_relative("Gd0", control.dc_gain().expect("finite"), gd0, tolerance);
        assert_relative("Gg0", line.dc_gain().expect("finite"), gg0, tolerance);
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
