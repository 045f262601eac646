//! The command line: the same results as text and JSON.
//!
//! `polewright [FILE]` opens the window on a file, or on the built-in design. `polewright check FILE...` prints what the window would
//! show, `polewright transient FILE --event ...` follows the switched loop through an event. Exit code of a check: 0 when every loop is stable and every requirement met in all files, 1 when one is not, 2 when an input
//! cannot be used (a file, an entry, an argument, or a condition asked for that has no operating point); the worst of all files.
//!
//! # The JSON report of a check (`--json`)
//!
//! Always an array, one object per file in the order given, an unusable file too. SI units, frequencies in hertz, phases in
//! degrees, fractions as ratios. What is undefined or infinite is `null`; a list that cannot be computed is empty. Fields may
//! be added, never renamed or removed.
//!
//! | field | meaning |
//! |---|---|
//! | `file` | the file as named on the command line |
//! | `status` | `met`, `not met` or `unusable`, as the exit code |
//! | `title` | title of the design; `null` when the file cannot be read |
//! | `condition` | `{input_voltage, load_current, label}` of everything below that is not said to be over all conditions |
//! | `operating_point` | `{duty, conduction, second_duty, control_voltage, input_current, conduction_loss, boundary_load, load_voltage, further}`; `further` is `[{key, value, word}]`, what only some stages have; conduction is `continuous`, `forced continuous` or `discontinuous`, and `second_duty` the share of the period in which the rectifier then conducts, else `null` |
//! | `inductors` | `[{name, average, ripple, peak}]` [A], ripple peak to peak |
//! | `landmarks` | `[{name, frequency_hz}]`, textbook frequencies of the plant |
//! | `control` | `{mode, control_voltage, clamp, sampling_quality, subharmonic, slope_factor, fast_multiplier, ramp_v_per_s, ramp_share, boundary_ramp_v_per_s, recommended_ramp_v_per_s, inner_loop}`: the control law at the condition; `sampling_quality` is `null` beyond the subharmonic boundary, all of sampling outside peak and valley current mode in continuous conduction |
//! | `control.inner_loop` | `{stable, crossover_hz, phase_margin_deg, gain_margin_db, modulus_margin, output_voltage, slope_ratio}` of average current mode |
//! | `loop` | `{stable, conditionally_stable, crossovers, phase_crossovers, modulus_margin, sensitivity_peak, delay_margin_s, gain_at_half_switching_db}`; `stable` is `null` when undecided |
//! | `loop.crossovers` | `[{frequency_hz, phase_margin_deg, falling, slope_db_per_decade}]`, all of them |
//! | `loop.phase_crossovers` | `[{frequency_hz, gain_margin_db}]`, all of them |
//! | `conditions` | the nine: `[{condition, input_voltage, load_current, duty, conduction, control_voltage, sampling_quality, stable, crossover_hz, phase_margin_deg, gain_margin_db, modulus_margin, load_step_deviation_v, settling_s, filter_margin_db, at_least_ratio, at_greatest_ratio, problem}]` |
//! | `worst` | `[{requirement, condition, value}]` over the nine, by key of the read-out |
//! | `response` | at the frequencies of `--at`, else in 1-2-5 steps from 10 Hz to half the switching frequency: `[{frequency_hz, plant_db, plant_deg, compensator_db, compensator_deg, loop_db, loop_deg, output_impedance_ohm, output_impedance_deg, line_to_output_db, line_to_output_deg, open_loop_output_impedance_ohm, open_loop_line_to_output_db}]`; plant is control voltage to output voltage with the modulator, compensator is output voltage to control voltage with the inversion taken out |
//! | `input_filter` | `null` without one; `{resonance_hz, characteristic_impedance_ohm, peak_ohm, peak_hz, least_input_impedance_ohm, least_input_impedance_hz, margins, gain_change_db, gain_change_hz, phase_change_deg, phase_change_hz, stable_without, optimum_damping, response}`: the filter against the converter, and how far it moves the loop gain; `stable_without` only where the loop is unstable |
//! | `input_filter.margins` | `[{against, margin_db, frequency_hz, converter_ohm, filter_ohm}]`: least distance of the filter's output impedance below each input impedance |
//! | `input_filter.optimum_damping` | `{across, ratio, resistance_ohm, capacitance_f, inductance_h, peak_ohm, peak_hz}` |
//! | `input_filter.response` | `[{frequency_hz, filter_ohm, filter_deg, open_loop_ohm, open_loop_deg, nulled_ohm, nulled_deg, closed_loop_ohm, closed_loop_deg}]` |
//! | `isolated` | `null` unless a regulator with optocoupler closes the loop; `{transfer_ratio, fast_path, fast_path_gain_db, least_crossover_hz, led_current, cathode_current, cathode_voltage, control_voltage_least, control_voltage_greatest, greatest_led_resistor, output_error_v, at_least_ratio, at_greatest_ratio}`: `transfer_ratio` is `[least, nominal, greatest]`, `fast_path` `load`, `bank` or `none`, `least_crossover_hz` what the fast path alone would make, the control voltages what the least ratio reaches downwards and the greatest upwards, `output_error_v` that of the regulator's finite gain |
//! | `isolated.at_least_ratio`, `isolated.at_greatest_ratio` | `{stable, crossover_hz, phase_margin_deg, gain_margin_db, modulus_margin}` of the loop there; also in every row of `conditions`, else `null` |
//! | `digital` | `null` without a difference equation; `{method, exact_at_hz, sample_period_s, computation_s, modulator_delay_s, held, input_range_v, output_range_v, word_length, forward_fraction_bits, feedback_fraction_bits, equation, feedback, forward, lanes, before_rounding, sampled_loop, poles_z}`; `modulator_delay_s` is `null` where the value is `held` for a period |
//! | `digital.feedback`, `digital.forward` | `[{value, exact, code}]`: a1, a2, … and b0, b1, …; value is code / 2^fraction bits, exact the value before rounding |
//! | `digital.lanes` | `[{key, aim_hz, as_built_hz}]` |
//! | `digital.before_rounding` | `{stable, crossover_hz, phase_margin_deg, gain_margin_db}` of the loop with the coefficients before rounding |
//! | `digital.sampled_loop` | `{crossover_hz, phase_margin_deg, gain_margin_db, modulus_margin}` of the loop as it is sampled, all bands folded |
//! | `digital.poles_z` | `[[re, im]]`, closed-loop poles in the z plane |
//! | `load_step` | `{step_a, deviation_v, settling_s}` |
//! | `load_sweep` | with `--load-sweep`, else `null`: per input voltage `[{input_voltage, boundary_load, points}]`; conduction is discontinuous below the boundary |
//! | `load_sweep.points` | `[{load_current, duty, conduction, crossover_hz, phase_margin_deg, gain_margin_db, stable, problem}]`, rising; a point stands on either side of the boundary |
//! | `switched` | with `--switched`, else `null`; the exact switched model: `{stable, stability, oscillation_hz, multipliers, greatest_multiplier, crossovers, phase_crossovers, modulus_margin, sensitivity_peak, averaged_holds_to_hz, averaged_looked_to_hz, averaged_left_by, response, stress, output_ripple_v, output_ripple_capacitive_v, output_ripple_resistive_v, problem}`; crossings as of `loop`, multipliers `[{re, im}]`, the greatest first |
//! | `switched.response` | `[{frequency_hz, plant_db, plant_deg, loop_db, loop_deg, output_impedance_ohm, output_impedance_deg}]`, `null` where a reading is undefined |
//! | `switched.stress` | `[{name, unit, greatest, least, rms, average}]` over one steady period; no RMS value of a voltage |
//! | `requirements` | `[{name, limit, value, met, condition, reason}]`, named by path |
//! | `findings` | `[{severity, where, message, hint}]`; severity is `note`, `notice` or `problem`, `where` a path, a place in the file or an option of the command line, empty for the whole design |
//!
//! # The JSON report of a transient
//!
//! One object. Voltages [V] are the load's, means over a period unless the ripple is said to be in them.
//!
//! | field | meaning |
//! |---|---|
//! | `file`, `status`, `title`, `condition`, `findings` | as in a check; `status` is `done`, `stopped` or `unusable` |
//! | `event` | `start-up`, `load-step`, `line-step`, `reference-step` or `overload` |
//! | `from_s`, `to_s` | what was followed; the event begins at 0 |
//! | `figures` | `{before_v, after_v, deviation_v, deviation_at_s, rebound_v, settling_s, least_v, greatest_v, peak_inductor_a, peak_switch_a, periods, rested_periods, skipped_periods, limits}`; deviation is against the voltage before, at start-up and for a reference step beyond the final one; `least_v` and `greatest_v` hold the ripple; settling counts from the event, for an overload from its end |
//! | `figures.limits` | `[{name, periods}]`: limits that acted |
//! | `prediction` | of the small-signal model, `{deviation_v, deviation_at_s, settling_s}`; `null` for start-up, overload, and a linear loop that is not stable |

mod arguments;
mod check;
mod digital;
mod input_filter;
mod isolated;
mod json;
#[cfg(test)]
mod made_up_tests;
mod sweep;
mod switched;
mod text;
mod transient;

pub use arguments::{CheckRequest, Command, Opening, TransientCommand, Usage, parse};
pub use check::{Outcome, check};
pub use transient::transient;
