//! What a design is asked to meet: limits on margins, crossover, load step and settling, nominal and in the worst condition.
//!
//! Every limit is an optional row of the table; an empty one asks nothing. Usual figures (45° least and 60° wanted, 6 and
//! 10 dB, modulus margin 0.5, right-half-plane zero three to five times the crossover) are common practice, offered as defaults
//! when a row is filled in, never laws.

use crate::finding::Finding;
use crate::quantity::{Bounds, Entry, Unit, Values};

/// The result a requirement puts a limit on.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub enum Asked {
    /// Phase margin at the headline crossover, at least [°].
    PhaseMargin,
    /// Factor by which the gain may rise, at least [dB]. A loop that no rise makes unstable meets any limit.
    GainMargin,
    /// Least distance of the loop gain from −1, at least.
    ModulusMargin,
    /// Crossover frequency, at least [Hz].
    CrossoverLeast,
    /// Crossover frequency, at most [Hz].
    CrossoverGreatest,
    /// Least right-half-plane zero over crossover frequency, at least. A plant without such a zero meets any limit.
    RightHalfPlaneRatio,
    /// Magnitude of the output's deviation after the load step, at most [V].
    LoadStepDeviation,
    /// Time after the load step until the output stays in the settling band, at most [s].
    Settling,
}

/// Where a limit must hold.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub enum Scope {
    /// At nominal input voltage and nominal load.
    Nominal,
    /// In every one of the nine conditions.
    Worst,
}

/// One limit that was asked.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Limit {
    /// What is limited.
    pub asked: Asked,
    /// Where it must hold.
    pub scope: Scope,
    /// The limit itself [unit of its entry].
    pub value: f64,
    /// Its row in the table.
    pub entry: &'static Entry,
}

impl Limit {
    /// Whether the result must not fall below the limit; otherwise it must not rise above it.
    pub fn is_least(&self) -> bool {
        self.asked.is_least()
    }

    /// Whether a result meets the limit. A result that could not be evaluated does not.
    pub fn met_by(&self, result: Option<f64>) -> bool {
        result.is_some_and(|result| if self.is_least() { result >= self.value } else { result <= self.value })
    }
}

impl Asked {
    /// Whether the limit is a least one.
    pub fn is_least(self) -> bool {
        !matches!(self, Asked::CrossoverGreatest | Asked::LoadStepDeviation | Asked::Settling)
    }
}

/// The limits asked of a design, in the order of the table.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Requirements {
    limits: Vec<Limit>,
}

const PHASE_HELP: &str = "Least phase margin at the headline crossover. Common practice: 45° at least, 60° wanted.";
const GAIN_HELP: &str = "Least factor by which the loop gain may rise before the loop oscillates. Common practice: 6 dB at least, 10 dB wanted.";
const MODULUS_HELP: &str =
    "Least distance of the loop gain from −1; its inverse is the peak of the sensitivity. Common practice: 0.5.";
const LEAST_HELP: &str = "Least crossover frequency, for a load step that is caught in time.";
const GREATEST_HELP: &str = "Greatest crossover frequency. Common practice: a fifth of the switching frequency.";
const RATIO_HELP: &str =
    "Least ratio of the lowest right-half-plane zero to the crossover frequency. Common practice: three to five.";
const DEVIATION_HELP: &str = "Greatest deviation of the output after the load step, as a magnitude.";
const SETTLING_HELP: &str = "Longest time after the load step until the output stays within the settling band.";

/// The rows, each with what it limits and where, in form order.
static ROWS: [(Asked, Scope, Entry); 16] = [
    (
        Asked::PhaseMargin,
        Scope::Nominal,
        row("requirement.phase-margin.nominal", "Phase margin, nominal", Unit::Degree, UP_TO_180, 60.0, PHASE_HELP),
    ),
    (
        Asked::PhaseMargin,
        Scope::Worst,
        row("requirement.phase-margin.worst", "Phase margin, worst", Unit::Degree, UP_TO_180, 45.0, PHASE_HELP),
    ),
    (
        Asked::GainMargin,
        Scope::Nominal,
        row("requirement.gain-margin.nominal", "Gain margin, nominal", Unit::Decibel, UP_TO_100, 10.0, GAIN_HELP),
    ),
    (
        Asked::GainMargin,
        Scope::Worst,
        row("requirement.gain-margin.worst", "Gain margin, worst", Unit::Decibel, UP_TO_100, 6.0, GAIN_HELP),
    ),
    (
        Asked::ModulusMargin,
        Scope::Nominal,
        row("requirement.modulus-margin.nominal", "Modulus margin, nominal", Unit::One, UP_TO_1, 0.5, MODULUS_HELP),
    ),
    (
        Asked::ModulusMargin,
        Scope::Worst,
        row("requirement.modulus-margin.worst", "Modulus margin, worst", Unit::One, UP_TO_1, 0.4, MODULUS_HELP),
    ),
    (
        Asked::CrossoverLeast,
        Scope::Nominal,
        row("requirement.crossover.least.nominal", "Least crossover, nominal", Unit::Hertz, POSITIVE, 5e3, LEAST_HELP),
    ),
    (
        Asked::CrossoverLeast,
        Scope::Worst,
        row("requirement.crossover.least.worst", "Least crossover, worst", Unit::Hertz, POSITIVE, 3e3, LEAST_HELP),
    ),
    (
        Asked::CrossoverGreatest,
        Scope::Nominal,
        row(
            "requirement.crossover.greatest.nominal",
            "Greatest crossover, nominal",
            Unit::Hertz,
            POSITIVE,
            50e3,
            GREATEST_HELP,
        ),
    ),
    (
        Asked::CrossoverGreatest,
        Scope::Worst,
        row(
            "requirement.crossover.greatest.worst",
            "Greatest crossover, worst",
            Unit::Hertz,
            POSITIVE,
            60e3,
            GREATEST_HELP,
        ),
    ),
    (
        Asked::RightHalfPlaneRatio,
        Scope::Nominal,
        row(
            "requirement.right-half-plane-ratio.nominal",
            "RHP zero over crossover, nominal",
            Unit::One,
            POSITIVE,
            4.0,
            RATIO_HELP,
        ),
    ),
    (
        Asked::RightHalfPlaneRatio,
        Scope::Worst,
        row(
            "requirement.right-half-plane-ratio.worst",
            "RHP zero over crossover, worst",
            Unit::One,
            POSITIVE,
            3.0,
            RATIO_HELP,
        ),
    ),
    (
        Asked::LoadStepDeviation,
        Scope::Nominal,
        row(
            "requirement.load-step-deviation.nominal",
            "Load-step deviation, nominal",
            Unit::Volt,
            POSITIVE,
            0.5,
            DEVIATION_HELP,
        ),
    ),
    (
        Asked::LoadStepDeviation,
        Scope::Worst,
        row(
            "requirement.load-step-deviation.worst",
            "Load-step deviation, worst",
            Unit::Volt,
            POSITIVE,
            0.6,
            DEVIATION_HELP,
        ),
    ),
    (
        Asked::Settling,
        Scope::Nominal,
        row("requirement.settling.nominal", "Settling time, nominal", Unit::Second, POSITIVE, 1e-3, SETTLING_HELP),
    ),
    (
        Asked::Settling,
        Scope::Worst,
        row("requirement.settling.worst", "Settling time, worst", Unit::Second, POSITIVE, 2e-3, SETTLING_HELP),
    ),
];

const POSITIVE: Bounds = Bounds::Positive;
/// A phase margin lies within half a turn.
const UP_TO_180: Bounds = Bounds::PositiveUpTo(180.0);
/// Beyond this no loop of a converter says anything.
const UP_TO_100: Bounds = Bounds::PositiveUpTo(100.0);
/// |1 + T| is 1 where the loop gain has died out, so its least value cannot be above.
const UP_TO_1: Bounds = Bounds::PositiveUpTo(1.0);

const fn row(
    path: &'static str,
    name: &'static str,
    unit: Unit,
    bounds: Bounds,
    default: f64,
    help: &'static str,
) -> Entry {
    Entry::new(path, name, unit, bounds, default, help).optional()
}

/// The rows of the table, in form order. All are optional.
pub(super) fn entries() -> impl Iterator<Item = &'static Entry> {
    ROWS.iter().map(|(_, _, entry)| entry)
}

impl Requirements {
    /// The limits that are entered.
    ///
    /// # Errors
    /// One problem per pair of crossover limits of which the least is not below the greatest.
    pub fn from_values(values: &Values) -> Result<Self, Vec<Finding>> {
        let limits: Vec<Limit> = ROWS
            .iter()
            .filter_map(|(asked, scope, entry)| {
                let value = values.get(entry.path)?;
                Some(Limit { asked: *asked, scope: *scope, value, entry })
            })
            .collect();
        let requirements = Self { limits };
        let problems: Vec<Finding> =
            [Scope::Nominal, Scope::Worst].into_iter().filter_map(|scope| requirements.empty_band(scope)).collect();
        if problems.is_empty() { Ok(requirements) } else { Err(problems) }
    }

    fn empty_band(&self, scope: Scope) -> Option<Finding> {
        let least = self.get(Asked::CrossoverLeast, scope)?;
        let greatest = self.get(Asked::CrossoverGreatest, scope)?;
        (least.value >= greatest.value).then(|| {
            Finding::problem(
                least.entry.path,
                format!(
                    "The least crossover asked, {}, is not below the greatest, {}.",
                    crate::quantity::print(least.value, Unit::Hertz),
                    crate::quantity::print(greatest.value, Unit::Hertz)
                ),
            )
            .with_hint("lower the least or raise the greatest, or leave one of them empty")
        })
    }

    /// The limit on one result in one scope, if it is asked.
    pub fn get(&self, asked: Asked, scope: Scope) -> Option<&Limit> {
        self.limits.iter().find(|limit| limit.asked == asked && limit.scope == scope)
    }

    /// All limits asked, in the order of the table.
    pub fn iter(&self) -> impl Iterator<Item = &Limit> {
        self.limits.iter()
    }

    /// How many limits are asked.
    pub fn len(&self) -> usize {
        self.limits.len()
    }

    /// Whether nothing is asked.
    pub fn is_empty(&self) -> bool {
        self.limits.is_empty()
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn empty_rows_ask_nothing_and_filled_ones_are_limits() {
        let mut values = Values::new();
        assert!(Requirements::from_values(&values).expect("nothing asked").is_empty());
        values.set("requirement.phase-margin.worst", 45.0).expect("finite");
        values.set("requirement.settling.nominal", 1e-3).expect("finite");
        let asked = Requirements::from_values(&values).expect("two limits");
        assert_eq!(asked.len(), 2);
        let margin = asked.get(Asked::PhaseMargin, Scope::Worst).expect("asked");
        assert!(margin.met_by(Some(45.0)) && !margin.met_by(Some(44.9)) && !margin.met_by(None));
        let settling = asked.get(Asked::Settling, Scope::Nominal).expect("asked");
        assert!(settling.met_by(Some(0.9e-3)) && !settling.met_by(Some(1.1e-3)) && !settling.met_by(None));
    }

    #[test]
    fn an_empty_crossover_band_is_a_problem() {
        let mut values = Values::new();
        values.set("requirement.crossover.least.worst", 10e3).expect("finite");
        values.set("requirement.crossover.greatest.worst", 5e3).expect("finite");
        let problems = Requirements::from_values(&values).expect_err("empty band");
        assert_eq!(problems[0].place, "requirement.crossover.least.worst");
        assert!(problems[0].hint.is_some());
    }
}
