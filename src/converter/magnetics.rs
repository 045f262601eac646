//! How inductors, transformer and coupling capacitor are drawn, into the netlist and into the sketch.

use super::drawing::{StageDrawing, Winding};
use super::topology_entries::{
    COUPLING, COUPLING_CAPACITOR, COUPLING_CAPACITOR_ESR, DAMPING, DAMPING_CAPACITANCE, DAMPING_RESISTANCE, INDUCTORS,
    RATIO, SECOND_INDUCTOR, SECOND_WINDING,
};
use crate::circuit::{Drawn, Node, PartId, Symbol};

impl StageDrawing {
    /// The inductor with its winding resistance; its current counts from `from` to `to`.
    pub fn inductor(&mut self, from: Node, to: Node) {
        self.wind(("inductor", "inductor winding"), (from, to), (INDUCTANCE, WINDING));
        self.sketch.part(from, to, drawn_inductor(("Inductor", "L"), (INDUCTANCE, WINDING)));
    }

    /// The first of two inductors, likewise.
    pub fn first_inductor(&mut self, from: Node, to: Node) {
        self.wind(("inductor L1", "winding L1"), (from, to), (INDUCTANCE, WINDING));
        let mut drawn = drawn_inductor(("Inductor L1", "L1"), (INDUCTANCE, WINDING))
            .also(&[INDUCTORS.path])
            .dotted(self.options.coupled);
        if self.options.coupled {
            drawn = drawn.led("k = ", COUPLING.path);
        }
        self.sketch.part(from, to, drawn);
    }

    /// The second of two inductors, coupled with the first where that is chosen, the dots at the nodes that are listed first.
    pub fn second_inductor(&mut self, from: Node, to: Node) {
        let paths = (SECOND_INDUCTOR.path, SECOND_WINDING.path);
        let second = self.wind(("inductor L2", "winding L2"), (from, to), paths);
        if let Some(first) = self.windings.first().filter(|_| self.options.coupled) {
            let factor = self.netlist.slot(COUPLING.path);
            self.netlist.couple(first.part, second, factor);
        }
        self.sketch.part(from, to, drawn_inductor(("Inductor L2", "L2"), paths).dotted(self.options.coupled));
    }

    /// Inductor and winding resistance in series, in the netlist alone.
    pub(super) fn wind(
        &mut self,
        (name, loss): (&'static str, &'static str),
        (from, to): (Node, Node),
        (inductance, resistance): (&str, &str),
    ) -> PartId {
        let inner = self.netlist.node(loss);
        let (henries, ohms) = (self.netlist.slot(inductance), self.netlist.slot(resistance));
        let part = self.netlist.inductor(name, from, inner, henries);
        self.netlist.resistor(loss, inner, to, ohms);
        self.windings.push(Winding { name, loss, part, ends: (from, to), ohms });
        part
    }

    /// A transformer whose magnetising inductance, at the first winding, is the stage's inductor.
    pub fn storing_transformer(&mut self, first: (Node, Node), second: (Node, Node)) {
        self.wind(("inductor", "inductor winding"), first, (INDUCTANCE, WINDING));
        let ratio = self.netlist.slot(RATIO.path);
        self.netlist.transformer("transformer", first, second, ratio);
        let drawn = drawn_inductor(("Transformer", "T"), (INDUCTANCE, WINDING)).led("1 : ", RATIO.path);
        self.sketch.transformer(first, second, drawn);
    }

    /// The capacitor that joins input side and output side, with its ESR.
    pub fn coupling_capacitor(&mut self, from: Node, to: Node) {
        let inner = self.netlist.node("coupling capacitor");
        let farads = self.netlist.slot(COUPLING_CAPACITOR.path);
        self.netlist.capacitor("coupling capacitor", from, inner, farads);
        self.filters.resistor(&mut self.netlist, "coupling capacitor ESR", (inner, to), COUPLING_CAPACITOR_ESR.path);
        let drawn = Drawn::new(Symbol::Capacitor, "Coupling capacitor", "Cc")
            .value(COUPLING_CAPACITOR.path)
            .quiet(COUPLING_CAPACITOR_ESR.path)
            .also(&[DAMPING.path]);
        self.sketch.part(from, to, drawn);
        if self.options.coupling_damped {
            self.coupling_damping(from, to);
        }
    }

    fn coupling_damping(&mut self, from: Node, to: Node) {
        let middle = self.netlist.node("coupling damping");
        let farads = self.netlist.slot(DAMPING_CAPACITANCE.path);
        self.netlist.capacitor("coupling damping", from, middle, farads);
        let name = "coupling capacitor damping";
        self.filters.resistor(&mut self.netlist, name, (middle, to), DAMPING_RESISTANCE.path);
        let drawn = |symbol, name: &str, designator: &str, path: &str| Drawn::new(symbol, name, designator).value(path);
        let capacitor = drawn(Symbol::Capacitor, "Coupling's damping capacitor", "Cx", DAMPING_CAPACITANCE.path);
        self.sketch.over(from, middle, capacitor);
        let resistor = drawn(Symbol::Resistor, "Coupling's damping resistor", "Rx", DAMPING_RESISTANCE.path);
        self.sketch.over(middle, to, resistor);
    }
}

/// Path of the inductance that every stage has.
pub(super) const INDUCTANCE: &str = "stage.inductor.inductance";
/// Path of its winding's resistance.
pub(super) const WINDING: &str = "stage.inductor.resistance";

pub(super) fn drawn_inductor((name, designator): (&str, &str), (inductance, resistance): (&str, &str)) -> Drawn {
    Drawn::new(Symbol::Inductor, name, designator).value(inductance).quiet(resistance)
}
