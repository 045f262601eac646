//! The words of the trade that results are told in: what each means, in a sentence or two, and its formula.
//!
//! *Conventions*: T is the loop gain with the sign of the negative feedback taken out, D the duty ratio, fs the switching
//! frequency, fc the crossover. Formulas are written in plain characters, so that window, sheet and terminal can print them.
//! *Source*: the trade's usual definitions, as in Erickson & Maksimovic, Fundamentals of Power Electronics, 3rd ed., ch. 2, 3, 8
//! and 9, and Åström & Murray, Feedback Systems, 2nd ed., 10 (modulus margin, sensitivity), from memory.

use super::switched_terms;
use crate::converter::Landmark;

/// A term with its meaning.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Term {
    /// Stable key; that of the read-out or landmark where it names one.
    pub key: &'static str,
    /// The term.
    pub name: &'static str,
    /// What it means, in a sentence or two.
    pub text: &'static str,
    /// Its formula, or an empty text where there is none.
    pub formula: &'static str,
}

impl Term {
    /// Meaning and formula in lines.
    pub fn words(&self) -> String {
        if self.formula.is_empty() { self.text.to_owned() } else { format!("{}\n{}", self.text, self.formula) }
    }
}

pub(super) const fn term(key: &'static str, name: &'static str, text: &'static str, formula: &'static str) -> Term {
    Term { key, name, text, formula }
}

/// All terms: read-outs, landmarks, ledger, lanes, operating point, curves and plots, the words of the program.
pub static TERMS: &[Term] = &[
    term(
        "crossover",
        "Crossover",
        "Where the loop gain passes 0 dB. Of several crossovers the one with the least phase margin is shown.",
        "|T(j·2π·fc)| = 1",
    ),
    term(
        "phase-margin",
        "Phase margin",
        "Phase that is left at the crossover before the loop oscillates. Common practice: 45° at least, 60° wanted.",
        "PM = 180° + arg T(j·2π·fc)",
    ),
    term(
        "gain-margin",
        "Gain margin",
        "How far the loop gain may rise until the loop oscillates. Common practice: 6 dB at least, 10 dB wanted.",
        "GM = −20·log |T| where arg T = −180° − k·360°",
    ),
    term(
        "gain-reduction",
        "Gain may fall",
        "How far the loop gain may fall until the loop oscillates; only a conditionally stable loop has such a limit.",
        "20·log |T| where arg T = −180° − k·360° and |T| > 1",
    ),
    term(
        "modulus-margin",
        "Modulus margin",
        "Least distance of the loop gain from the critical point −1. It sees what phase and gain margin miss between them; its \
         inverse is the peak of the sensitivity.",
        "min |1 + T| = 1 / Ms",
    ),
    term(
        "delay-margin",
        "Delay margin",
        "Additional delay that the loop bears, the least over its crossovers.",
        "(PM mod 360°) / (360°·fc)",
    ),
    term(
        "gain-at-half-switching",
        "Gain at ½ switching",
        "Loop gain at half the switching frequency, where an averaged model ends. It should be well below 0 dB.",
        "20·log |T(j·π·fs)|",
    ),
    term(
        "right-half-plane-ratio",
        "RHP zero / crossover",
        "How far the lowest right-half-plane zero stands above the crossover: it turns the phase down while it lifts the gain. \
         Common practice: three to five at least.",
        "f_RHP / fc",
    ),
    term(
        "load-step-deviation",
        "Load step",
        "Greatest excursion of the output after the load step, with its sign, by the linear model: limits of amplifier and duty \
         ratio do not act.",
        "extreme of v(t) − v(0), near ΔI·|Zout(fc)| for a step faster than 1/fc",
    ),
    term(
        "settling",
        "Settles in",
        "Time from the load step to the last exit from the settling band around the final value.",
        "last t with |v(t) − v(∞)| > band",
    ),
    term(
        "control-voltage",
        "Control voltage",
        "Holds the operating point: sensed current and ramp where the comparator decides, or what the inner loop asks for.",
        "Vc = R·I + ramp·t at the peak, R·I − ramp·t at the valley",
    ),
    term(
        "sampling-quality",
        "Qp at ½ switching",
        "Quality factor of the pair of poles that sampling the current once a period makes. Common practice: near 1.",
        "Qp = 1 / (π·(mc·D' − ½))",
    ),
    term("slope-factor", "Slope factor mc", "How much the ramp steepens what the comparator sees.", "mc = 1 + Se / Sn"),
    term(
        "fast-multiplier",
        "Fast multiplier α",
        "By how much a small deviation of the current is multiplied every period; below −1 it grows: subharmonic oscillation.",
        "α = −(m2 − ma) / (m1 + ma)",
    ),
    term(
        "compensating-ramp",
        "Compensating ramp",
        "Added to the sensed current so that the current does not oscillate at half the switching frequency.",
        "Se [V/s at the comparator]",
    ),
    term(
        "ramp-share",
        "Ramp / current's slope",
        "The ramp against the slope it works against: the down-slope in peak, the up-slope in valley current mode.",
        "ma / m2",
    ),
    term(
        "inner-crossover",
        "Inner crossover",
        "Where the gain of the inner current loop passes 0 dB, the control voltage at rest.",
        "|Ti(j·2π·fi)| = 1",
    ),
    term(
        "inner-phase-margin",
        "Inner phase margin",
        "Phase that is left at the inner crossover before the current loop oscillates.",
        "PM = 180° + arg Ti(j·2π·fi)",
    ),
    term(
        "inner-gain-margin",
        "Inner gain margin",
        "How far the inner loop's gain may rise until the current loop oscillates.",
        "GM = −20·log |Ti| where arg Ti = −180° − k·360°",
    ),
    term(
        "crossover-least-ratio",
        "Crossover, least ratio",
        "Crossover at the least transfer ratio of the optocoupler: the loop gain is proportional to it.",
        "|T(j·2π·fc)| = 1 with T·least / nominal",
    ),
    term(
        "phase-margin-least-ratio",
        "Phase margin, least ratio",
        "Phase margin at the least transfer ratio of the optocoupler.",
        "PM = 180° + arg T(j·2π·fc) with T·least / nominal",
    ),
    term(
        "crossover-greatest-ratio",
        "Crossover, greatest ratio",
        "Crossover at the greatest transfer ratio of the optocoupler: the loop gain is proportional to it.",
        "|T(j·2π·fc)| = 1 with T·greatest / nominal",
    ),
    term(
        "phase-margin-greatest-ratio",
        "Phase margin, greatest ratio",
        "Phase margin at the greatest transfer ratio of the optocoupler.",
        "PM = 180° + arg T(j·2π·fc) with T·greatest / nominal",
    ),
    term(
        "led-current",
        "LED current",
        "Current in the optocoupler's LED that holds the control voltage.",
        "(Vsupply − Vc) / (ratio·Rpull)",
    ),
    term(
        "cathode-current",
        "Cathode current",
        "Current in the shunt regulator: the LED's and that of the bias resistor across it. Below its least current the regulator \
         does not regulate.",
        "I_LED + V_LED / Rbias",
    ),
    term(
        "cathode-voltage",
        "Cathode voltage",
        "What LED and LED resistor leave for the shunt regulator. Below its least voltage it cannot pull any further.",
        "Vfeed − V_LED − Rled·I_cathode",
    ),
    term(
        "lc-resonance",
        "LC resonance",
        "Resonance of the inductor with the output bank: the plant falls by 40 dB per decade above it and loses up to 180°.",
        "f0 = 1 / (2π·√(Le·C)), Le = L of a buck, L/(1 − D)² of a boost or buck-boost, n²·L/(1 − D)² of a flyback; of two inductors the lower root of their characteristic equation",
    ),
    term(
        "second-resonance",
        "Second resonance",
        "Resonance of the coupling capacitor with both inductors: the plant falls by another 40 dB per decade above it. Near it stands a \
         zero pair; where that lies in the right half-plane the two do not cancel but turn the phase by a whole turn. Lo is what the \
         output sees, Lr what a current round through both inductors sees.",
        "upper ω of C·Cc·(L1·L2 − M²)·ω⁴ − a2·ω² + (1 − D)² = 0; Lo = L1·D² + L2·(1 − D)² + 2M·D·(1 − D), Lr = L1 + L2 − 2M; a2 = C·Lo + Cc·Lr·(1 − D)² of a SEPIC, C·Lo + Cc·L1 of a Ćuk",
    ),
    term(
        "zero-pair",
        "Zero pair",
        "Where the coupling capacitor takes the current that should reach the output. The load turns the pair into the right half-plane; \
         losses, or a damping branch across the coupling capacitor, turn it back. Undamped it is the end of the loop's crossover.",
        "SEPIC: 1 / (2π·√((L1 + L2 − 2M)·Cc)); Ćuk: √(1 − D) / (2π·√((L1 − M)·Cc))",
    ),
    term(
        "low-pole",
        "Low pole",
        "The output bank against load and stage where the inductor is no state of its own: its current rests every period, or a current loop holds it.",
        "discontinuous: (2 − M)/((1 − M)·2π·R·C) of a buck, (2M − 1)/((M − 1)·2π·R·C) of a boost, 1/(π·R·C) of a buck-boost; current mode: about 1/(2π·R·C), more with ramp and slopes",
    ),
    term(
        "second-pole",
        "Second pole",
        "What is left of the inductor in discontinuous conduction; it lies near or above the switching frequency, D2 being the rectifier's share of the period.",
        "fs / (π·D2)",
    ),
    term(
        "esr-zero",
        "ESR zero",
        "Above it the bank's series resistance bears the ripple: the plant falls by 20 dB per decade less and gains up to 90°.",
        "fz = 1 / (2π·ESR·C)",
    ),
    term(
        "right-half-plane-zero",
        "RHP zero",
        "A stage that charges its inductor before it serves the output answers the wrong way first: gain rises as at a zero, \
         phase falls as at a pole. No compensator can take it away.",
        "f_RHP = (1 − D)²·R / (2π·L) of a boost, divided by D for a buck-boost, by D·n² for a flyback",
    ),
    term(
        "input-filter",
        "Input filter",
        "Resonance of the input filter. The converter's input has a negative resistance, so the filter wants damping: its output \
         impedance should stay well below the converter's input impedance.",
        "f = 1 / (2π·√(Lf·Cin))",
    ),
    term(
        "output-filter",
        "Output filter",
        "Resonance of the second stage: its inductor with the bank and its own capacitor in series. Inside the loop it turns the \
         phase down by up to 180°.",
        "1 / (2π·√(Lo·C·Co/(C + Co)))",
    ),
    term(
        "filter-margin",
        "Filter margin",
        "Least distance of the input filter's output impedance Zo below the converter's input impedances ZD, ZN and Zi. \
         Common practice: 6 dB at least.",
        "min 20·log(|Z|/|Zo|) over ZD, ZN, Zi up to fs/2",
    ),
    term(
        "filter-gain-change",
        "Filter moves gain",
        "Greatest change of the loop's gain by the input filter, against the same stage fed by an ideal source.",
        "20·log |(1 + Zo/ZN) / (1 + Zo/ZD)|",
    ),
    term(
        "filter-phase-change",
        "Filter moves phase",
        "Greatest change of the loop's phase by the input filter, against the same stage fed by an ideal source.",
        "arg ((1 + Zo/ZN) / (1 + Zo/ZD))",
    ),
    term(
        "load-voltage",
        "Voltage at the load",
        "What the load sees behind a second stage that is not sensed: the regulated voltage less the drop of the second winding.",
        "Vload = V − Iload·Ro",
    ),
    term(
        "input-impedance",
        "Input impedance",
        "At the stage's input terminals: ZD with the control voltage at rest, ZN with the control voltage that holds the output \
         at rest, Zi with the loop closed. The filter's output impedance Zo must stay below them.",
        "1/Zi = (1/ZD + T/ZN) / (1 + T)",
    ),
    term(
        "half-switching",
        "½ switching",
        "A modulator samples once a period: above half the switching frequency averaged curves mean nothing.",
        "fs / 2",
    ),
    term("half-turn", "Half turn", "The negative feedback itself, from which the loop's lag is taken off.", "+180°"),
    term(
        "integrator",
        "Integrator",
        "The compensator's pole at the origin, for no error at rest. It lags by a quarter turn at every frequency.",
        "−90°",
    ),
    term(
        "compensator-zero",
        "Zero of the compensator",
        "Lifts gain and phase from its frequency on.",
        "+arctan(f / fz)",
    ),
    term(
        "compensator-pole",
        "Pole of the compensator",
        "Lets gain and phase fall from its frequency on, so that ripple does not reach the modulator.",
        "−arctan(f / fp)",
    ),
    term(
        "amplifier",
        "Amplifier",
        "What the real amplifier and the loading of its network add to the response of an ideal one.",
        "arg of actual response − arg of ideal response",
    ),
    term(
        "sampling-share",
        "Sampling",
        "What the difference equation, its coefficients rounded, adds to a continuous response with the same poles and zeros.",
        "arg of C at z = e^(jωT) − arg of ideal response",
    ),
    term(
        "plant-phase",
        "Poles and zeros of the stage",
        "Share of a pole, a pair of poles or a zero of the averaged power stage.",
        "pole −arctan(f / f0), zero +arctan(f / f0); a pair of poles turns from 0° to −180° about its resonance",
    ),
    term(
        "delay",
        "Delay",
        "Comparator, logic and driver; with a difference equation computation, and the pulse width being set once a period: D·T of a trailing edge. Exact in responses and margins.",
        "−360°·f·td",
    ),
    term("turns", "Whole turns", "Whole turns taken out, so that the sum is the phase margin.", "k·360°"),
    term(
        "lane-gain",
        "Gain lane",
        "Where the integrator alone would have a gain of 1. Moving it moves the gain at every frequency.",
        "compensator at low frequency: f_gain / (j·f)",
    ),
    term(
        "duty-ratio",
        "Duty ratio",
        "Share of the period in which the controlled switch conducts, losses included.",
        "D = t_on·fs; lossless: V/Vin of a buck, 1 − Vin/V of a boost, V/(V + Vin) of a buck-boost",
    ),
    term(
        "conduction",
        "Conduction",
        "Continuous: the inductor current never stops. Forced continuous: it may reverse, as a synchronous rectifier lets it. \
         Discontinuous: it rests for a part of the period.",
        "continuous while I_L > ΔI / 2",
    ),
    term("inductor-current", "Inductor current", "Average over a period, and its peak.", "I_peak = I_L + ΔI / 2"),
    term(
        "inductor-ripple",
        "Inductor ripple",
        "Triangular part of the inductor current, peak to peak. Common practice: 30 to 40 % of the average at full load.",
        "ΔI = V_L·t / L",
    ),
    term("input-current", "Input current", "Average current drawn from the source.", "Iin = (Pout + losses) / Vin"),
    term(
        "output-step",
        "Output step",
        "Step of the output voltage at a switching instant, from the series resistance of the bank.",
        "ΔV = ESR·Δi",
    ),
    term(
        "conduction-losses",
        "Conduction losses",
        "Losses of resistances and of the diode's drop. Switching, core and gate losses are not modelled.",
        "Σ R·I_rms² + V_D·I_avg",
    ),
    term("plant", "Plant", "From control voltage to output voltage: modulator, power stage and delay.", "Gp = v / vc"),
    term(
        "compensator",
        "Compensator",
        "From output voltage to control voltage, with its inversion taken out: divider, network and amplifier.",
        "Gc = −vc / v",
    ),
    term("loop", "Loop gain", "Plant times compensator, delay included; the critical point is −1.", "T = Gp·Gc"),
    term("band", "All nine", "The loop at all nine conditions of input voltage and load lies within this band.", ""),
    term(
        "output-impedance",
        "Output impedance",
        "What a change of load current does to the output voltage, frequency by frequency. The loop lowers it below the \
         crossover.",
        "Zout = −v / i_load; closed = open / (1 + T)",
    ),
    term(
        "line-to-output",
        "Line to output",
        "What a change of the input voltage does to the output voltage: the line rejection with its sign turned.",
        "v / v_in; closed = open / (1 + T)",
    ),
    term(
        "following",
        "Following",
        "How the output follows a change of the reference; 0 dB is perfect following.",
        "T / (1 + T)",
    ),
    term("closed-loop", "Closed loop", "The response with the loop at work.", "open-loop response / (1 + T)"),
    term("open-loop", "Open loop", "The response with the control voltage held still.", ""),
    term(
        "load-step",
        "Load step",
        "Output voltage after a rise of the load current at the stated slew; linear prediction.",
        "V(s) = −Zout(s)·I(s)",
    ),
    term(
        "line-step",
        "Line step",
        "Output voltage after a rise of the input voltage at the stated slew; linear prediction.",
        "",
    ),
    term(
        "reference-step",
        "Reference step",
        "Output voltage after a change of the reference, given as the change it asks of the output; linear prediction.",
        "",
    ),
    term(
        "crossover-window",
        "Crossover window",
        "The crossovers this stage allows, each edge named by what sets it. Common practice, no law.",
        "least: 2·f0 or ΔI / (2π·C·ΔV); greatest: f_RHP / 3, fs / 5, or where the amplifier ends",
    ),
    term(
        "phase-ledger",
        "Phase ledger",
        "The phase at the crossover by its causes; the rows add up to the phase margin.",
        "180° + Σ shares = PM",
    ),
    term(
        "nine-conditions",
        "Nine conditions",
        "Least, nominal and greatest input voltage with least, nominal and greatest load. Phase margin over crossover; press one \
         to show it in full.",
        "",
    ),
    term("held-tries", "Held tries", "Designs kept to compare with, worked out at the condition shown.", ""),
    term(
        "what-if",
        "What if",
        "A condition of your own beside the nine: type an input voltage and a load, press Enter.",
        "",
    ),
];

/// The term with this key.
pub fn find(key: &str) -> Option<&'static Term> {
    TERMS.iter().chain(switched_terms::TERMS).find(|term| term.key == key)
}

/// The term behind an entry that states a requirement: of `requirement.phase-margin.worst` the phase margin.
pub fn of_entry(path: &str) -> Option<&'static Term> {
    let mut words = path.split('.');
    (words.next() == Some("requirement")).then(|| words.next().and_then(find)).flatten()
}

/// A landmark in lines: what it means, and the formula it was placed by.
pub fn of_landmark(landmark: &Landmark) -> String {
    let meaning = find(landmark.key).map_or("", |term| term.text);
    let derived = if landmark.derived { "\nderived from the model" } else { "" };
    format!("{meaning}\n{}{derived}", landmark.formula)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::analysis::{Level, Request, Shown, analyse};
    use crate::design::{self, all_entries, sample};
    use std::collections::BTreeSet;

    #[test]
    fn every_term_stands_once_and_says_something() {
        let mut seen = BTreeSet::new();
        for term in TERMS.iter().chain(switched_terms::TERMS) {
            assert!(seen.insert(term.key), "{} stands twice", term.key);
            assert!(!term.name.is_empty() && term.text.ends_with('.') && !term.formula.ends_with('.'), "{}", term.key);
        }
    }

    #[test]
    fn every_readout_landmark_and_requirement_has_its_term() {
        let modes = design::choice("control.mode").expect("there").options;
        let tries = sample::all().iter().flat_map(|sample| modes.iter().map(move |mode| (sample, mode.key)));
        for (sample, mode) in tries {
            let mut design = sample.design().expect("read");
            design.set_from_text("control.mode", mode).expect("an option");
            // A sample that cannot be run in a mode shows no read-outs.
            let Ok(design) = design.check() else { continue };
            let shown = Shown::Levels(Level::Nominal, Level::Nominal);
            let analysis = analyse(&design, &Request::spanning(shown, design.stage.switching_frequency, 20));
            for readout in &analysis.readouts {
                let term = find(readout.key).unwrap_or_else(|| panic!("{} has no term", readout.key));
                assert_eq!(term.name, readout.name);
                assert!(!term.formula.is_empty(), "{}", readout.key);
            }
            for landmark in analysis.shown.into_iter().flat_map(|detail| detail.landmarks) {
                assert!(find(landmark.key).is_some(), "{}", landmark.key);
            }
        }
        for entry in all_entries().filter(|entry| entry.path.starts_with("requirement.")) {
            assert!(of_entry(entry.path).is_some(), "{}", entry.path);
        }
    }
}
