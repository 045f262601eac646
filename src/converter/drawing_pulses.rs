//! What a buck behind a transformer draws that the other stages do not have.

use super::buck_derived::{AT_REST, COMMUTATION, FREEWHEEL, LEAKAGE, MAGNETISING, PULSE};
use super::drawing::{SWITCH, StageDrawing, Switched, TIE};
use super::magnetics::{INDUCTANCE, WINDING, drawn_inductor};
use super::topology_entries::RATIO;
use crate::circuit::{Drawn, Node, Shows, Symbol};

impl StageDrawing {
    /// An ideal transformer that pulses drive; `also` lists further entries it stands for. Its magnetising current is no state.
    pub fn pulse_transformer(&mut self, first: (Node, Node), second: (Node, Node), also: &[&str]) {
        self.pulse_windings(first, second);
        self.sketch.transformer(first, second, drawn_transformer().also(also));
    }

    /// The same whose primary ends at half the input, held there by a divider of capacitors.
    pub fn pulse_transformer_over_half_input(&mut self, first: (Node, Node), second: (Node, Node)) {
        let ground = self.netlist.ground();
        // In the netlist the half is taken at the switch, against ground.
        self.pulse_windings((first.0, ground), second);
        self.sketch.transformer(first, second, drawn_transformer());
        let tie = self.netlist.slot(TIE);
        self.netlist.resistor("half of the input", first.1, ground, tie);
        self.sketch.part(
            first.1,
            ground,
            Drawn::new(Symbol::Capacitor, "Divider capacitor, of two", "Ch").also(&["stage.topology"]),
        );
    }

    fn pulse_windings(&mut self, first: (Node, Node), second: (Node, Node)) {
        let ratio = self.netlist.slot(RATIO.path);
        self.netlist.transformer("transformer", first, second, ratio);
        self.primary = Some(first);
        // Nothing else says what the windings' voltage is while no switch conducts.
        let tie = self.netlist.slot(TIE);
        self.netlist.switch(AT_REST, second.0, second.1, tie);
    }

    /// The controlled switch, fed by half the input: an ideal divider, each half of which supplies half of the current.
    pub fn switch_from_half_input(&mut self, to: Node) {
        let (ground, half) = (self.netlist.ground(), self.netlist.node("half of the input"));
        let share = self.netlist.slot("0.5");
        self.netlist.transformer("divider", (self.supply, ground), (half, ground), share);
        self.switch_between((SWITCH, "Switch", "S"), (half, to), (self.supply, to));
    }

    /// Both rectifiers at a centre-tapped secondary, of which one half is drawn: one conducts in a pulse, both share the current
    /// between pulses.
    pub fn centre_tap(&mut self, secondary: Node, tap: Node, cathode: Node) {
        self.rectifier_called(PULSE, secondary, cathode);
        let (drawn, path) = self.drawn_rectifier(2);
        let ohms = self.netlist.slot(&format!("0.5 × {path}"));
        let diode = self.options.diode;
        let part = if diode {
            self.netlist.diode(FREEWHEEL, tap, cathode, ohms, self.drop)
        } else {
            self.netlist.switch(FREEWHEEL, tap, cathode, ohms)
        };
        self.sketch.part(tap, cathode, drawn);
        self.switches.push(Switched { name: FREEWHEEL, part, ohms, ends: (cathode, tap), diode });
    }

    /// The output inductor, in series with what the transformer's leakage costs.
    pub fn smoothing_inductor(&mut self, from: Node, to: Node) {
        let inner = self.netlist.node("behind commutation");
        let ohms = self.netlist.slot(COMMUTATION);
        self.netlist.resistor("commutation", from, inner, ohms);
        self.wind(("inductor", "inductor winding"), (inner, to), (INDUCTANCE, WINDING));
        self.sketch.part(from, to, drawn_inductor(("Inductor", "L"), (INDUCTANCE, WINDING)));
    }
}

fn drawn_transformer() -> Drawn {
    Drawn::new(Symbol::Inductor, "Transformer", "T")
        .shows(Shows::Led { words: "1 : ", path: RATIO.path.to_owned() }, &[RATIO.path])
        .quiet(MAGNETISING.path)
        .also(&[LEAKAGE.path])
}
