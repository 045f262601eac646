//! How a topology draws its stage: the parts it has of its own, around the input network, output bank and load that
//! every stage shares.
//!
//! Every call draws its parts twice: into the netlist, and into the sketch that says where they stand in the schematic.

use super::entries::{BRANCHES, branch_count};
use super::filters::{
    Canvas, Damping, FilterParts, OutputFilter, draw_input_network, draw_output_filter, input_filter, output_filter,
};
use super::landmark::{RestingForms, Textbook};
use super::stage::{LoadKind, Rectifier};
use crate::circuit::{Drawn, InputId, Netlist, Node, OutputId, PartId, Shows, Sketch, Slot, Symbol};
use crate::quantity::{Choices, Unit};

/// A power-stage topology. One file reads like its schematic; textbook formulas serve as landmarks only.
#[derive(Debug)]
pub struct Topology {
    /// Word in files and on the command line.
    pub key: &'static str,
    /// Name shown.
    pub name: &'static str,
    /// What it does, in one line.
    pub line: &'static str,
    /// Where its output can stand against its input.
    pub reach: Reach,
    /// Draws the stage's own parts.
    pub draw: fn(&mut StageDrawing),
    /// Lossless duty ratio in continuous conduction from input and output voltage [V].
    pub ideal_duty: fn(f64, f64) -> f64,
    /// Resonance of inductor and output capacitor [Hz].
    pub resonance_hz: fn(&Textbook) -> f64,
    /// The formula of the resonance, for people.
    pub resonance_formula: &'static str,
    /// Right-half-plane zero [Hz], where there is one.
    pub right_half_plane_zero_hz: fn(&Textbook) -> Option<f64>,
    /// The formula of the right-half-plane zero, for people.
    pub right_half_plane_zero_formula: &'static str,
    /// What holds in its place in discontinuous conduction.
    pub resting: RestingForms,
}

/// Where an output can stand against the input.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Reach {
    /// Below the input voltage.
    BelowInput,
    /// Above the input voltage.
    AboveInput,
    /// Anywhere.
    Any,
}

/// What the drawing needs to know of the choices made.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) struct Options {
    /// Whether the rectifier is a diode, else a switch.
    pub(super) diode: bool,
    pub(super) input_filter: Option<Damping>,
    pub(super) input_capacitor: bool,
    pub(super) output_filter: Option<OutputFilter>,
    pub(super) load: LoadKind,
    pub(super) branches: usize,
    /// Which branches have their series inductance drawn.
    pub(super) branch_inductance: [bool; BRANCHES],
}

impl Options {
    /// What is chosen, before any value has its say.
    pub(super) fn chosen(choices: &Choices) -> Self {
        Options {
            diode: Rectifier::chosen(choices) == Rectifier::Diode,
            input_filter: input_filter(choices),
            input_capacitor: choices.is("stage.input-filter", "fitted")
                || choices.is("stage.input-capacitor", "fitted"),
            output_filter: output_filter(choices),
            load: LoadKind::chosen(choices),
            branches: branch_count(choices),
            branch_inductance: [false; BRANCHES],
        }
    }
}

/// A stage being drawn.
#[derive(Debug)]
pub struct StageDrawing {
    pub(super) netlist: Netlist,
    /// Where the parts stand in the schematic.
    pub(super) sketch: Sketch,
    options: Options,
    supply: Node,
    /// Terminals of the regulated voltage.
    sensed: Option<(Node, Node)>,
    /// Terminals of the load.
    load: Option<(Node, Node)>,
    /// Terminals of the bank.
    bank: Option<(Node, Node)>,
    filters: FilterParts,
    input_current_part: PartId,
    pub(super) inductors: Vec<PartId>,
    switch: Option<PartId>,
    rectifier: Option<PartId>,
    /// Ends of the controlled switch and of the rectifier.
    switch_ends: Option<(Node, Node)>,
    rectifier_ends: Option<(Node, Node)>,
    branches: Vec<PartId>,
    drop: InputId,
}

/// Rows of the outputs every stage answers with.
#[derive(Clone, Debug)]
pub(super) struct Rows {
    /// The regulated voltage, where divider and control sense it.
    pub(super) output_voltage: usize,
    /// The voltage at the load's terminals.
    pub(super) load_voltage: usize,
    /// The voltage of the bank, ahead of a second stage.
    pub(super) bank_voltage: usize,
    pub(super) input_current: usize,
    pub(super) switch_current: usize,
    pub(super) rectifier_current: usize,
    /// Voltage against ground of the controlled switch's end that is neither ground nor supply.
    pub(super) switch_node: usize,
    /// Voltage across the controlled switch.
    pub(super) switch_voltage: usize,
    /// Voltage across the rectifier, cathode against anode.
    pub(super) rectifier_voltage: usize,
    pub(super) inductor_currents: Vec<usize>,
    pub(super) branch_currents: Vec<usize>,
    /// Name and current of the filters' inductors, which carry no switched current.
    pub(super) filter_inductors: Vec<(&'static str, usize)>,
    /// Name, slot and current of the resistances of input network and output filter.
    pub(super) filter_losses: Vec<(&'static str, usize, usize)>,
}

/// Columns of the inputs every stage has.
pub(super) const INPUT_VOLTAGE: usize = 0;
pub(super) const LOAD_CURRENT: usize = 1;
pub(super) const DIODE_DROP: usize = 2;

/// Name of the controlled switch in the netlist; it conducts in the first interval.
pub(super) const SWITCH: &str = "switch";
/// Name of the rectifier in the netlist; it conducts in the second interval.
pub(super) const RECTIFIER: &str = "rectifier";

impl StageDrawing {
    /// A drawing that holds the input network so far.
    pub(super) fn new(options: Options) -> Self {
        let mut netlist = Netlist::new();
        let input = netlist.input("input voltage");
        netlist.input("load current");
        let drop = netlist.input("diode drop");
        let (source, ground) = (netlist.node("source"), netlist.ground());
        netlist.voltage_source("source", source, ground, input);
        let (mut sketch, mut filters) = (Sketch::default(), FilterParts::default());
        sketch.part(source, ground, drawn_source());
        let mut canvas = Canvas { netlist: &mut netlist, sketch: &mut sketch, parts: &mut filters };
        let (supply, input_current_part) = draw_input_network(&mut canvas, source, &options);
        StageDrawing {
            netlist,
            sketch,
            options,
            supply,
            sensed: None,
            load: None,
            bank: None,
            filters,
            input_current_part,
            inductors: Vec::new(),
            switch: None,
            rectifier: None,
            switch_ends: None,
            rectifier_ends: None,
            branches: Vec::new(),
            drop,
        }
    }

    /// The stage's positive input terminal, behind source resistance and input capacitor.
    pub fn supply(&self) -> Node {
        self.supply
    }

    /// The negative input terminal.
    pub fn ground(&self) -> Node {
        self.netlist.ground()
    }

    /// A new node.
    pub fn node(&mut self, name: &str) -> Node {
        self.netlist.node(name)
    }

    /// The controlled switch; it conducts for the duty ratio's share of the period.
    pub fn switch(&mut self, from: Node, to: Node) {
        let ohms = self.netlist.slot("stage.switch.resistance");
        self.switch = Some(self.netlist.switch(SWITCH, from, to, ohms));
        self.switch_ends = Some((from, to));
        let drawn = Drawn::new(Symbol::Switch, "Switch", "S")
            .value("stage.switch.resistance")
            .quiet("stage.switching-frequency");
        // Current flows from `from` to `to`, so the body of a transistor points the other way.
        self.sketch.part(to, from, drawn);
    }

    /// The rectifier, from anode to cathode: a diode or a synchronous switch, as chosen.
    pub fn rectifier(&mut self, anode: Node, cathode: Node) {
        let part = if self.options.diode {
            let ohms = self.netlist.slot("stage.diode.resistance");
            let drawn =
                Drawn::new(Symbol::Diode, "Diode", "D").value("stage.diode.drop").quiet("stage.diode.resistance");
            self.sketch.part(anode, cathode, drawn);
            self.netlist.diode(RECTIFIER, anode, cathode, ohms, self.drop)
        } else {
            let ohms = self.netlist.slot("stage.synchronous.resistance");
            let drawn = Drawn::new(Symbol::Switch, "Synchronous rectifier", "SR").value("stage.synchronous.resistance");
            self.sketch.part(anode, cathode, drawn);
            self.netlist.switch(RECTIFIER, anode, cathode, ohms)
        };
        self.rectifier = Some(part);
        self.rectifier_ends = Some((anode, cathode));
    }

    /// The inductor with its winding resistance; its current counts from `from` to `to`.
    pub fn inductor(&mut self, from: Node, to: Node) {
        let inner = self.netlist.node("winding");
        let (henries, ohms) =
            (self.netlist.slot("stage.inductor.inductance"), self.netlist.slot("stage.inductor.resistance"));
        let part = self.netlist.inductor("inductor", from, inner, henries);
        self.inductors.push(part);
        self.netlist.resistor("winding", inner, to, ohms);
        let drawn = Drawn::new(Symbol::Inductor, "Inductor", "L")
            .value("stage.inductor.inductance")
            .quiet("stage.inductor.resistance");
        self.sketch.part(from, to, drawn);
    }

    /// Output bank and load between the output's terminals, the output filter between them where one is fitted.
    pub fn output(&mut self, plus: Node, minus: Node) {
        for k in 0..self.options.branches {
            let part = draw_branch(&mut self.netlist, k, (plus, minus), self.options.branch_inductance[k]);
            self.branches.push(part);
            self.sketch.part(plus, minus, drawn_branch(k, self.options.branches));
        }
        let bank = (plus, minus);
        let (mut plus, mut minus) = bank;
        (self.sensed, self.bank) = (Some(bank), Some(bank));
        if let Some(filter) = self.options.output_filter {
            let mut canvas = Canvas { netlist: &mut self.netlist, sketch: &mut self.sketch, parts: &mut self.filters };
            (plus, minus) = draw_output_filter(&mut canvas, bank, filter);
            if filter.sensed_at_load {
                self.sensed = Some((plus, minus));
            }
        }
        self.load = Some((plus, minus));
        self.sketch.part(plus, minus, drawn_load(self.options.load));
        if self.options.load != LoadKind::Current {
            let ohms = self.netlist.slot("load resistance");
            self.netlist.resistor("load", plus, minus, ohms);
        }
        let n = &mut self.netlist;
        n.current_source("load current", plus, minus, load_input());
    }

    /// Asks for the outputs every stage answers with.
    pub(super) fn finish(mut self) -> Option<(Netlist, Rows)> {
        let (sensed, load, bank) = (self.sensed?, self.load?, self.bank?);
        let (switch, rectifier) = (self.switch?, self.rectifier?);
        let ((from, to), (anode, cathode)) = (self.switch_ends?, self.rectifier_ends?);
        let n = &mut self.netlist;
        let switch_node = if from.is_ground() || from == self.supply { to } else { from };
        let ground = n.ground();
        let row = OutputId::index;
        let rows = Rows {
            output_voltage: row(n.voltage_output("output voltage", sensed.0, sensed.1)),
            load_voltage: row(n.voltage_output("load voltage", load.0, load.1)),
            bank_voltage: row(n.voltage_output("bank voltage", bank.0, bank.1)),
            input_current: row(n.current_output("input current", self.input_current_part)),
            switch_current: row(n.current_output("switch current", switch)),
            rectifier_current: row(n.current_output("rectifier current", rectifier)),
            switch_node: row(n.voltage_output("switch-node voltage", switch_node, ground)),
            switch_voltage: row(n.voltage_output("switch voltage", from, to)),
            rectifier_voltage: row(n.voltage_output("rectifier voltage", cathode, anode)),
            inductor_currents: self
                .inductors
                .iter()
                .map(|part| row(n.current_output("inductor current", *part)))
                .collect(),
            branch_currents: self.branches.iter().map(|part| row(n.current_output("branch current", *part))).collect(),
            filter_inductors: self
                .filters
                .inductors
                .iter()
                .map(|(name, part)| (*name, row(n.current_output("filter inductor current", *part))))
                .collect(),
            filter_losses: self
                .filters
                .lossy
                .iter()
                .map(|lossy| (lossy.name, lossy.ohms.index(), row(n.current_output("filter current", lossy.part))))
                .collect(),
        };
        Some((self.netlist, rows))
    }
}

/// The stage as its schematic shows it under these choices, all parts chosen in it whatever their values; none for an unknown
/// topology.
pub fn sketch(choices: &Choices) -> Option<Sketch> {
    let topology = super::registry::find(choices.get("stage.topology").unwrap_or("boost"))?;
    let mut drawing = StageDrawing::new(Options::chosen(choices));
    (topology.draw)(&mut drawing);
    Some(drawing.sketch)
}

fn drawn_source() -> Drawn {
    let paths = ["stage.input.least", "stage.input.greatest"];
    Drawn::new(Symbol::VoltageSource, "Input", "Vin").value("stage.input.nominal").also(&paths)
}

/// One branch of the bank: one symbol for all its capacitors, with the ESR of one below.
fn drawn_branch(k: usize, of: usize) -> Drawn {
    let path = |what: &str| format!("stage.bank.{}.{what}", k + 1);
    let (each, count) = (path("capacitance"), path("count"));
    let value = Shows::Count { count: count.clone(), each: each.clone() };
    let number = |one: &str, many: String| if of == 1 { one.to_owned() } else { many };
    let name = number("Output capacitor", format!("Output capacitor {}", k + 1));
    Drawn::new(Symbol::Capacitor, name, number("C", format!("C{}", k + 1)))
        .shows(value, &[&each])
        .quiet(&path("esr"))
        .also(&[&path("remaining"), &count, &path("esl")])
}

fn drawn_load(load: LoadKind) -> Drawn {
    let (symbol, name, designator) = match load {
        LoadKind::Resistor => (Symbol::Resistor, "Load resistor", "R"),
        LoadKind::Current => (Symbol::CurrentSource, "Load current", "I"),
        LoadKind::Power => (Symbol::CurrentSource, "Constant-power load", "P"),
    };
    let (amperes, volts) = ("stage.load.nominal", "stage.output.voltage");
    let drawn = Drawn::new(symbol, name, designator);
    let drawn = match load {
        LoadKind::Resistor => drawn
            .shows(Shows::Ratio { over: volts.to_owned(), under: amperes.to_owned(), unit: Unit::Ohm }, &[])
            .quiet(amperes),
        LoadKind::Current | LoadKind::Power => drawn.value(amperes),
    };
    drawn.also(&["stage.load.least", "stage.load.greatest", "stage.load", volts])
}

/// The load current's input was the second to be declared.
fn load_input() -> InputId {
    InputId::nth(LOAD_CURRENT)
}

/// Draws one branch of the bank; its slots hold the values of all its capacitors taken together.
pub(super) fn draw_branch(netlist: &mut Netlist, k: usize, (plus, minus): (Node, Node), inductance: bool) -> PartId {
    let name = |what: &str| format!("bank {} {what}", k + 1);
    let slots: [Slot; 3] = ["capacitance", "ESR", "ESL"].map(|what| netlist.slot(&name(what)));
    let mut top = plus;
    if inductance {
        let inner = netlist.node(&name("ESL"));
        netlist.inductor(&name("ESL"), top, inner, slots[2]);
        top = inner;
    }
    let inner = netlist.node(&name("capacitor"));
    let part = netlist.resistor(&name("ESR"), top, inner, slots[1]);
    netlist.capacitor(&name("capacitor"), inner, minus, slots[0]);
    part
}
