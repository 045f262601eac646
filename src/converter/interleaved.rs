//! Interleaved phases with every one of them drawn, for whoever follows their switches.
//!
//! *Method*: driven alike, the phases repeat their pattern after a share T/N of the period with their parts renamed. Phase k is the one
//! whose switch closed k shares ago. With m the whole part of N·D, the switches of phases 0 to m conduct as a share begins and that of
//! phase m opens within it, so that every share knows two sets of closed switches. *Valid* where no rectifier's current comes to rest.

use super::drawing::{Options, StageDrawing};
use super::drawn::kept_names;
use super::magnetics::INDUCTANCE;
use super::phases::{PHASES, divisor};
use super::rows::{Rows, SwitchRow};
use super::signals::{INPUT_VOLTAGE, LOAD_CURRENT};
use super::stage::{Stage, StageCondition, circuit_finding};
use super::switching::{DIODE_DROP, SwitchingEquations, public_rows};
use super::topology::Topology;
use crate::circuit::{Compiled, Netlist, Node, OutputId, StateEquations};
use crate::finding::Finding;
use nalgebra::{DMatrix, RowDVector};

/// How the phases of a period's share hang together.
#[derive(Clone, Debug, PartialEq)]
pub struct Interleaved {
    /// How many there are.
    pub phases: usize,
    /// How many conduct all the time: the phase of this place opens within the share.
    pub always: usize,
    /// State that is the current of each phase.
    pub states: Vec<usize>,
    /// What current mode senses of each phase, from the states [A].
    pub sensed: Vec<RowDVector<f64>>,
    /// The rectifier's current of the phase that has least of it as the share ends, from the states [A].
    pub last: RowDVector<f64>,
    /// Rows of `C` and `D` that answer alike for each phase, by phase.
    pub turns: Vec<Vec<usize>>,
    /// Row of the sum of the phases' inductor currents [A].
    pub together: usize,
}

/// What is drawn of one phase.
#[derive(Clone, Debug)]
struct Phase {
    inductor: String,
    switch: String,
    rectifier: String,
    /// Rows of its inductor's current; of current, voltage and free end of its switch; of current and voltage of its rectifier.
    rows: [usize; 6],
}

/// The netlist of a stage in which every phase is drawn.
#[derive(Clone, Debug)]
pub(super) struct PhasesDrawn {
    netlist: Netlist,
    rows: Rows,
    switch: SwitchRow,
    rectifier: SwitchRow,
    phases: Vec<Phase>,
}

/// A share of the period within which a switch opens nearer to its edges than this part of it is the edge.
const AT_AN_EDGE: f64 = 1e-4;

impl PhasesDrawn {
    /// Draws a topology with so many phases; none for one, or where it has not one switch, rectifier and inductor on a node of their own.
    pub(super) fn new(topology: &Topology, options: Options, phases: f64) -> Option<Self> {
        if phases <= 1.0 {
            return None;
        }
        let mut drawing = StageDrawing::new(options);
        (topology.draw)(&mut drawing);
        let ([switch, rectifier], [winding]) = (drawing.switches.as_slice(), drawing.windings.as_slice()) else {
            return None;
        };
        let (switch, rectifier, winding) = (*switch, *rectifier, *winding);
        let of_rectifier = [rectifier.ends.0, rectifier.ends.1];
        let shared = [switch.ends.0, switch.ends.1].into_iter().find(|node| of_rectifier.contains(node))?;
        let mut drawn = Vec::new();
        let n = &mut drawing.netlist;
        // A whole number of few phases.
        #[expect(clippy::cast_possible_truncation, clippy::cast_sign_loss, reason = "checked to be a count")]
        for k in 1..phases as usize {
            let (own, inner) = (n.node("switch node"), n.node(winding.loss));
            let moved = |node: Node| if node == shared { own } else { node };
            let ends = |(from, to): (Node, Node)| (moved(from), moved(to));
            let named = |name: &str| format!("{name} {}", k + 1);
            let (inductor, closing, rectifying) = (named(winding.name), named(switch.name), named(rectifier.name));
            let (wound, switched, rectified) = (ends(winding.ends), ends(switch.ends), ends(rectifier.ends));
            let henries = n.slot(INDUCTANCE);
            let coil = n.inductor(&inductor, wound.0, inner, henries);
            n.resistor(winding.loss, inner, wound.1, winding.ohms);
            let first = n.switch(&closing, switched.0, switched.1, switch.ohms);
            // The ends of a rectifier are told cathode first.
            let second = if rectifier.diode {
                n.diode(&rectifying, rectified.1, rectified.0, rectifier.ohms, drawing.drop)
            } else {
                n.switch(&rectifying, rectified.1, rectified.0, rectifier.ohms)
            };
            drawn.push((inductor, closing, rectifying, [coil, first, second], [switched, rectified], own));
        }
        let (mut netlist, rows) = drawing.finish()?;
        let (switch, rectifier) = (rows.switch(switch.name)?, rows.switch(rectifier.name)?);
        let own =
            [rows.inductors.first()?.row, switch.row, switch.voltage, switch.node, rectifier.row, rectifier.voltage];
        let named = |name: &str| name.to_owned();
        let first = Phase {
            inductor: named(winding.name),
            switch: named(switch.name),
            rectifier: named(rectifier.name),
            rows: own,
        };
        let mut all = vec![first];
        let ground = netlist.ground();
        for (inductor, switch, rectifier, [coil, closing, rectifying], [switched, rectified], node) in drawn {
            let rows = [
                netlist.current_output(&inductor, coil),
                netlist.current_output(&switch, closing),
                netlist.voltage_output(&switch, switched.0, switched.1),
                netlist.voltage_output(&switch, node, ground),
                netlist.current_output(&rectifier, rectifying),
                netlist.voltage_output(&rectifier, rectified.0, rectified.1),
            ];
            all.push(Phase { inductor, switch, rectifier, rows: rows.map(OutputId::index) });
        }
        Some(PhasesDrawn { netlist, rows, switch, rectifier, phases: all })
    }

    /// The equations while the switches of the first phases conduct and the rectifiers of the others, over all states.
    fn equations(&self, conducting: usize, values: &[f64]) -> Result<StateEquations, Finding> {
        let closed = |part: &str| {
            self.phases.iter().enumerate().any(|(k, phase)| {
                let conducts = k < conducting;
                (conducts && part == phase.switch) || (!conducts && part == phase.rectifier)
            })
        };
        let compiled = Compiled::new(&self.netlist, closed, values).map_err(|e| circuit_finding(&e))?;
        let mut equations = compiled.equations(values).map_err(|e| circuit_finding(&e))?;
        // The sum of the inductors' currents is one row more.
        let below = equations.c.nrows();
        let sum = |m: &DMatrix<f64>| {
            let mut more = m.clone().insert_row(below, 0.0);
            for phase in &self.phases {
                let row = m.row(phase.rows[0]).into_owned();
                let mut total = more.row_mut(below);
                total += row;
            }
            more
        };
        (equations.c, equations.d) = (sum(&equations.c), sum(&equations.d));
        Ok(equations)
    }
}

impl Stage {
    /// The equations of a share of the period at a condition, every phase drawn.
    ///
    /// # Errors
    /// A finding for discontinuous conduction, for a switch that opens as another closes, and as netlist extraction.
    pub(super) fn interleaved(
        &self,
        drawn: &PhasesDrawn,
        condition: &StageCondition,
    ) -> Result<SwitchingEquations, Finding> {
        let solution =
            self.solve(condition).ok().ok_or_else(|| not_followed("no duty ratio gives the wanted output"))?;
        if solution.pulse.is_some() {
            return Err(not_followed("their currents come to rest here, and that is not followed phase by phase"));
        }
        let count = drawn.phases.len();
        let conducting = solution.duty * self.phases;
        let within = conducting.fract();
        if !(AT_AN_EDGE..=1.0 - AT_AN_EDGE).contains(&within) {
            return Err(not_followed("a switch opens just as that of another phase closes"));
        }
        #[expect(clippy::cast_possible_truncation, clippy::cast_sign_loss, reason = "a duty ratio of a few phases")]
        let always = (conducting as usize).min(count - 1);
        let loaded = self.loaded(condition);
        let value = |name: &String| match name.as_str() {
            "load resistance" => loaded.ohms,
            name => self.slot_named(name).unwrap_or(0.0) * divisor(name, self.phases),
        };
        let values: Vec<f64> = drawn.netlist.slot_names().iter().map(value).collect();
        let (before, after) = (drawn.equations(always + 1, &values)?, drawn.equations(always, &values)?);
        let freewheeling = after.over_states_of(&before);
        let (conducting, basis) = before.independent();
        let all: Vec<String> = drawn.netlist.state_names().map(str::to_owned).collect();
        let state_names = kept_names(&all, &basis);
        let place = |phase: &Phase| state_names.iter().position(|name| *name == phase.inductor);
        let states: Vec<usize> = drawn.phases.iter().filter_map(place).collect();
        let (Some(first), Some(last)) = (drawn.phases.first(), drawn.phases.last()) else {
            return Err(not_followed("the stage has no phases"));
        };
        if states.len() < count {
            return Err(not_followed("the current of a phase is no state of its own"));
        }
        let unit = |k: usize, gain: f64| {
            let mut row = RowDVector::zeros(state_names.len());
            row[states[k]] = gain;
            row
        };
        let sense = conducting.c[(first.rows[1], states[0])];
        let rectified = freewheeling.c[(last.rows[4], states[count - 1])];
        let mut rest = DMatrix::identity(state_names.len(), state_names.len());
        rest[(states[always], states[always])] = 0.0;
        let sensed: Vec<RowDVector<f64>> = (0..count).map(|k| unit(k, sense)).collect();
        let turns = (0..first.rows.len()).map(|r| drawn.phases.iter().map(|phase| phase.rows[r]).collect()).collect();
        Ok(SwitchingEquations {
            rest,
            resting: freewheeling.clone(),
            sensed_current: sensed[always].clone(),
            switched_current: unit(always, rectified),
            magnetising: None,
            input_names: [INPUT_VOLTAGE, LOAD_CURRENT, DIODE_DROP].map(str::to_owned).to_vec(),
            inputs: loaded.inputs,
            rows: public_rows(&drawn.rows, drawn.switch, drawn.rectifier),
            blocks: self.rectifier.blocks(),
            interleaved: Some(Interleaved {
                phases: count,
                always,
                sensed,
                last: unit(count - 1, rectified),
                turns,
                together: conducting.c.nrows() - 1,
                states,
            }),
            conducting,
            freewheeling,
            state_names,
        })
    }
}

/// The finding of phases that are not followed switch by switch.
pub(crate) fn not_followed(why: &str) -> Finding {
    Finding::problem(PHASES.path, format!("Interleaved phases are not followed switch by switch: {why}."))
        .with_hint("the averaged results stand")
}
