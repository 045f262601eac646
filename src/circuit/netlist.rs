//! Netlists of ideal parts: structure only, values stand apart in a vector.
//!
//! *Conventions*: a part runs from its first node to its second; its current is positive when it flows from the first
//! to the second inside the part, its voltage is that of the first node against the second. A state is a capacitor
//! voltage [V] or an inductor current [A]. Every source reads an input; a conducting diode's forward drop is an input.

use std::collections::HashMap;

/// A node of the netlist. Node 0 is the ground, against which node voltages count.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub struct Node(pub(super) usize);

impl Node {
    /// Whether it is the ground.
    pub fn is_ground(self) -> bool {
        self.0 == 0
    }
}

/// Place of a part value in the values vector.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub struct Slot(pub(super) usize);

impl Slot {
    /// Index into the values vector.
    pub fn index(self) -> usize {
        self.0
    }
}

/// A part of the netlist.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub struct PartId(pub(super) usize);

/// An input: the value of a source.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub struct InputId(pub(super) usize);

impl InputId {
    /// The input declared as number `column`, counted from 0.
    pub fn nth(column: usize) -> Self {
        InputId(column)
    }

    /// Column of the input in the state equations.
    pub fn index(self) -> usize {
        self.0
    }
}

/// A wanted output: a voltage or a current.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub struct OutputId(pub(super) usize);

impl OutputId {
    /// Row of the output in the state equations.
    pub fn index(self) -> usize {
        self.0
    }
}

/// What a part is, and where it reads its value.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Kind {
    Resistor { ohms: Slot },
    Capacitor { farads: Slot, state: usize },
    Inductor { henries: Slot, state: usize },
    VoltageSource { input: InputId },
    CurrentSource { input: InputId },
    Switch { ohms: Slot },
    Diode { ohms: Slot, drop: InputId },
    ControlledVoltage { gain: Slot, plus: Node, minus: Node },
    ControlledCurrent { siemens: Slot, plus: Node, minus: Node },
    CopiedCurrent { gain: Slot, of: PartId },
    Transformer { ratio: Slot, second: (Node, Node) },
}

#[derive(Clone, Debug, PartialEq)]
pub(super) struct Part {
    pub(super) name: String,
    pub(super) kind: Kind,
    pub(super) from: Node,
    pub(super) to: Node,
}

#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) enum Probe {
    Voltage { plus: Node, minus: Node },
    Current { part: PartId },
}

/// A pair of inductors that share flux.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Coupling {
    pub(super) first: PartId,
    pub(super) second: PartId,
    pub(super) factor: Slot,
}

/// A circuit of ideal parts, written down once.
#[derive(Clone, Debug, PartialEq)]
pub struct Netlist {
    pub(super) nodes: Vec<String>,
    pub(super) parts: Vec<Part>,
    pub(super) slots: Vec<String>,
    pub(super) states: Vec<PartId>,
    pub(super) inputs: Vec<String>,
    pub(super) outputs: Vec<(String, Probe)>,
    pub(super) couplings: Vec<Coupling>,
    slot_by_name: HashMap<String, Slot>,
}

impl Default for Netlist {
    fn default() -> Self {
        Self::new()
    }
}

impl Netlist {
    /// An empty netlist with its ground node.
    pub fn new() -> Self {
        Netlist {
            nodes: vec!["ground".to_owned()],
            parts: Vec::new(),
            slots: Vec::new(),
            states: Vec::new(),
            inputs: Vec::new(),
            outputs: Vec::new(),
            couplings: Vec::new(),
            slot_by_name: HashMap::new(),
        }
    }

    /// The ground node.
    pub fn ground(&self) -> Node {
        Node(0)
    }

    /// A new node.
    pub fn node(&mut self, name: &str) -> Node {
        self.nodes.push(name.to_owned());
        Node(self.nodes.len() - 1)
    }

    /// The slot of a value by name; the same name gives the same slot.
    pub fn slot(&mut self, name: &str) -> Slot {
        if let Some(slot) = self.slot_by_name.get(name) {
            return *slot;
        }
        let slot = Slot(self.slots.len());
        self.slots.push(name.to_owned());
        self.slot_by_name.insert(name.to_owned(), slot);
        slot
    }

    /// Names of all slots, in the order of the values vector.
    pub fn slot_names(&self) -> &[String] {
        &self.slots
    }

    /// A new input.
    pub fn input(&mut self, name: &str) -> InputId {
        self.inputs.push(name.to_owned());
        InputId(self.inputs.len() - 1)
    }

    /// Names of the inputs, in column order.
    pub fn input_names(&self) -> &[String] {
        &self.inputs
    }

    /// Names of the outputs, in row order.
    pub fn output_names(&self) -> impl Iterator<Item = &str> {
        self.outputs.iter().map(|(name, _)| name.as_str())
    }

    /// Names of the parts that hold the states, in state order.
    pub fn state_names(&self) -> impl Iterator<Item = &str> {
        self.states.iter().map(|part| self.parts[part.0].name.as_str())
    }

    fn add(&mut self, name: &str, kind: Kind, from: Node, to: Node) -> PartId {
        self.parts.push(Part { name: name.to_owned(), kind, from, to });
        PartId(self.parts.len() - 1)
    }

    /// A resistor [Ω]; zero is legal.
    pub fn resistor(&mut self, name: &str, from: Node, to: Node, ohms: Slot) -> PartId {
        self.add(name, Kind::Resistor { ohms }, from, to)
    }

    /// A capacitor [F]; its voltage is a state.
    pub fn capacitor(&mut self, name: &str, from: Node, to: Node, farads: Slot) -> PartId {
        let state = self.states.len();
        let part = self.add(name, Kind::Capacitor { farads, state }, from, to);
        self.states.push(part);
        part
    }

    /// An inductor [H]; its current is a state.
    pub fn inductor(&mut self, name: &str, from: Node, to: Node, henries: Slot) -> PartId {
        let state = self.states.len();
        let part = self.add(name, Kind::Inductor { henries, state }, from, to);
        self.states.push(part);
        part
    }

    /// Couples two inductors with the coupling factor in `factor`, between −1 and 1 exclusive.
    pub fn couple(&mut self, first: PartId, second: PartId, factor: Slot) {
        self.couplings.push(Coupling { first, second, factor });
    }

    /// An ideal voltage source whose voltage [V] is the input.
    pub fn voltage_source(&mut self, name: &str, plus: Node, minus: Node, input: InputId) -> PartId {
        self.add(name, Kind::VoltageSource { input }, plus, minus)
    }

    /// An ideal current source whose current [A], flowing from `from` to `to` inside it, is the input.
    pub fn current_source(&mut self, name: &str, from: Node, to: Node, input: InputId) -> PartId {
        self.add(name, Kind::CurrentSource { input }, from, to)
    }

    /// A controlled switch with its closed resistance [Ω]; open it carries no current.
    pub fn switch(&mut self, name: &str, from: Node, to: Node, ohms: Slot) -> PartId {
        self.add(name, Kind::Switch { ohms }, from, to)
    }

    /// A diode from anode to cathode with its series resistance [Ω]; its forward drop [V] is the input.
    pub fn diode(&mut self, name: &str, anode: Node, cathode: Node, ohms: Slot, drop: InputId) -> PartId {
        self.add(name, Kind::Diode { ohms, drop }, anode, cathode)
    }

    /// A voltage source of `gain` times the voltage from `plus` to `minus`.
    pub fn controlled_voltage(
        &mut self,
        name: &str,
        from: Node,
        to: Node,
        gain: Slot,
        plus: Node,
        minus: Node,
    ) -> PartId {
        self.add(name, Kind::ControlledVoltage { gain, plus, minus }, from, to)
    }

    /// A current source of `siemens` times the voltage from `plus` to `minus`, flowing from `from` to `to` inside it.
    pub fn controlled_current(
        &mut self,
        name: &str,
        from: Node,
        to: Node,
        siemens: Slot,
        plus: Node,
        minus: Node,
    ) -> PartId {
        self.add(name, Kind::ControlledCurrent { siemens, plus, minus }, from, to)
    }

    /// A current source of `gain` times the current of another part, which is no inductor and no current source, flowing from `from`
    /// to `to` inside it.
    pub fn copied_current(&mut self, name: &str, from: Node, to: Node, gain: Slot, of: PartId) -> PartId {
        self.add(name, Kind::CopiedCurrent { gain, of }, from, to)
    }

    /// An ideal transformer with turns ratio second to first; `first` and `second` list their dotted ends first.
    pub fn transformer(&mut self, name: &str, first: (Node, Node), second: (Node, Node), ratio: Slot) -> PartId {
        self.add(name, Kind::Transformer { ratio, second }, first.0, first.1)
    }

    /// Asks for the voltage of `plus` against `minus`.
    pub fn voltage_output(&mut self, name: &str, plus: Node, minus: Node) -> OutputId {
        self.outputs.push((name.to_owned(), Probe::Voltage { plus, minus }));
        OutputId(self.outputs.len() - 1)
    }

    /// Asks for the current through a part.
    pub fn current_output(&mut self, name: &str, part: PartId) -> OutputId {
        self.outputs.push((name.to_owned(), Probe::Current { part }));
        OutputId(self.outputs.len() - 1)
    }
}
