//! Where the parts of a circuit stand in its drawing: what is drawn, between which nodes, in which direction.
//!
//! A sketch is recorded beside the netlist, by the same calls. It has no lengths; who draws it works those out. Parts
//! come in the order from source to load: *along* the upper rail, *down* from it to the ground rail, or *over* parts
//! along the rail that are there already. Downward parts that share a node which nothing else touches stand in one
//! column, so a resistor in series with a capacitor is two calls.
//!
//! *Conventions*: a part runs from its first node to its second, as in the netlist: a diode from anode to cathode, a
//! source from plus to minus, a current source in the direction its current flows inside it.

use super::netlist::Node;
use crate::quantity::Unit;

/// A symbol of a circuit drawing.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub enum Symbol {
    /// A resistor.
    Resistor,
    /// An inductor.
    Inductor,
    /// A capacitor.
    Capacitor,
    /// An ideal voltage source.
    VoltageSource,
    /// A current source or sink.
    CurrentSource,
    /// A controlled switch that conducts both ways; its body conducts from the first node to the second.
    Switch,
    /// A diode, from anode to cathode.
    Diode,
}

/// A number written at a part.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Shows {
    /// The value of an entry.
    Entry(String),
    /// So many of a part with such a value: "3 × 47 µF".
    Count {
        /// Path of how many there are.
        count: String,
        /// Path of the value of one.
        each: String,
    },
    /// The value of an entry that needs a word before it: "1 : 0.25", "k = 0.97".
    Led {
        /// What stands before it.
        words: &'static str,
        /// Path of the entry.
        path: String,
    },
    /// One entry over another.
    Ratio {
        /// Path of the entry above the line.
        over: String,
        /// Path of the entry below the line.
        under: String,
        /// Unit of the quotient.
        unit: Unit,
    },
}

/// A part as it is drawn.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Drawn {
    /// Its symbol.
    pub symbol: Symbol,
    /// What it is: "Inductor".
    pub name: String,
    /// Its designator: "L".
    pub designator: String,
    /// The number that is written at it.
    pub value: Option<Shows>,
    /// Numbers written below it, less loudly; left out where they are zero.
    pub quiet: Vec<Shows>,
    /// Paths of all entries it stands for, the most important first.
    pub paths: Vec<String>,
    /// True for a coupled inductor: a dot stands at its first node.
    pub dotted: bool,
    /// True for a part that is a piece of wire, and drawn as one, where its value is zero.
    pub wire_at_zero: bool,
}

impl Drawn {
    /// A part without numbers.
    pub fn new(symbol: Symbol, name: impl Into<String>, designator: impl Into<String>) -> Self {
        let (name, designator) = (name.into(), designator.into());
        Drawn {
            symbol,
            name,
            designator,
            value: None,
            quiet: Vec::new(),
            paths: Vec::new(),
            dotted: false,
            wire_at_zero: false,
        }
    }

    /// The same, but where its value is zero only a wire is drawn.
    #[must_use]
    pub fn wire_at_zero(mut self) -> Self {
        self.wire_at_zero = true;
        self
    }

    /// The same with a dot at its first node, where `coupled` says so.
    #[must_use]
    pub fn dotted(mut self, coupled: bool) -> Self {
        self.dotted = coupled;
        self
    }

    /// The number that is written at it, from the entry at this path.
    #[must_use]
    pub fn value(self, path: &str) -> Self {
        self.shows(Shows::Entry(path.to_owned()), &[path])
    }

    /// The number that is written at it, and the entries it stands for.
    #[must_use]
    pub fn shows(mut self, value: Shows, paths: &[&str]) -> Self {
        self.value = Some(value);
        self.also(paths)
    }

    /// A number written below it, with a word before it.
    #[must_use]
    pub fn led(mut self, words: &'static str, path: &str) -> Self {
        self.quiet.push(Shows::Led { words, path: path.to_owned() });
        self.also(&[path])
    }

    /// A number written below it, from the entry at this path.
    #[must_use]
    pub fn quiet(mut self, path: &str) -> Self {
        self.quiet.push(Shows::Entry(path.to_owned()));
        self.also(&[path])
    }

    /// Further entries or choices it stands for, without numbers in the drawing.
    #[must_use]
    pub fn also(mut self, paths: &[&str]) -> Self {
        self.paths.extend(paths.iter().map(|path| (*path).to_owned()));
        self
    }
}

/// Where a part stands.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Stand {
    /// On the upper rail; the node that is drawn already is at its left.
    Along,
    /// In a column between the upper rail and the ground rail, beginning at its upper end.
    Down,
    /// On a line of its own above the rail, from node to node of it.
    Over,
}

/// A part in its place.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Placed {
    /// The part.
    pub drawn: Drawn,
    /// Its first node.
    pub from: Node,
    /// Its second node.
    pub to: Node,
    /// Where it stands.
    pub stand: Stand,
    /// The second winding of a transformer whose first is this part; their dots are at the first nodes.
    pub second: Option<(Node, Node)>,
}

/// Parts in the order from source to load.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct Sketch {
    /// The parts.
    pub parts: Vec<Placed>,
    /// Returns of isolated circuits: nodes that stand on the ground rail without being the ground.
    pub lows: Vec<Node>,
}

impl Sketch {
    /// A part where its nodes put it: down where it touches the ground, along the rail where it does not.
    pub fn part(&mut self, from: Node, to: Node, drawn: Drawn) {
        let grounded = self.is_low(from) || self.is_low(to);
        self.place(from, to, if grounded { Stand::Down } else { Stand::Along }, drawn);
    }

    /// Whether a node stands on the ground rail: the ground, or the return of an isolated circuit.
    pub fn is_low(&self, node: Node) -> bool {
        node.is_ground() || self.lows.contains(&node)
    }

    /// A part downward, also where only the next one reaches the ground.
    pub fn down(&mut self, from: Node, to: Node, drawn: Drawn) {
        self.place(from, to, Stand::Down, drawn);
    }

    /// A part on a line above the rail, parallel to parts along it; several in a chain share that line.
    pub fn over(&mut self, from: Node, to: Node, drawn: Drawn) {
        self.place(from, to, Stand::Over, drawn);
    }

    /// A transformer, its windings side by side with the dots at their first nodes; the first winding stands in a column with
    /// what follows below it.
    pub fn transformer(&mut self, first: (Node, Node), second: (Node, Node), drawn: Drawn) {
        self.place(first.0, first.1, Stand::Down, drawn);
        if let Some(placed) = self.parts.last_mut() {
            placed.second = Some(second);
        }
    }

    fn place(&mut self, from: Node, to: Node, stand: Stand, drawn: Drawn) {
        self.parts.push(Placed { drawn, from, to, stand, second: None });
    }
}
