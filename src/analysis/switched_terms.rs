//! The words of the exact side: what the switched model's results mean.
//!
//! *Source*: the trade's usual definitions, as in Erickson & Maksimovic, Fundamentals of Power Electronics, 3rd ed., ch. 18, and
//! Guckenheimer & Holmes, Nonlinear Oscillations, 1.5 (multipliers of an orbit), from memory.

use super::terms::{Term, term};

/// Terms of the exact side.
pub(super) static TERMS: &[Term] = &[
    term(
        "exact-curves",
        "Exact curves",
        "What a gain/phase analyser would read on the switching circuit itself, ripple fed back included: broad and pale under the averaged curves. Within 1 % of a multiple of half the switching frequency such a reading depends on the phase of the injected sine, so there are gaps.",
        "",
    ),
    term(
        "averaged-reach",
        "Averaged holds to",
        "Up to this frequency plant and loop gain of the averaged model lie within 1 dB and 5° of the exact ones.",
        "",
    ),
    term(
        "multiplier",
        "Greatest multiplier",
        "By how much the slowest deviation from the steady period is multiplied every period. Below 1 everything dies out; a multiplier beyond −1 is period doubling, a pair beyond the unit circle a slow oscillation.",
        "deviation after n periods = multiplierⁿ · deviation",
    ),
    term(
        "switched-stability",
        "Closed loop",
        "The averaged loop is judged by its poles, the switched one by its multipliers. Margins decide neither.",
        "stable: every |multiplier| < 1",
    ),
    term(
        "page-loop",
        "Loop",
        "Gain and phase with the compensator's lanes; steps and closed-loop responses below.",
        "",
    ),
    term(
        "page-waveforms",
        "Waveforms",
        "One steady period of the closed loop, solved exactly: currents, voltages, what the comparator compares, and what the parts bear.",
        "",
    ),
    term(
        "page-transient",
        "Transient",
        "The closed loop cycle by cycle after an event, limits of amplifier, duty ratio and current included: what the scope will show.",
        "",
    ),
    term(
        "transient-deviation",
        "Deviation",
        "Signed extreme of the output, averaged over each period, against its value before the event; at start-up and for a reference step the extreme beyond the final value.",
        "",
    ),
    term(
        "transient-rebound",
        "Rebound",
        "Signed extreme on the other side of the final value after that: the overshoot or undershoot of the recovery.",
        "",
    ),
    term(
        "transient-settling",
        "Settles in",
        "Last exit from the settling band around the final value, counted from the event; for an overload from its end.",
        "",
    ),
    term("transient-peak", "Peak current", "Greatest magnitude since the event began, ripple included.", ""),
    term("transient-range", "Output, ripple included", "Least and greatest output voltage since the event began.", ""),
    term("start-up", "Start-up", "The reference rises from zero, the converter at rest before.", ""),
    term("overload", "Overload", "The load draws an overload for a time; the recovery from it is what counts.", ""),
];
