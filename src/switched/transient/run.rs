//! A run of the closed loop from clock to clock: what drives it, and what came of it.

use super::super::{Cancel, Configuration, Progress, SwitchedSystem, inputs};
use super::drive::Signal;
use super::flow::whole;
use super::limiters::{Amplifiers, limiters, sink};
use super::machine::{ConstantPower, Machine, Setup, Stopped};
use super::plant::{Forcing, Limiter, Plant};
use super::samples::Samples;
use super::waveforms::Waveforms;
use nalgebra::DVector;

/// How the load takes its current in time.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Load {
    /// As the system's equations and steady inputs have it.
    AsItStands,
    /// A constant current [A].
    Current(f64),
    /// A constant power.
    Power {
        /// Power [W].
        watts: f64,
        /// Conductance of its tangent in the system's equations [S], negative.
        tangent: f64,
    },
}

/// What drives a run.
#[derive(Clone, Debug)]
pub struct Scenario<'a> {
    /// The amplifiers' limits.
    pub amplifiers: Amplifiers<'a>,
    /// Voltage of the ideal source [V].
    pub input_voltage: Signal,
    /// Reference [V].
    pub reference: Signal,
    /// Current that a sink beside the load takes [A].
    pub sink: Signal,
    /// The load itself.
    pub load: Load,
    /// Voltage that the load is meant for [V]: a sink takes its current down to a tenth of it, constant power down to a half.
    pub load_voltage: f64,
    /// Limit on the sensed current in every period [A].
    pub current_limit: Option<f64>,
    /// The level at or below which a probe asks for no pulse; none where it always asks.
    pub nothing: Option<(usize, f64)>,
    /// First clock [s]; the event begins at 0.
    pub from_s: f64,
    /// The run ends with the period in which this lies [s].
    pub to_s: f64,
    /// States at the first clock, and the configuration before it.
    pub start: (DVector<f64>, Configuration),
    /// Columns of the waveforms.
    pub columns: usize,
    /// Probes recorded, by row.
    pub recorded: Vec<usize>,
    /// Times at which their values are kept one by one [s], rising; for whoever compares.
    pub times_s: Vec<f64>,
}

/// One period of a run.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Cycle {
    /// Mean of the load's voltage [V].
    pub mean_v: f64,
    /// Share of the period in which the switch conducted.
    pub duty: f64,
}

/// What came of a run.
#[derive(Clone, Debug)]
pub struct Run {
    /// The recorded probes over time.
    pub waveforms: Waveforms,
    /// Period by period, from the first clock on.
    pub cycles: Vec<Cycle>,
    /// Least and greatest of the recorded probes since the event began.
    pub extremes: Vec<(f64, f64)>,
    /// What limits acted, and in how many periods; the current limit among them.
    pub limited: Vec<(&'static str, u64)>,
    /// Periods in which the rectifier's current rested.
    pub rested: u64,
    /// Periods without a pulse.
    pub skipped: u64,
    /// Values of the recorded probes at the times asked for.
    pub kept: Vec<Vec<f64>>,
    /// States and configuration at the last clock.
    pub end: (DVector<f64>, Configuration),
    /// Why it ended early; none where it did not.
    pub stopped: Option<Stopped>,
    /// Whether it was cancelled.
    pub cancelled: bool,
}

/// The cancel flag is read once in so many periods.
const READ_EVERY: usize = 200;
/// The waveforms are shown so many times in a run.
const SHOWN: usize = 30;
/// A sink takes its current down to this share of the load's voltage.
pub const SINK_FALLS: f64 = 0.1;
/// A constant power is taken down to this share of the load's voltage.
pub const POWER_FALLS: f64 = 0.5;

/// The machine at its first clock.
pub(super) fn machine(system: &SwitchedSystem, scenario: &Scenario<'_>) -> Machine {
    let count = system.input_names.len();
    let mut constant = system.steady_inputs.clone();
    let mut forcing = Vec::new();
    let mut signals = Vec::new();
    let mut move_input = |name: &str, signal: &Signal| {
        let Some(column) = system.input(name) else { return };
        constant[column] = 0.0;
        if signal.stays() {
            constant[column] = signal.at(scenario.from_s).0;
            return;
        }
        let mut weights = DVector::zeros(count);
        weights[column] = 1.0;
        forcing.push(Forcing { weights });
        signals.push(signal.clone());
    };
    move_input(inputs::INPUT_VOLTAGE, &scenario.input_voltage);
    move_input(inputs::REFERENCE, &scenario.reference);
    let mut all: Vec<Limiter> = Vec::new();
    let mut power = None;
    let mut level = scenario.sink.clone();
    match scenario.load {
        Load::AsItStands => {}
        Load::Current(amperes) => {
            level = level.raised(amperes);
            if let Some(column) = system.input(inputs::LOAD_CURRENT) {
                constant[column] = 0.0;
            }
        }
        Load::Power { watts, tangent } => {
            if let Some(column) = system.input(inputs::LOAD_CURRENT) {
                constant[column] = 0.0;
                let mut weights = DVector::zeros(count);
                weights[column] = 1.0;
                power = Some(ConstantPower {
                    watts,
                    falls_below_v: POWER_FALLS * scenario.load_voltage,
                    tangent,
                    column: forcing.len(),
                    row: 0,
                });
                forcing.push(Forcing { weights });
                signals.push(Signal::constant(0.0));
            }
        }
    }
    let most = level.greatest();
    if most > 0.0
        && let Some(limiter) = sink(system, most / (SINK_FALLS * scenario.load_voltage), forcing.len())
    {
        all.push(limiter);
        forcing.push(Forcing { weights: DVector::zeros(count) });
        signals.push(level);
    } else if most < 0.0 || level.next(f64::MIN) < f64::INFINITY {
        // A release: the sink gives current, whatever the voltage.
        if let Some(column) = system.input(inputs::LOAD_CURRENT) {
            let mut weights = DVector::zeros(count);
            weights[column] = 1.0;
            forcing.push(Forcing { weights });
            signals.push(level);
        }
    }
    all.extend(limiters(system, scenario.amplifiers));
    forcing.push(Forcing { weights: constant });
    signals.push(Signal::constant(1.0));
    let mut recorded = scenario.recorded.clone();
    let mut place = |row: usize| {
        recorded.iter().position(|r| *r == row).unwrap_or_else(|| {
            recorded.push(row);
            recorded.len() - 1
        })
    };
    let power = power.map(|power| ConstantPower { row: place(system.places.stage.load_voltage), ..power });
    let nothing = scenario.nothing.map(|(row, level)| (place(row), level));
    let setup = Setup {
        rule: system.rule.clone(),
        period_s: system.period_s,
        current_limit: scenario.current_limit.map(|limit| (system.places.sensed_current, limit)),
        nothing,
        recorded,
        power,
    };
    let plant = Plant::new(system, &forcing, all);
    Machine::new(
        plant,
        setup,
        signals,
        (scenario.from_s, &scenario.start.0),
        scenario.start.1,
        samples(system, scenario),
    )
}

fn samples(system: &SwitchedSystem, scenario: &Scenario<'_>) -> Samples {
    let shown: Vec<_> = scenario
        .recorded
        .iter()
        .filter_map(|row| system.probes.get(*row))
        .map(|probe| (probe.name.clone(), probe.unit))
        .collect();
    let periods = (scenario.to_s - scenario.from_s) / system.period_s;
    // Some points for each column, but at least at eighths and at most at 32nds of a period.
    let wanted = 3.0 * scenario.columns as f64 / periods.max(1.0);
    let spacing = if wanted > 16.0 {
        1
    } else if wanted > 8.0 {
        2
    } else if wanted > 4.0 {
        4
    } else {
        8
    };
    let waveforms = Waveforms::new(&shown, scenario.from_s, scenario.to_s, scenario.columns);
    // Where a column holds many periods, within every third; an odd number meets both of a pair that differs.
    let every = if wanted < 0.5 { 3 } else { 1 };
    Samples::new(waveforms, (spacing, every), scenario.times_s.clone())
}

/// Runs the closed loop.
pub fn simulate(
    system: &SwitchedSystem,
    scenario: &Scenario<'_>,
    cancel: &Cancel,
    progress: &Progress,
    stream: &mut dyn FnMut(&Waveforms),
) -> Run {
    let mut machine = machine(system, scenario);
    let total = whole(((scenario.to_s - scenario.from_s) / system.period_s).round()).max(1);
    let shown_every = (total / SHOWN).max(1);
    let mut cycles = Vec::with_capacity(total);
    let (mut stopped, mut cancelled, mut begun) = (None, false, false);
    let (mut rested, mut skipped, mut current_limited) = (0, 0, 0);
    for k in 0..total {
        if k % READ_EVERY == 0 {
            progress.set(k as f64 / total as f64);
            if cancel.is_cancelled() {
                cancelled = true;
                break;
            }
        }
        if k > 0 && k % shown_every == 0 {
            stream(&machine.samples.waveforms);
        }
        if !begun && machine.time_s() > -0.5 * system.period_s {
            begun = true;
            machine.samples.forget();
        }
        match machine.period() {
            Ok(period) => {
                rested += u64::from(period.rested);
                skipped += u64::from(period.duty <= 0.0);
                current_limited += u64::from(period.current_limited);
                cycles.push(Cycle { mean_v: period.mean_v, duty: period.duty });
            }
            Err(why) => {
                stopped = Some(why);
                break;
            }
        }
    }
    if !cancelled {
        progress.set(1.0);
    }
    let limited = machine.limited(current_limited);
    let end = machine.state();
    let samples = machine.samples;
    let extremes = samples.least.iter().copied().zip(samples.greatest.iter().copied()).collect();
    Run {
        waveforms: samples.waveforms,
        cycles,
        extremes,
        limited,
        rested,
        skipped,
        kept: samples.kept,
        end,
        stopped,
        cancelled,
    }
}
