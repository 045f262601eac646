//! Isolated feedback: hand-worked examples, parts from lanes and back, limits, wrong input.

use super::*;
use crate::quantity::{Choices, Values};
use proptest::prelude::*;
use std::collections::BTreeSet;
use std::f64::consts::TAU;

fn choices(pairs: &[(&str, &str)]) -> Choices {
    let mut choices = Choices::new();
    choices.set("compensator.amplifier", "shunt-regulator");
    for (path, key) in pairs {
        choices.set(path, key);
    }
    choices
}

/// A 12 V output, 2.5 V reference.
fn values(pairs: &[(&str, f64)]) -> Values {
    let mut values = Values::new();
    let twelve_volts = [
        ("compensator.reference", 2.5),
        ("compensator.divider.upper", 38e3),
        ("compensator.divider.lower", 10e3),
        ("compensator.c1", 100e-9),
        ("compensator.c2", 1e-9),
    ];
    for (path, value) in twelve_volts.iter().chain(pairs) {
        values.set(path, *value).unwrap();
    }
    values
}

fn compensator(chosen: &[(&str, &str)], entered: &[(&str, f64)]) -> Compensator {
    Compensator::from_values(&values(entered), &choices(chosen)).unwrap()
}

/// The common result by hand: an LED without resistance of its own and without a bias resistor to speak of passes on, at mid-band,
/// transfer ratio × pull-up / LED resistor; the zero is that of Rupper and C1, the pole that of the pull-up with all capacitance
/// at the collector (Basso, Designing Control Loops for Linear and Switching Power Supplies, 2012, ch. 7; from memory).
/// With 0.5 · 20 kΩ / 1 kΩ the mid-band gain is 10 = 20 dB.
#[test]
fn mid_band_gain_is_ratio_times_pull_up_over_led_resistor() {
    let network = compensator(
        &[("compensator.type", "2"), ("compensator.opto.speed", "capacitance")],
        &[
            ("compensator.opto.transfer-ratio.least", 0.3),
            ("compensator.opto.transfer-ratio.nominal", 0.5),
            ("compensator.opto.pull-up", 20e3),
            ("compensator.opto.led-resistor", 1e3),
            ("compensator.opto.led-resistance", 0.0),
            ("compensator.opto.capacitance", 1e-9),
            ("compensator.shunt.dc-gain", 1e6),
            ("compensator.shunt.gain-bandwidth", 1e9),
        ],
    );
    let (zero, pole): (f64, f64) = (1.0 / (TAU * 38e3 * 100e-9), 1.0 / (TAU * 20e3 * 2e-9));
    let corners = network.corners();
    assert!((corners.zero_1.unwrap() / zero - 1.0).abs() < 1e-12);
    assert!((corners.pole_1.unwrap() / pole - 1.0).abs() < 1e-12);
    let middle = (zero * pole).sqrt();
    let by_hand = 10.0 * (1.0 + (zero / middle).powi(2)).sqrt() / (1.0 + (middle / pole).powi(2)).sqrt();
    assert!((network.ideal().at_hz(middle).norm() / by_hand - 1.0).abs() < 1e-12);
    assert!((network.response().unwrap().at_hz(middle).norm() / by_hand - 1.0).abs() < 1e-5);
    assert!((network.fast_path_gain().unwrap() - 10.0).abs() < 1e-12);
    // Slow and fast path add up to the whole.
    let [slow, fast] = network.paths_at(middle).unwrap();
    let whole = network.response().unwrap().at_hz(middle);
    assert!((slow + fast - whole).norm() < 1e-9 * whole.norm());
}

/// Operating point by hand: 5 V through 5 kΩ down to 1 V is 0.8 mA; at a ratio of 0.8 the LED carries 1 mA and drops 1.02 V; 1.02 mA flow
/// in the bias resistor of 1 kΩ; 12 V − 1.02 V − 2 kΩ · 2.02 mA = 6.94 V are left for the regulator.
#[test]
fn operating_point_by_hand() {
    let network = compensator(
        &[("compensator.type", "2")],
        &[
            ("compensator.opto.transfer-ratio.nominal", 0.8),
            ("compensator.opto.pull-up", 5e3),
            ("compensator.opto.led-resistor", 2e3),
            ("compensator.opto.led-drop", 1.0),
            ("compensator.opto.led-resistance", 20.0),
            ("compensator.opto.bias-resistor", 1e3),
        ],
    );
    let bias = network.bias(1.0, 12.0, 0.8).unwrap();
    assert!((bias.led_current - 1e-3).abs() < 1e-12);
    assert!((bias.cathode_current - 2.02e-3).abs() < 1e-12);
    assert!((bias.cathode_voltage - 6.94).abs() < 1e-9);
    // Put back into its definition: with the greatest LED resistor the cathode stands at its least voltage.
    let greatest = network.greatest_led_resistor(12.0, 1.0).unwrap();
    let mut at_limit = network.clone();
    at_limit.parts.set(Part::Led, greatest);
    let least_ratio = network.isolated().unwrap().ratios[0];
    assert!((at_limit.bias(1.0, 12.0, least_ratio).unwrap().cathode_voltage - 2.5).abs() < 1e-9);
    assert!((at_limit.control_limits_at(12.0, least_ratio).unwrap().0 - 1.0).abs() < 1e-9);
    // The netlist's own DC solution with its constants as inputs gives that control voltage at that cathode voltage.
    let system = network.state_space().unwrap();
    let gain = |input: &str| system.dc_gain(0, system.need_input(input).unwrap()).unwrap();
    let steady: f64 = network.steady_inputs().iter().map(|(name, value)| gain(name) * value).sum();
    let regulator = network.isolated().unwrap();
    // The divider gives the tap an error of cathode / gain.
    let sensed = (2.5 - bias.cathode_voltage / regulator.dc_gain) * 4.8;
    let control = steady + gain("vout") * sensed + gain(FAST) * 12.0;
    assert!((control - 1.0).abs() < 1e-6, "{control}");
}

fn any_network() -> impl Strategy<Value = Compensator> {
    let decades = proptest::collection::vec(-1.0f64..1.0, 11);
    (0usize..3, 0usize..2, any::<bool>(), any::<bool>(), decades).prop_map(|(kind, supply, series, keeps, d)| {
        let supply = if kind == 0 { "none" } else { ["load", "none"][supply] };
        let mut network = compensator(
            &[
                ("compensator.type", ["1", "2", "3"][kind]),
                ("compensator.opto.fast-path", supply),
                ("compensator.shunt.series-resistor", if series { "fitted" } else { "none" }),
                ("compensator.opto.kept", if keeps { "led-resistor" } else { "r2" }),
            ],
            &[("compensator.r2", 20e3)],
        );
        for (part, decade) in Part::ALL.into_iter().zip(d) {
            network.parts.set(part, network.parts.get(part) * 10f64.powf(decade));
        }
        // Within reach of its own operating point.
        let greatest = network.greatest_led_resistor(network.dc_output_voltage(), 0.3).unwrap();
        if greatest > 1.0 {
            network.parts.led = network.parts.led.min(greatest);
        }
        network
    })
}

proptest! {
    #![proptest_config(ProptestConfig { cases: 1000, failure_persistence: None, ..ProptestConfig::default() })]

    /// The lanes of any network, asked of the same network with other parts, give back the parts.
    #[test]
    fn parts_to_lanes_to_parts(network in any_network(), scale in 0.3f64..3.0) {
        let lanes = network.corners();
        let second = lanes.zero_2.zip(lanes.pole_2).map(|(zero, pole)| pole / zero);
        prop_assume!(second.is_none_or(|ratio| ratio > LEAST_RATIO && ratio < network.greatest_ratio()));
        let mut other = network.clone();
        for part in network.fitted() {
            let held = matches!(part, Part::Upper | Part::Lower | Part::Bias | Part::PullUp | Part::R2 | Part::Led);
            if !held {
                other.parts.set(part, network.parts.get(part) * scale);
            }
        }
        let placement = other.place(&lanes, &BTreeSet::new());
        prop_assert!(placement.why.is_none(), "{:?}", placement.why);
        for part in network.fitted() {
            let (found, wanted) = (placement.compensator.parts.get(part), network.parts.get(part));
            prop_assert!((found / wanted - 1.0).abs() < 1e-9, "{}: {found} for {wanted}", part.label());
        }
        for lane in &placement.lanes {
            prop_assert!((lane.as_built_hz / lane.aim_hz - 1.0).abs() < 1e-9);
        }
    }

    /// Any lane moved anywhere arrives or says why not; what holds the operating point stays, bit for bit.
    #[test]
    fn a_moved_lane_arrives_or_says_why(
        network in any_network(), lane in 0usize..5, decades in -3.0f64..3.0, locked in 0usize..14,
    ) {
        let Some(lane) = network.lanes().get(lane).cloned() else { return Ok(()) };
        let locks: BTreeSet<_> = Part::ALL.get(locked).map(|part| part.path().to_owned()).into_iter().collect();
        let aim = lane.frequency_hz * 10f64.powf(decades);
        let placed = network.move_lane(lane.key, aim, &locks);
        prop_assert!((placed.as_built_hz / aim - 1.0).abs() < 1e-5 || placed.why.is_some());
        let built = &placed.compensator.parts;
        for part in network.fitted() {
            let same = built.get(part).to_bits() == network.parts.get(part).to_bits();
            let held = matches!(part, Part::Upper | Part::Lower | Part::Bias | Part::PullUp);
            prop_assert!(same || !(held || locks.contains(part.path())), "{}", part.label());
            prop_assert!(same || part.entry().check(built.get(part)).is_ok());
        }
        let greatest = network.greatest_led_resistor(network.dc_output_voltage(), 0.3).unwrap();
        prop_assert!(built.led <= greatest.max(network.parts.led) * (1.0 + 1e-6));
    }
}

#[test]
fn the_fast_path_holds_the_gain_up_and_says_so() {
    let network = compensator(&[("compensator.type", "2")], &[]);
    let placed = network.move_lane("gain", network.corners().gain.unwrap() / 1000.0, &BTreeSet::new());
    let why = placed.why.unwrap();
    assert!(why.contains("fast path") && why.contains("transfer ratio × pull-up / LED resistor"), "{why}");
    let greatest = network.greatest_led_resistor(12.0, 0.3).unwrap();
    assert!((placed.compensator.parts.led / greatest - 1.0).abs() < 1e-6);
    // With the LED resistor locked the floor is that of the present one.
    let locks: BTreeSet<_> = [Part::Led.path().to_owned()].into();
    let placed = network.move_lane("gain", network.corners().gain.unwrap() / 10.0, &locks);
    assert!(placed.why.unwrap().contains("fast path"));
    // Placed together with others, the gain alone falls short.
    let corners = network.corners();
    let aims = Corners { gain: Some(corners.gain.unwrap() / 1000.0), pole_1: Some(2e3), ..Corners::default() };
    let placement = network.place(&aims, &BTreeSet::new());
    assert!(placement.why.unwrap().contains("fast path"));
    let built = placement.compensator.corners();
    assert!((built.pole_1.unwrap() / 2e3 - 1.0).abs() < 1e-9);
    assert!((built.zero_1.unwrap() / corners.zero_1.unwrap() - 1.0).abs() < 1e-9);
    // The optocoupler's own pole is the highest that its pull-up allows.
    let own = 15e3;
    let placed = network.move_lane("pole-1", 10.0 * own, &BTreeSet::new());
    assert!(placed.why.unwrap().contains("smaller pull-up"));
    assert!((placed.as_built_hz / own - 1.0).abs() < 2e-3);
}

#[test]
fn k_factor_and_rounding_with_isolated_feedback() {
    for (kind, phase, supply, plant_gain_db) in [
        ("2", -95.0, "load", -9.2),
        ("2", -95.0, "none", -9.2),
        ("3", -130.0, "load", -16.0),
        ("3", -130.0, "none", -16.0),
    ] {
        let network = compensator(&[("compensator.type", kind), ("compensator.opto.fast-path", supply)], &[]);
        let goal = KFactorGoal { crossover_hz: 2e3, phase_margin_deg: 55.0, plant_gain_db, plant_phase_deg: phase };
        let placement = network.by_k_factor(&goal, &BTreeSet::new()).unwrap();
        assert_eq!(placement.why, None, "{kind} {supply}");
        let at = placement.compensator.response().unwrap().at_hz(2e3);
        assert!((20.0 * at.norm().log10() + plant_gain_db).abs() < 1e-6, "{kind} {supply}");
        assert!((180.0 + at.arg().to_degrees() + phase - 55.0).abs() < 1e-6, "{kind} {supply}");
        let rounded = placement.compensator.rounded(Series::E96, Series::E12, &BTreeSet::new());
        for part in rounded.fitted() {
            let series = if part.is_resistor() { Series::E96 } else { Series::E12 };
            assert_eq!(series.nearest(rounded.parts.get(part)).to_bits(), rounded.parts.get(part).to_bits());
        }
        assert_eq!(rounded.rounded(Series::E96, Series::E12, &BTreeSet::new()), rounded);
        for (was, is) in placement.compensator.lanes().iter().zip(rounded.lanes()) {
            // Steps of E12 are 20 % wide, and gain and zero hang on one capacitor.
            assert!((is.frequency_hz / was.frequency_hz).ln().abs() < 0.21, "{}", was.key);
        }
    }
}

/// Wrong input for the entries of isolated feedback that contradict each other: named at its place with a hint.
#[test]
fn contradictions_are_named_at_their_place() {
    let type_two = ("compensator.type", "2");
    for (chosen, path, value, place, word) in [
        (
            &[type_two][..],
            "compensator.opto.transfer-ratio.least",
            1.0,
            "compensator.opto.transfer-ratio.least",
            "above",
        ),
        (
            &[type_two],
            "compensator.opto.transfer-ratio.greatest",
            0.7,
            "compensator.opto.transfer-ratio.greatest",
            "below",
        ),
        (
            &[type_two],
            "compensator.opto.transfer-ratio.nominal",
            0.0,
            "compensator.opto.transfer-ratio.nominal",
            "must be",
        ),
        (&[type_two], "compensator.opto.saturation", 6.0, "compensator.opto.supply", "saturation"),
        (&[type_two], "compensator.shunt.least-voltage", 11.5, "compensator.shunt.least-voltage", "leaves nothing"),
        (&[type_two], "compensator.opto.led-resistor", 100e3, "compensator.opto.led-resistor", "lets"),
        (
            &[type_two, ("compensator.opto.fast-path", "none")],
            "compensator.opto.led-supply",
            3.0,
            "compensator.opto.led-supply",
            "leaves nothing",
        ),
        (&[("compensator.type", "1")], "compensator.c1", 1e-8, "compensator.type", "zero"),
    ] {
        let faults = Compensator::from_values(&values(&[(path, value)]), &choices(chosen)).unwrap_err();
        assert_eq!(faults.len(), 1, "{faults:?}");
        assert_eq!(faults[0].place, place);
        assert!(faults[0].message.contains(word) && faults[0].hint.is_some(), "{}", faults[0]);
    }
    // A pull-up that cannot bias the regulator, beside a bias resistor that does not either; the remedy mends it.
    let mut starved = values(&[("compensator.opto.pull-up", 100e3), ("compensator.opto.bias-resistor", 10e3)]);
    let faults = Compensator::from_values(&starved, &choices(&[type_two])).unwrap_err();
    assert_eq!(faults[0].place, "compensator.opto.pull-up");
    for (path, value) in &faults[0].remedy.as_ref().unwrap().values {
        starved.set(path, *value).unwrap();
    }
    assert!(Compensator::from_values(&starved, &choices(&[type_two])).is_ok());
}
