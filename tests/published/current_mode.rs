//! Peak and valley current mode against published examples and closed forms.
//!
//! *Sources*: Ridley 1991 and Erickson & Maksimovic, Fundamentals of Power Electronics, 3rd ed., chapter 18 (quoted; the values of
//! 18.4 to 18.6 recomputed with the sampling effect).

use crate::common::{assert_absolute, assert_relative, at_one_condition, lossless, nominal};
use polewright::control::Sampling;
use polewright::design::Design;

/// A lossless stage in current mode at one condition: volts per ampere 1, no delay, no blanking, ramp in V/s = A/s.
fn programmed(topology: &str, mode: &str, vin: f64, vout: f64, load: f64, ramp: f64, values: &[(&str, f64)]) -> Design {
    let mut design = lossless(topology, &[]);
    for (path, key) in [("control.mode", mode), ("control.sense", "gain"), ("control.slope", "rate")] {
        design.set_from_text(path, key).expect("an option");
    }
    let own = [
        ("stage.output.voltage", vout),
        ("compensator.reference", vout / 2.0),
        ("compensator.divider.upper", 10e3),
        ("compensator.divider.lower", 10e3),
        ("control.sense.gain", 1.0),
        ("control.sense.divider", 1.0),
        ("control.sense.offset", 0.0),
        ("control.sense.filter", 0.0),
        ("control.slope.rate", ramp),
        ("control.blanking", 0.0),
    ];
    for (path, value) in own.iter().chain(values) {
        design.values.set(path, *value).expect("finite");
    }
    at_one_condition(&mut design, vin, load);
    design
}

fn sampling(design: &Design) -> Sampling {
    nominal(design, &[1e3]).control.sampling.expect("continuous conduction")
}

/// Erickson & Maksimovic 18.4 to 18.6: buck, 12 V, 35 µH, 100 µF, 10 Ω, 200 kHz, Rf 1 Ω, artificial ramp 0.6 V.
#[test]
fn current_programmed_buck_of_the_textbook() {
    const VOUT: f64 = 8.08;
    let values = [
        ("stage.inductor.inductance", 35e-6),
        ("stage.bank.1.capacitance", 100e-6),
        ("stage.switching-frequency", 200e3),
    ];
    let design = programmed("buck", "peak-current", 12.0, VOUT, VOUT / 10.0, 0.6 * 200e3, &values);
    let detail = nominal(&design, &[0.1, 100e3]);
    let sampling = detail.control.sampling.expect("continuous conduction");
    assert_relative("D", detail.operating_point.duty, 0.673, 0.01);
    assert_relative("inductor current", detail.operating_point.switched_current.average, 0.808, 0.01);
    assert_relative("Vc", detail.control.control_voltage, 1.4, 0.01);
    assert_relative("Ma/M2", sampling.ramp_share, 0.520, 0.01);
    assert_relative("fast multiplier", sampling.fast_multiplier, -0.478, 0.01);
    // Quoted as "near 1.84"; Ridley's formula at this duty ratio and ramp gives 1.80.
    assert_relative("Qp", sampling.quality().expect("stable"), 1.84, 0.025);
    assert_relative("Gc0", crate::common::ratio(detail.curves.plant_db[0]), 7.98, 0.01);
    let low = detail.landmarks.iter().find(|mark| mark.key == "low-pole").expect("a low pole");
    assert_relative("low pole", low.frequency_hz, 199.3, 0.01);
}

/// Erickson & Maksimovic 18.7: α = −(1 − r)/(D'/D + r) with r = Ma/M2; buck 10 → 5 V, 5 µH, 100 kHz.
#[test]
fn fast_multiplier_of_the_textbook() {
    let buck = |share: f64| {
        let values = [("stage.inductor.inductance", 5e-6), ("stage.switching-frequency", 100e3)];
        sampling(&programmed("buck", "peak-current", 10.0, 5.0, 10.0, share * 1e6, &values)).fast_multiplier
    };
    for (share, wanted) in [(0.1, -0.818), (0.5, -0.333), (5.0, 0.667)] {
        assert_relative("α", buck(share), wanted, 0.002);
    }
    assert_absolute("α", buck(1.0), 0.0, 1e-9);
    let boost = |vin: f64| sampling(&programmed("boost", "peak-current", vin, 10.0, 2.0, 0.0, &[])).fast_multiplier;
    assert_relative("α", boost(4.0), -1.5, 1e-6);
    assert_relative("α", boost(10.0 * 2.0 / 3.0), -0.5, 1e-6);
}

/// Ridley 1991: Qp = 1/(π·(mc·D' − ½)).
#[test]
fn quality_factor_of_the_sampling_pair() {
    let cases = [
        (0.3, 1.0, Some(1.592)),
        (0.3, 1.5, Some(0.579)),
        (0.3, 2.0, Some(0.354)),
        (0.45, 1.0, Some(6.366)),
        (0.45, 1.5, Some(0.979)),
        (0.45, 2.0, Some(0.531)),
        (0.5, 1.5, Some(1.273)),
        (0.5, 2.0, Some(0.637)),
        (0.7, 2.0, Some(3.183)),
        (0.7, 1.66, None),
    ];
    for (duty, factor, wanted) in cases {
        let (vin, inductance) = (10.0, 10e-6);
        let on_slope = vin * (1.0 - duty) / inductance;
        let values = [("stage.inductor.inductance", inductance)];
        let ramp = (factor - 1.0) * on_slope;
        let found = sampling(&programmed("buck", "peak-current", vin, vin * duty, 10.0, ramp, &values));
        assert_relative("mc", found.slope_factor, factor, 1e-9);
        match (found.quality(), wanted) {
            (Some(found), Some(wanted)) => assert_relative("Qp", found, wanted, 0.001),
            (found, wanted) => assert_eq!(found.is_some(), wanted.is_some(), "D {duty}, mc {factor}"),
        }
    }
}

/// Buck at D 0.6: boundary Ma/M2 1/6, Qp 1 at 0.697; valley current mode is its mirror image, so at D 0.4.
#[test]
fn boundary_and_recommended_ramp() {
    let inductance = 10e-6;
    let values = [("stage.inductor.inductance", inductance)];
    for (mode, vout, opposing) in [("peak-current", 6.0, 6.0 / 10e-6), ("valley-current", 4.0, 6.0 / 10e-6)] {
        let found = sampling(&programmed("buck", mode, 10.0, vout, 10.0, 0.0, &values));
        assert!(found.subharmonic(), "{mode}");
        assert_relative("fast multiplier", found.fast_multiplier, -1.5, 1e-6);
        assert_relative("boundary", found.boundary_ramp / opposing, 1.0 / 6.0, 1e-6);
        assert_relative("recommended", found.recommended_ramp / opposing, 0.697, 0.001);
        let mended = programmed("buck", mode, 10.0, vout, 10.0, found.recommended_ramp, &values);
        assert_relative("Qp", sampling(&mended).quality().expect("stable"), 1.0, 1e-6);
    }
}
