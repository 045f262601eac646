//! Peak and valley current mode against published examples and closed forms.
//!
//! *Sources*: Ridley 1991 and Erickson & Maksimovic, Fundamentals of Power Electronics, 3rd ed., chapter 18 (quoted; the values of
//! 18.4 to 18.6 recomputed with the sampling effect).

use crate::common::{
    analysed, assert_absolute, assert_relative, at_one_condition, checked, ideal_op_amp, lossless, nominal,
};
use crate::random::Random;
use polewright::analysis::loop_model::{LoopModel, Shared};
use polewright::control::Sampling;
use polewright::converter::StageCondition;
use polewright::design::Design;
use polewright::linear::{FrequencyResponse, Zpk};

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

/// Lossless stages: control voltage R·(I + D·D'·M·T/2) + ramp·D·T at the peak, R·(I − D·D'·M·T/2) − ramp·D'·T at the valley, and
/// the gain at rest dV/dVc from the conversion ratios V(D) and inductor currents I(D) of the textbook (Erickson & Maksimovic,
/// Table 3.1 and chapter 2, from memory), differentiated here by hand.
#[test]
fn control_voltage_and_gain_at_rest_equal_the_closed_forms() {
    let mut random = Random::new(11);
    for k in 0..300_usize {
        let topology = ["buck", "boost", "buck-boost"][k % 3];
        let mode = if k % 2 == 0 { "peak-current" } else { "valley-current" };
        let (d, vin, resistance) = (random.between(0.1, 0.9), random.log(2.0, 100.0), random.log(0.5, 100.0));
        let (inductance, fs) = (random.log(1e-6, 1e-3), random.log(50e3, 1e6));
        let (period, off) = (1.0 / fs, 1.0 - d);
        // V, dV/dD, I, dI/dD, slope difference times L and its derivative.
        let (v, dv, i, di, ml, dml) = match topology {
            "buck" => (vin * d, vin, vin * d / resistance, vin / resistance, vin, 0.0),
            "boost" => {
                let (v, i) = (vin / off, vin / (off * off * resistance));
                (v, v / off, i, 2.0 * i / off, v, v / off)
            }
            _ => {
                let (v, dv) = (vin * d / off, vin / (off * off));
                let i = v / (off * resistance);
                (v, dv, i, dv / (off * resistance) + i / off, vin + v, dv)
            }
        };
        let ramp = random.between(0.0, 2.0) * ml / inductance;
        let half = d * off * ml * period / (2.0 * inductance);
        let dhalf = ((1.0 - 2.0 * d) * ml + d * off * dml) * period / (2.0 * inductance);
        let (control, dcontrol) = if mode == "peak-current" {
            (i + half + ramp * d * period, di + dhalf + ramp * period)
        } else {
            (i - half - ramp * off * period, di - dhalf + ramp * period)
        };
        let values = [("stage.inductor.inductance", inductance), ("stage.switching-frequency", fs)];
        let checked = checked(&programmed(topology, mode, vin, v, v / resistance, ramp, &values));
        let condition = StageCondition { input_voltage: vin, load_current: v / resistance, output_voltage: v };
        let shared = Shared::new(&checked).expect("a compensator");
        let model = LoopModel::new(&checked.stage, &shared, &condition).expect("an operating point");
        let scale = i + half + ramp * period;
        assert_absolute(topology, model.controlled.control_voltage, control, 1e-6 * scale);
        let gain = model.plant.zpk().dc_gain().expect("finite");
        // Near dVc = 0 the gain has no use and no digits.
        if dcontrol.abs() > 0.01 * scale {
            assert_relative(topology, gain, dv / dcontrol, 1e-6);
        }
    }
}

/// Over the boundary of conduction modes the control voltage meets from both sides, sense filter and delay included.
#[test]
fn control_voltage_is_continuous_over_the_boundary() {
    for topology in ["buck", "boost", "buck-boost"] {
        for (mode, filter, delay) in [
            ("peak-current", 0.0, 0.0),
            ("peak-current", 0.0, 100e-9),
            ("peak-current", 300e-9, 80e-9),
            ("valley-current", 0.0, 0.0),
        ] {
            let (vin, vout) = if topology == "buck" { (12.0, 5.0) } else { (9.0, 20.0) };
            let values = [("control.sense.filter", filter), ("control.delay", delay), ("control.duty.greatest", 1.0)];
            let mut design = programmed(topology, mode, vin, vout, 1.0, 300e3, &values);
            design.set_from_text("stage.rectifier", "diode").expect("an option");
            for (path, value) in [("stage.diode.drop", 0.4), ("stage.diode.resistance", 0.01)] {
                design.values.set(path, value).expect("finite");
            }
            let checked = checked(&design);
            let shared = Shared::new(&checked).expect("a compensator");
            let at = |load_current| StageCondition { input_voltage: vin, load_current, output_voltage: vout };
            let boundary = checked.stage.boundary_load(&at(1.0)).expect("a boundary");
            let volts = |factor: f64| {
                let model =
                    LoopModel::new(&checked.stage, &shared, &at(boundary * factor)).expect("an operating point");
                (model.controlled.control_voltage, model.averaged.operating_point.conduction.word())
            };
            let (below, above) = (volts(1.0 - 1e-7), volts(1.0 + 1e-7));
            assert_eq!((below.1, above.1), ("discontinuous", "continuous"), "{topology} {mode}");
            // A rested filter and one that never rests tell the same current at the boundary only while they forget the last
            // period; the valley's ramp carries the rest.
            assert_absolute(mode, below.0, above.0, 1e-5 * above.0.abs().max(0.1));
        }
    }
}

/// Buck at D 0.6 without a ramp: a finding with boundary and recommended ramp, and the change it offers mends it.
#[test]
fn subharmonic_oscillation_is_told_and_mended() {
    let mut design = programmed("buck", "peak-current", 10.0, 6.0, 3.0, 0.0, &[]);
    ideal_op_amp(&mut design);
    for (path, value) in [("compensator.r2", 1e3), ("compensator.c1", 100e-9), ("compensator.c2", 1e-9)] {
        design.values.set(path, value).expect("finite");
    }
    design.set_from_text("compensator.type", "2").expect("an option");
    let before = analysed(&design, &[1e3], 50);
    assert!(!before.shown.as_ref().expect("results").loop_gain.stable());
    let told = before.findings.iter().find(|f| f.place == "control.slope").expect("a finding");
    assert!(told.is_problem() && told.message.starts_with("Subharmonic oscillation"), "{told:?}");
    let remedy = told.remedy.as_deref().expect("one press");
    for (path, key) in &remedy.choices {
        design.choices.set(path, key);
    }
    for (path, value) in &remedy.values {
        design.values.set(path, *value).expect("finite");
    }
    let after = analysed(&design, &[1e3], 50);
    assert!(after.conditions.iter().all(|c| c.outcome.as_ref().is_ok_and(|s| s.loop_gain.stable())));
    assert!(after.findings.iter().all(|f| f.place != "control.slope"), "{:?}", after.findings);
    let quality = after.shown.expect("results").control.sampling.expect("continuous").quality().expect("stable");
    assert!((0.98..=1.0).contains(&quality), "{quality}");
}

/// Average current mode: at rest the current is the control voltage over the sense gain, and the inner loop gain at high
/// frequency is R·V/(ω·L)·(R2/R1)/ramp (Erickson & Maksimovic, 18.9, and common practice).
#[test]
fn average_current_follows_the_control_voltage() {
    let mut design = programmed("boost", "average-current", 12.0, 24.0, 2.0, 0.0, &[]);
    for (path, value) in [
        ("control.sense.gain", 0.1),
        ("control.ramp.amplitude", 1.0),
        ("control.inner.r1", 10e3),
        ("control.inner.r2", 10e3),
        ("control.inner.c1", 10e-9),
        ("control.inner.c2", 1e-15),
        ("control.inner.op-amp.dc-gain", 1e9),
        ("control.inner.op-amp.gain-bandwidth", 1e12),
        ("stage.inductor.inductance", 47e-6),
        ("stage.bank.1.capacitance", 470e-6),
    ] {
        design.values.set(path, value).expect("finite");
    }
    let checked = checked(&design);
    let shared = Shared::new(&checked).expect("a compensator");
    let condition = StageCondition { input_voltage: 12.0, load_current: 2.0, output_voltage: 24.0 };
    let model = LoopModel::new(&checked.stage, &shared, &condition).expect("an operating point");
    let stage = &model.controlled.stage;
    let row = stage.output("switched current").expect("named");
    let follows = Zpk::from_state_space(stage, row, 0).expect("roots").dc_gain().expect("finite");
    assert_relative("A/V at rest", follows, 10.0, 1e-6);
    assert_relative("control voltage", model.controlled.control_voltage, 0.1 * 4.0, 1e-6);
    let inner = model.controlled.inner.as_ref().expect("an inner loop");
    let f = 30e3;
    let wanted = 0.1 * 24.0 / (std::f64::consts::TAU * f * 47e-6);
    assert_relative("inner loop gain", inner.loop_gain.at_hz(f).norm(), wanted, 0.01);
}
