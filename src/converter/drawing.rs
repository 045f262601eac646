//! How a topology draws its stage: the parts it has of its own, around the input network, output bank and load that
//! every stage shares.
//!
//! Every call draws its parts twice: into the netlist, and into the sketch that says where they stand in the schematic.

use super::entries::{BRANCHES, branch_count};
use super::filters::{
    Canvas, Damping, FilterParts, OutputFilter, draw_input_network, draw_output_filter, input_filter, output_filter,
};
use super::phases::{PHASES, counted};
use super::rows::{Rows, SwitchRow, WindingRow};
use super::stage::{LoadKind, Rectifier};
use super::topology_entries::{coupled, damped};
use crate::circuit::{Drawn, InputId, Netlist, Node, OutputId, PartId, Shows, Sketch, Slot, Symbol};
use crate::quantity::{Choices, Unit};

/// What the drawing needs to know of the choices made.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) struct Options {
    /// Whether the rectifier is a diode, else a switch.
    pub(super) diode: bool,
    /// Whether two inductors share a core.
    pub(super) coupled: bool,
    /// Whether a branch damps the coupling capacitor.
    pub(super) coupling_damped: bool,
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
            coupled: coupled(choices),
            coupling_damped: damped(choices),
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
    pub(super) options: Options,
    pub(super) supply: Node,
    /// Ends of the primary winding of a transformer that stores nothing.
    pub(super) primary: Option<(Node, Node)>,
    /// Terminals of the regulated voltage.
    sensed: Option<(Node, Node)>,
    /// Terminals of the load.
    load: Option<(Node, Node)>,
    /// Terminals of the bank.
    bank: Option<(Node, Node)>,
    pub(super) filters: FilterParts,
    input_current_part: PartId,
    pub(super) windings: Vec<Winding>,
    pub(super) switches: Vec<Switched>,
    branches: Vec<PartId>,
    pub(super) drop: InputId,
}

/// An inductor drawn.
#[derive(Clone, Copy, Debug)]
pub(super) struct Winding {
    pub(super) name: &'static str,
    pub(super) loss: &'static str,
    pub(super) part: PartId,
    pub(super) ends: (Node, Node),
    pub(super) ohms: Slot,
}

/// A switch or rectifier drawn.
#[derive(Clone, Copy, Debug)]
pub(super) struct Switched {
    pub(super) name: &'static str,
    pub(super) part: PartId,
    pub(super) ohms: Slot,
    /// Of a rectifier, the cathode first.
    pub(super) ends: (Node, Node),
    pub(super) diode: bool,
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
            primary: None,
            sensed: None,
            load: None,
            bank: None,
            filters,
            input_current_part,
            windings: Vec::new(),
            switches: Vec::new(),
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

    /// The return of an output that is isolated from the input. Nothing flows between the two, so the netlist may tie them
    /// together; the schematic keeps them apart.
    pub fn isolated_return(&mut self) -> Node {
        let node = self.netlist.node("isolated return");
        let wire = self.netlist.slot(TIE);
        let ground = self.netlist.ground();
        self.netlist.resistor("tie", node, ground, wire);
        self.sketch.lows.push(node);
        node
    }

    /// The controlled switch; it conducts for the duty ratio's share of the period.
    pub fn switch(&mut self, from: Node, to: Node) {
        self.switch_called((SWITCH, "Switch", "S"), from, to);
    }

    /// A switch by its name in the netlist, which the topology's [`SwitchSets`](super::SwitchSets) use, its name for people and its
    /// designator.
    pub fn switch_called(&mut self, names: (&'static str, &str, &str), from: Node, to: Node) {
        self.switch_between(names, (from, to), (from, to));
    }

    /// The same between two nodes of the netlist, drawn between two of the sketch.
    pub(super) fn switch_between(
        &mut self,
        (name, shown, designator): (&'static str, &str, &str),
        ends: (Node, Node),
        seen: (Node, Node),
    ) {
        let ohms = self.netlist.slot("stage.switch.resistance");
        let part = self.netlist.switch(name, ends.0, ends.1, ohms);
        self.switches.push(Switched { name, part, ohms, ends, diode: false });
        let drawn = Drawn::new(Symbol::Switch, shown, designator)
            .value("stage.switch.resistance")
            .quiet("stage.switching-frequency");
        // Current flows from the first end to the second, so the body of a transistor points the other way.
        self.sketch.part(seen.1, seen.0, drawn);
    }

    /// The rectifier, from anode to cathode: a diode or a synchronous switch, as chosen.
    pub fn rectifier(&mut self, anode: Node, cathode: Node) {
        self.rectifier_called(RECTIFIER, anode, cathode);
    }

    /// A rectifier by its name in the netlist.
    pub fn rectifier_called(&mut self, name: &'static str, anode: Node, cathode: Node) {
        let count = self.switches.iter().filter(|switch| switch.name.contains(RECTIFIER)).count();
        let diode = self.options.diode;
        let (drawn, path) = self.drawn_rectifier(count + 1);
        let ohms = self.netlist.slot(path);
        self.sketch.part(anode, cathode, drawn);
        let part = if diode {
            self.netlist.diode(name, anode, cathode, ohms, self.drop)
        } else {
            self.netlist.switch(name, anode, cathode, ohms)
        };
        self.switches.push(Switched { name, part, ohms, ends: (cathode, anode), diode });
    }

    /// The rectifier of this number as it is drawn, and the path of its resistance.
    pub(super) fn drawn_rectifier(&self, number: usize) -> (Drawn, &'static str) {
        let numbered = |word: &str, gap| if number == 1 { word.to_owned() } else { format!("{word}{gap}{number}") };
        if self.options.diode {
            let path = "stage.diode.resistance";
            let drawn = Drawn::new(Symbol::Diode, numbered("Diode", " "), numbered("D", ""));
            (drawn.value("stage.diode.drop").quiet(path), path)
        } else {
            let path = "stage.synchronous.resistance";
            let name = numbered("Synchronous rectifier", " ");
            (Drawn::new(Symbol::Switch, name, numbered("SR", "")).value(path), path)
        }
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
        let n = &mut self.netlist;
        let (ground, supply) = (n.ground(), self.supply);
        let row = OutputId::index;
        let rows = Rows {
            output_voltage: row(n.voltage_output("output voltage", sensed.0, sensed.1)),
            load_voltage: row(n.voltage_output("load voltage", load.0, load.1)),
            bank_voltage: row(n.voltage_output("bank voltage", bank.0, bank.1)),
            input_current: row(n.current_output("input current", self.input_current_part)),
            primary_voltage: self.primary.map(|(plus, minus)| row(n.voltage_output("primary voltage", plus, minus))),
            switches: self
                .switches
                .iter()
                .map(|switch| SwitchRow {
                    name: switch.name,
                    row: row(n.current_output(switch.name, switch.part)),
                    voltage: row(n.voltage_output(switch.name, switch.ends.0, switch.ends.1)),
                    node: row(n.voltage_output(switch.name, free_end(switch.ends, supply), ground)),
                    ohms: switch.ohms.index(),
                    diode: switch.diode,
                })
                .collect(),
            inductors: self
                .windings
                .iter()
                .map(|winding| WindingRow {
                    name: winding.name,
                    loss: winding.loss,
                    row: row(n.current_output(winding.name, winding.part)),
                    ohms: winding.ohms.index(),
                })
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
    if topology.has(PHASES.path) {
        counted(&mut drawing.sketch);
    }
    Some(drawing.sketch)
}

/// The end of a switch that is neither ground nor supply.
fn free_end((from, to): (Node, Node), supply: Node) -> Node {
    if from.is_ground() || from == supply { to } else { from }
}

/// Name of a slot whose value is zero, as no entry has it.
pub(super) const TIE: &str = "tie";

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
