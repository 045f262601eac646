//! Eliminates a netlist's Kirchhoff equations once, and replays that elimination for any values.
//!
//! *Method*: the unknowns are the node voltages and the current of every part but inductors and current sources (a
//! sparse tableau: Hachtel, Brayton & Gustavson 1971), so zero resistance is legal. Capacitors stand as voltage
//! sources of their state, inductors as current sources of theirs, an open switch as the row i = 0. Pivots of exactly
//! ±1 are taken first: while they last the arithmetic is the integer arithmetic of the graph, so loops of capacitors
//! and cut-sets of inductors come out as exactly empty rows. Those rows are constraints on states and inputs.
//!
//! *Valid for* replay: any values with the same set of zeros; where the zeros differ the structure is eliminated anew.

use super::netlist::{Kind, Netlist, Node, PartId};
use std::fmt;

/// Why a netlist has no state equations.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum CircuitError {
    /// Sources that contradict each other: a loop of voltage sources, or a node fed by current sources alone.
    SourcesClash {
        /// Names of the parts involved.
        parts: Vec<String>,
    },
    /// A part of the circuit that nothing determines, such as a node without a path to ground.
    Floating {
        /// Names of nodes or parts left undetermined.
        names: Vec<String>,
    },
    /// A wanted output that would follow the rate of change of an input.
    Improper {
        /// Names of the outputs.
        outputs: Vec<String>,
    },
    /// Two inductors coupled by ±1 or more, a storage part of zero, or values that overflow.
    Degenerate {
        /// Names of the parts involved.
        parts: Vec<String>,
    },
}

impl fmt::Display for CircuitError {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            CircuitError::SourcesClash { parts } => {
                write!(
                    f,
                    "sources contradict each other (a loop of voltage sources or a node fed by current sources alone): {}",
                    parts.join(", ")
                )
            }
            CircuitError::Floating { names } => write!(f, "nothing determines {}", names.join(", ")),
            CircuitError::Improper { outputs } => {
                write!(f, "{} would follow the rate of change of an input", outputs.join(", "))
            }
            CircuitError::Degenerate { parts } => {
                write!(f, "storage parts without a usable value: {}", parts.join(", "))
            }
        }
    }
}

impl std::error::Error for CircuitError {}

/// A matrix entry before values are known: `sign`, times a slot's value if there is one.
#[derive(Clone, Copy, Debug)]
struct Coefficient {
    place: usize,
    sign: f64,
    slot: Option<usize>,
}

/// Which unknown a column stands for.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) enum Unknown {
    NodeVoltage(Node),
    PartCurrent(PartId),
}

/// One pivot step: normalise the pivot row, then clear the pivot's column from the other rows.
#[derive(Clone, Debug)]
struct PivotStep {
    pivot: usize,
    /// Entries of the pivot row, the pivot excluded.
    row: Vec<usize>,
    /// For each row to clear: its entry in the pivot's column and the targets matching `row`.
    clear: Vec<(usize, Vec<usize>)>,
}

/// A netlist's structure for one set of closed switches with its elimination worked out.
#[derive(Clone, Debug)]
pub struct Compiled {
    pub(super) netlist: Netlist,
    pub(super) closed: Vec<bool>,
    pub(super) unknowns: Vec<Unknown>,
    width: usize,
    coefficients: Vec<Coefficient>,
    steps: Vec<PivotStep>,
    /// Row that solves each unknown, none for a free one.
    pub(super) row_of_unknown: Vec<Option<usize>>,
    pub(super) leftover_rows: Vec<usize>,
    pub(super) free_unknowns: Vec<usize>,
    zero_slots: Vec<bool>,
    reference: Vec<f64>,
    row_names: Vec<String>,
}

/// Below this share of the magnitudes it was summed from, an entry counts as cancelled to zero.
const CANCELLED: f64 = 1e-12;
/// A value that moved further than this factor from the one the pivots were chosen at asks for new pivots.
const PIVOT_RANGE: f64 = 1e3;

struct Tableau {
    rows: usize,
    width: usize,
    unknowns: Vec<Unknown>,
    column_of_part: Vec<Option<usize>>,
    coefficients: Vec<Coefficient>,
    row_names: Vec<String>,
    states_at: usize,
    inputs_at: usize,
}

impl Tableau {
    fn new(netlist: &Netlist, closed: &[bool]) -> Self {
        let mut unknowns: Vec<Unknown> = (1..netlist.nodes.len()).map(|n| Unknown::NodeVoltage(Node(n))).collect();
        let mut column_of_part = vec![None; netlist.parts.len()];
        for (k, part) in netlist.parts.iter().enumerate() {
            let has_current = !matches!(
                part.kind,
                Kind::Inductor { .. }
                    | Kind::CurrentSource { .. }
                    | Kind::ControlledCurrent { .. }
                    | Kind::CopiedCurrent { .. }
            );
            if has_current {
                column_of_part[k] = Some(unknowns.len());
                unknowns.push(Unknown::PartCurrent(PartId(k)));
            }
        }
        let rows = unknowns.len();
        let states_at = rows;
        let inputs_at = rows + netlist.states.len();
        let width = inputs_at + netlist.inputs.len();
        let mut row_names: Vec<String> = netlist.nodes[1..].to_vec();
        row_names.extend(
            netlist.parts.iter().zip(&column_of_part).filter(|(_, c)| c.is_some()).map(|(p, _)| p.name.clone()),
        );
        let mut tableau = Tableau {
            rows,
            width,
            unknowns,
            column_of_part,
            coefficients: Vec::new(),
            row_names,
            states_at,
            inputs_at,
        };
        for (k, part) in netlist.parts.iter().enumerate() {
            tableau.place_part(k, part, closed[k]);
        }
        tableau
    }

    fn put(&mut self, row: usize, column: usize, sign: f64, slot: Option<usize>) {
        self.coefficients.push(Coefficient { place: row * self.width + column, sign, slot });
    }

    /// Adds a coefficient of a node voltage to a row; the ground's voltage is zero.
    fn put_node(&mut self, row: usize, node: Node, sign: f64, slot: Option<usize>) {
        if node.0 > 0 {
            self.put(row, node.0 - 1, sign, slot);
        }
    }

    /// Adds a current in `column` flowing from one node to another to their Kirchhoff rows.
    fn put_current(&mut self, from: Node, to: Node, column: usize, sign: f64) {
        if from.0 > 0 {
            self.put(from.0 - 1, column, sign, None);
        }
        if to.0 > 0 {
            self.put(to.0 - 1, column, -sign, None);
        }
    }

    /// Known quantities stand on the right-hand side, hence the minus signs in the Kirchhoff rows.
    fn place_part(&mut self, k: usize, part: &super::netlist::Part, closed: bool) {
        let (from, to) = (part.from, part.to);
        match part.kind {
            Kind::Inductor { state, .. } => {
                let column = self.states_at + state;
                self.put_current(from, to, column, -1.0);
            }
            Kind::CurrentSource { input } => {
                let column = self.inputs_at + input.0;
                self.put_current(from, to, column, -1.0);
            }
            Kind::ControlledCurrent { siemens, plus, minus } => {
                for (node, sign) in [(from, 1.0), (to, -1.0)] {
                    if node.0 > 0 {
                        self.put_node(node.0 - 1, plus, sign, Some(siemens.0));
                        self.put_node(node.0 - 1, minus, -sign, Some(siemens.0));
                    }
                }
            }
            Kind::CopiedCurrent { gain, of } => {
                if let Some(column) = self.column_of_part[of.0] {
                    for (node, sign) in [(from, 1.0), (to, -1.0)] {
                        if node.0 > 0 {
                            self.put(node.0 - 1, column, sign, Some(gain.0));
                        }
                    }
                }
            }
            Kind::Transformer { ratio, second } => {
                if let Some(column) = self.column_of_part[k] {
                    self.place_transformer(column, (from, to), second, ratio.0);
                }
            }
            _ => {
                if let Some(column) = self.column_of_part[k] {
                    self.put_current(from, to, column, 1.0);
                    self.place_branch_row(column, part, closed);
                }
            }
        }
    }

    /// v(second) = ratio · v(first); the unknown is the second winding's current, the first carries −ratio times it.
    fn place_transformer(&mut self, column: usize, first: (Node, Node), second: (Node, Node), ratio: usize) {
        self.put_current(second.0, second.1, column, 1.0);
        self.put_first_winding(first, column, ratio);
        let row = column;
        self.put_node(row, second.0, 1.0, None);
        self.put_node(row, second.1, -1.0, None);
        self.put_node(row, first.0, -1.0, Some(ratio));
        self.put_node(row, first.1, 1.0, Some(ratio));
    }

    fn put_first_winding(&mut self, first: (Node, Node), column: usize, ratio: usize) {
        if first.0.0 > 0 {
            self.put(first.0.0 - 1, column, -1.0, Some(ratio));
        }
        if first.1.0 > 0 {
            self.put(first.1.0 - 1, column, 1.0, Some(ratio));
        }
    }

    /// The branch row of a part that has a current unknown; it stands at the row of that unknown's number.
    fn place_branch_row(&mut self, column: usize, part: &super::netlist::Part, closed: bool) {
        let row = column;
        if matches!(part.kind, Kind::Switch { .. } | Kind::Diode { .. }) && !closed {
            self.put(row, column, 1.0, None);
            return;
        }
        self.put_node(row, part.from, 1.0, None);
        self.put_node(row, part.to, -1.0, None);
        match part.kind {
            Kind::Resistor { ohms } | Kind::Switch { ohms } => self.put(row, column, -1.0, Some(ohms.0)),
            Kind::Diode { ohms, drop } => {
                self.put(row, column, -1.0, Some(ohms.0));
                self.put(row, self.inputs_at + drop.0, 1.0, None);
            }
            Kind::Capacitor { state, .. } => self.put(row, self.states_at + state, 1.0, None),
            Kind::VoltageSource { input } => self.put(row, self.inputs_at + input.0, 1.0, None),
            Kind::ControlledVoltage { gain, plus, minus } => {
                self.put_node(row, plus, -1.0, Some(gain.0));
                self.put_node(row, minus, 1.0, Some(gain.0));
            }
            Kind::Transformer { .. }
            | Kind::Inductor { .. }
            | Kind::CurrentSource { .. }
            | Kind::ControlledCurrent { .. }
            | Kind::CopiedCurrent { .. } => {}
        }
    }
}

/// The working state of one elimination.
struct Work {
    value: Vec<f64>,
    /// Sum of magnitudes each entry was formed from, to tell a cancelled entry from a small one.
    magnitude: Vec<f64>,
    present: Vec<bool>,
    /// Row combinations, to name the parts behind a leftover row.
    combination: Vec<f64>,
    row_used: Vec<bool>,
    column_used: Vec<bool>,
}

impl Work {
    fn new(tableau: &Tableau, values: &[f64]) -> Self {
        let size = tableau.rows * tableau.width;
        let mut work = Work {
            value: vec![0.0; size],
            magnitude: vec![0.0; size],
            present: vec![false; size],
            combination: vec![0.0; tableau.rows * tableau.rows],
            row_used: vec![false; tableau.rows],
            column_used: vec![false; tableau.rows],
        };
        for c in &tableau.coefficients {
            let amount = c.sign * c.slot.map_or(1.0, |slot| values[slot]);
            work.value[c.place] += amount;
            work.magnitude[c.place] += amount.abs();
            work.present[c.place] = true;
        }
        for r in 0..tableau.rows {
            work.combination[r * tableau.rows + r] = 1.0;
        }
        work
    }

    fn alive(&self, place: usize) -> bool {
        self.present[place] && self.value[place].abs() > CANCELLED * self.magnitude[place]
    }

    /// The next pivot: an entry of exactly ±1 in the emptiest row and column, else the largest entry.
    fn choose(&self, rows: usize, width: usize) -> Option<(usize, usize)> {
        let mut candidates: Vec<(usize, usize, f64)> = Vec::with_capacity(4 * rows);
        let (mut row_count, mut column_count) = (vec![0_usize; rows], vec![0_usize; rows]);
        for r in (0..rows).filter(|r| !self.row_used[*r]) {
            for c in (0..rows).filter(|c| !self.column_used[*c]) {
                let place = r * width + c;
                if self.alive(place) {
                    candidates.push((r, c, self.value[place].abs()));
                    row_count[r] += 1;
                    column_count[c] += 1;
                }
            }
        }
        #[expect(clippy::float_cmp, reason = "exactly ±1 is the point: such pivots keep the arithmetic exact")]
        let units = candidates.iter().filter(|(_, _, size)| *size == 1.0);
        let emptiest = units.min_by_key(|(r, c, _)| (row_count[*r] - 1) * (column_count[*c] - 1));
        let largest = || candidates.iter().max_by(|a, b| a.2.total_cmp(&b.2));
        emptiest.or_else(largest).map(|(r, c, _)| (*r, *c))
    }

    /// Clears column `c` from all rows but `r`, recording what was done.
    fn eliminate(&mut self, r: usize, c: usize, rows: usize, width: usize) -> PivotStep {
        let pivot = r * width + c;
        let row: Vec<usize> =
            (0..width).filter(|j| *j != c && self.present[r * width + j]).map(|j| r * width + j).collect();
        let scale = self.value[pivot].recip();
        for &place in &row {
            self.value[place] *= scale;
            self.magnitude[place] *= scale.abs();
        }
        for k in 0..rows {
            self.combination[r * rows + k] *= scale;
        }
        self.value[pivot] = 1.0;
        self.magnitude[pivot] = 1.0;
        let mut clear = Vec::new();
        for i in (0..rows).filter(|i| *i != r) {
            let factor_at = i * width + c;
            if !self.present[factor_at] {
                continue;
            }
            let factor = self.value[factor_at];
            let targets: Vec<usize> = row.iter().map(|place| place - r * width + i * width).collect();
            for (&target, &source) in targets.iter().zip(&row) {
                self.value[target] -= factor * self.value[source];
                self.magnitude[target] += (factor * self.magnitude[source]).abs();
                self.present[target] = true;
            }
            for k in 0..rows {
                self.combination[i * rows + k] -= factor * self.combination[r * rows + k];
            }
            self.value[factor_at] = 0.0;
            self.magnitude[factor_at] = 0.0;
            self.present[factor_at] = false;
            clear.push((factor_at, targets));
        }
        self.row_used[r] = true;
        self.column_used[c] = true;
        PivotStep { pivot, row, clear }
    }
}

/// The solved tableau at one set of values: each solved unknown as a combination of free unknowns, states, inputs.
#[derive(Debug)]
pub(super) struct Solved {
    value: Vec<f64>,
    width: usize,
}

impl Solved {
    /// Entry of the eliminated tableau.
    pub(super) fn at(&self, row: usize, column: usize) -> f64 {
        self.value[row * self.width + column]
    }
}

impl Compiled {
    /// Works out the elimination of `netlist` for the given closed switches and diodes.
    ///
    /// `is_closed` is asked for every switch and diode by name; `values` are the part values at which pivots are
    /// chosen, in slot order, in SI units.
    ///
    /// # Errors
    /// When sources contradict each other or a part of the circuit is undetermined; the error names the parts.
    pub fn new(netlist: &Netlist, is_closed: impl Fn(&str) -> bool, values: &[f64]) -> Result<Self, CircuitError> {
        let closed: Vec<bool> = netlist.parts.iter().map(|part| is_closed(&part.name)).collect();
        Self::with_closed(netlist, closed, values)
    }

    fn with_closed(netlist: &Netlist, closed: Vec<bool>, values: &[f64]) -> Result<Self, CircuitError> {
        let tableau = Tableau::new(netlist, &closed);
        let (rows, width) = (tableau.rows, tableau.width);
        let mut work = Work::new(&tableau, values);
        let mut steps = Vec::with_capacity(rows);
        let mut row_of_unknown = vec![None; rows];
        while let Some((r, c)) = work.choose(rows, width) {
            row_of_unknown[c] = Some(r);
            steps.push(work.eliminate(r, c, rows, width));
        }
        let leftover_rows: Vec<usize> = (0..rows).filter(|r| !work.row_used[*r]).collect();
        let free_unknowns: Vec<usize> = (0..rows).filter(|c| !work.column_used[*c]).collect();
        let compiled = Compiled {
            netlist: netlist.clone(),
            closed,
            unknowns: tableau.unknowns,
            width,
            coefficients: tableau.coefficients,
            steps,
            row_of_unknown,
            leftover_rows,
            free_unknowns,
            zero_slots: values.iter().map(|v| *v == 0.0).collect(),
            reference: values.to_vec(),
            row_names: tableau.row_names,
        };
        compiled.check_leftovers(&work, rows)?;
        Ok(compiled)
    }

    /// A leftover row must constrain a state: without any term something floats, with inputs alone sources clash.
    fn check_leftovers(&self, work: &Work, rows: usize) -> Result<(), CircuitError> {
        let state_columns = rows..rows + self.netlist.states.len();
        let input_columns = rows + self.netlist.states.len()..self.width;
        for &r in &self.leftover_rows {
            let names = || {
                let mut names: Vec<String> = (0..rows)
                    .filter(|k| work.combination[r * rows + k].abs() > CANCELLED)
                    .map(|k| self.row_names[k].clone())
                    .collect();
                names.dedup();
                names
            };
            if state_columns.clone().any(|c| work.alive(r * self.width + c)) {
                continue;
            }
            if input_columns.clone().any(|c| work.alive(r * self.width + c)) {
                return Err(CircuitError::SourcesClash { parts: names() });
            }
            return Err(CircuitError::Floating { names: names() });
        }
        Ok(())
    }

    /// Replays the elimination at values the recorded pivots fit.
    pub(super) fn solve(&self, values: &[f64]) -> Solved {
        let mut value = vec![0.0; self.unknowns.len() * self.width];
        for c in &self.coefficients {
            value[c.place] += c.sign * c.slot.map_or(1.0, |slot| values[slot]);
        }
        for step in &self.steps {
            let scale = value[step.pivot].recip();
            for &place in &step.row {
                value[place] *= scale;
            }
            for (factor_at, targets) in &step.clear {
                let factor = value[*factor_at];
                if factor != 0.0 {
                    for (&target, &source) in targets.iter().zip(&step.row) {
                        value[target] -= factor * value[source];
                    }
                }
            }
        }
        Solved { value, width: self.width }
    }

    /// The same structure with pivots chosen at `values`.
    ///
    /// # Errors
    /// As [`Compiled::new`].
    pub fn recompiled(&self, values: &[f64]) -> Result<Self, CircuitError> {
        Self::with_closed(&self.netlist, self.closed.clone(), values)
    }

    /// Whether the recorded pivots fit these values.
    pub fn fits(&self, values: &[f64]) -> bool {
        values.iter().zip(&self.reference).zip(&self.zero_slots).all(|((v, reference), zero)| {
            if *zero { *v == 0.0 } else { (v / reference).abs() < PIVOT_RANGE && (reference / v).abs() < PIVOT_RANGE }
        })
    }
}
