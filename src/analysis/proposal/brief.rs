//! What a new design is asked for: a topology and a few numbers, all rows of the table of entries but one.

use crate::converter::{self, Reach};
use crate::design;
use crate::finding::Finding;
use crate::quantity::{Bounds, Entry, Unit, Values, print};

/// Which parts of the stage are known.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub enum Parts {
    /// None: inductor and output bank are proposed.
    #[default]
    Proposed,
    /// Inductor and output bank are given.
    Known,
}

/// What the new converter has to do.
#[derive(Clone, Debug, PartialEq)]
pub struct Brief {
    /// Key of the topology.
    pub topology: String,
    /// Which parts of the stage are known.
    pub parts: Parts,
    /// The numbers, by path of their row.
    pub values: Values,
}

/// Allowed output ripple: the one row that no design has.
static RIPPLE: Entry = Entry::new(
    "proposal.ripple",
    "Output ripple, peak to peak",
    Unit::Volt,
    Bounds::Positive,
    0.24,
    "Ripple of the output voltage at the switching frequency that is allowed at full load. It sizes the output bank and its ESR.",
);

/// Rows that are asked in any case.
const ASKED: [&str; 8] = [
    "stage.input.least",
    "stage.input.greatest",
    "stage.output.voltage",
    "stage.load.least",
    "stage.load.greatest",
    "stage.switching-frequency",
    "event.load-step.change",
    "requirement.load-step-deviation.worst",
];
/// Rows that are asked where the parts are known.
const KNOWN: [&str; 2] = ["stage.inductor.inductance", "stage.bank.1.capacitance"];

impl Brief {
    /// A brief on a topology with usual numbers.
    pub fn usual(topology: &str, parts: Parts) -> Self {
        let mut brief = Brief { topology: topology.to_owned(), parts, values: Values::new() };
        for entry in Brief::rows(parts) {
            // Defaults are finite.
            let _ = brief.values.set(entry.path, entry.default);
        }
        if let Some(volts) = Brief::usual_output(topology) {
            let _ = brief.values.set("stage.output.voltage", volts);
            let _ = brief.values.set("requirement.load-step-deviation.worst", 0.03 * volts);
            let _ = brief.values.set(RIPPLE.path, 0.01 * volts);
        }
        brief
    }

    /// An output voltage that suits a topology at the usual input [V].
    pub fn usual_output(topology: &str) -> Option<f64> {
        let topology = converter::find(topology)?;
        Some(match topology.reach {
            Reach::BelowInput => 5.0,
            Reach::AboveInput => 24.0,
            // Well above the input where a stage would change its region.
            Reach::Any if topology.switching.len() > 1 => 24.0,
            Reach::Any => 12.0,
        })
    }

    /// The rows that are asked, in form order.
    pub fn rows(parts: Parts) -> Vec<&'static Entry> {
        let stage = ASKED.iter().filter_map(|path| design::entry(path));
        match parts {
            Parts::Proposed => stage.chain([&RIPPLE]).collect(),
            Parts::Known => stage.chain(KNOWN.iter().filter_map(|path| design::entry(path))).collect(),
        }
    }

    /// A number that was checked.
    pub(super) fn get(&self, path: &str) -> f64 {
        self.values.get(path).unwrap_or(f64::NAN)
    }

    /// Allowed output ripple, peak to peak [V]; none where the parts are known.
    pub(super) fn ripple(&self) -> Option<f64> {
        (self.parts == Parts::Proposed).then(|| self.get(RIPPLE.path))
    }

    /// Size of the load step [A].
    pub(super) fn load_step(&self) -> f64 {
        self.get("event.load-step.change").abs()
    }

    /// Allowed deviation after the load step [V].
    pub(super) fn deviation(&self) -> f64 {
        self.get("requirement.load-step-deviation.worst")
    }

    /// What is wrong, each problem at its row.
    pub(super) fn check(&self) -> Result<(), Vec<Finding>> {
        let mut problems: Vec<Finding> =
            Brief::rows(self.parts).into_iter().filter_map(|row| self.row_problem(row)).collect();
        if converter::find(&self.topology).is_none() {
            problems.push(Finding::problem("stage.topology", "There is no such topology."));
        }
        if problems.is_empty() {
            problems.extend(self.order_problems());
        }
        if problems.is_empty() {
            problems.extend(self.size_problems());
        }
        if problems.is_empty() { Ok(()) } else { Err(problems) }
    }

    fn row_problem(&self, row: &'static Entry) -> Option<Finding> {
        let Some(value) = self.values.get(row.path) else {
            let hint = format!("{} A usual value is {}", row.help, print(row.default, row.unit));
            return Some(Finding::problem(row.path, format!("{}: nothing is entered.", row.name)).with_hint(hint));
        };
        let reason = row.check(value).err()?;
        Some(Finding::problem(row.path, format!("{} {reason}.", row.name)).with_hint(row.help))
    }

    fn order_problems(&self) -> Vec<Finding> {
        let pairs = [("stage.input.least", "stage.input.greatest"), ("stage.load.least", "stage.load.greatest")];
        let falling = |(low, high): (&'static str, &'static str)| {
            let (least, greatest) = (self.get(low), self.get(high));
            let (low, high) = (design::entry(low)?, design::entry(high)?);
            (least > greatest).then(|| {
                let message = format!(
                    "{}, {}, must not be above {}, {}.",
                    low.name,
                    print(least, low.unit),
                    high.name,
                    print(greatest, high.unit)
                );
                Finding::problem(low.path, message)
            })
        };
        pairs.into_iter().filter_map(falling).collect()
    }

    /// Numbers that are usable each and make no sense together.
    fn size_problems(&self) -> Vec<Finding> {
        let mut problems = Vec::new();
        if self.load_step() == 0.0 {
            let message = "The load step must not be 0 A: the output capacitance follows from it.";
            let hint = "a third to a half of the greatest load is a usual step";
            problems.push(Finding::problem("event.load-step.change", message).with_hint(hint));
        }
        let output = self.get("stage.output.voltage");
        let rows =
            [("requirement.load-step-deviation.worst", self.deviation()), (RIPPLE.path, self.ripple().unwrap_or(0.0))];
        for (path, volts) in rows {
            if volts >= output {
                let message = format!("{} is no less than the output voltage itself.", print(volts, Unit::Volt));
                problems.push(Finding::problem(path, message).with_hint("a few per cent of the output are usual"));
            }
        }
        problems
    }
}
