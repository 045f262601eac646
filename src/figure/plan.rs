//! A sketch sorted into what stands along the rail and what stands in columns, from source to load.
//!
//! Nodes that are joined by a wire count as one.

use crate::circuit::{Node, Placed, Sketch, Stand};

/// A part in its seat; `first` is its left or upper node.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Seat {
    /// Index of the part in the sketch.
    pub(super) part: usize,
    /// True when the part's own first node is at the right or lower end.
    pub(super) flipped: bool,
    pub(super) first: Node,
    pub(super) last: Node,
}

/// What takes a place of its own between source and load.
#[derive(Clone, Debug, PartialEq)]
pub(super) enum Item {
    /// Parts on the rail, and those over them on a line of their own.
    Along { main: Vec<Seat>, over: Vec<Seat> },
    /// Parts one below the other; a second winding beside the first part.
    Column { chain: Vec<Seat>, second: Option<Winding> },
}

/// The second winding of a transformer.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Winding {
    pub(super) upper: Node,
    pub(super) lower: Node,
    /// True when its dot is at the lower end.
    pub(super) turned: bool,
}

/// Sorts the parts; those for which `wire` says so are wires.
pub(super) fn plan(sketch: &Sketch, wire: impl Fn(&Placed) -> bool) -> Vec<Item> {
    let mut plan = Plan { lows: sketch.lows.clone(), ..Plan::default() };
    let (wires, parts): (Vec<_>, Vec<_>) = sketch.parts.iter().enumerate().partition(|(_, placed)| wire(placed));
    for (_, placed) in wires {
        plan.join(placed.from, placed.to);
    }
    for (part, placed) in parts {
        plan.seat(part, placed);
    }
    plan.items
}

#[derive(Debug, Default)]
struct Plan {
    items: Vec<Item>,
    seen: Vec<Node>,
    joined: Vec<(Node, Node)>,
    /// Nodes on the ground rail beside the ground.
    lows: Vec<Node>,
}

impl Plan {
    fn join(&mut self, one: Node, other: Node) {
        let (one, other) = (self.node(one), self.node(other));
        if one != other {
            // The ground stays the ground.
            let pair = if one.is_ground() { (other, one) } else { (one, other) };
            self.joined.push(pair);
        }
    }

    /// The node that stands for all that are joined with this one.
    fn node(&self, node: Node) -> Node {
        let mut node = node;
        while let Some((_, to)) = self.joined.iter().find(|(from, _)| *from == node) {
            node = *to;
        }
        node
    }

    fn low(&self, node: Node) -> bool {
        node.is_ground() || self.lows.contains(&node)
    }

    fn seat(&mut self, part: usize, placed: &Placed) {
        let (from, to) = (self.node(placed.from), self.node(placed.to));
        let straight = Seat { part, flipped: false, first: from, last: to };
        let turned = Seat { part, flipped: true, first: to, last: from };
        match placed.stand {
            Stand::Down => self.down(straight, turned, placed),
            Stand::Along => self.along(straight, turned),
            Stand::Over => self.over(straight, turned),
        }
        self.seen.extend([from, to]);
    }

    fn down(&mut self, straight: Seat, turned: Seat, placed: &Placed) {
        let ends = self.lows.clone();
        let lows = |node: Node| node.is_ground() || ends.contains(&node);
        if let Some(Item::Column { chain, .. }) = self.items.last_mut()
            && let Some(end) = chain.last().map(|seat| seat.last).filter(|end| !lows(*end))
            && let Some(seat) = [straight, turned].into_iter().find(|seat| seat.first == end)
        {
            chain.push(seat);
            return;
        }
        let upside_down = self.low(straight.first)
            || (!self.low(straight.last) && self.seen.contains(&straight.last) && !self.seen.contains(&straight.first));
        let second = placed.second.map(|(first, last)| {
            let (first, last) = (self.node(first), self.node(last));
            // An end on the ground rail stands below, wherever the dot is.
            let turned = self.low(first) && !self.low(last);
            let (upper, lower) = if turned { (last, first) } else { (first, last) };
            Winding { upper, lower, turned }
        });
        self.seen.extend(second.iter().flat_map(|winding| [winding.upper, winding.lower]));
        self.items.push(Item::Column { chain: vec![if upside_down { turned } else { straight }], second });
    }

    fn along(&mut self, straight: Seat, turned: Seat) {
        let turn = self.seen.contains(&straight.last) && !self.seen.contains(&straight.first);
        self.items.push(Item::Along { main: vec![if turn { turned } else { straight }], over: Vec::new() });
    }

    /// Puts a part over the parts along the rail it is parallel to: those from its first node on, or the chain over them.
    fn over(&mut self, straight: Seat, turned: Seat) {
        if let Some(Item::Along { over, .. }) = self.items.last_mut()
            && let Some(end) = over.last().map(|seat| seat.last)
            && let Some(seat) = [straight, turned].into_iter().find(|seat| seat.first == end)
        {
            over.push(seat);
            return;
        }
        let begins = |item: &Item, node: Node| matches!(item, Item::Along { main, .. } if main.first().is_some_and(|seat| seat.first == node));
        let run = self.items.iter().rev().take_while(|item| matches!(item, Item::Along { .. })).count();
        let start = self.items.len() - run;
        for seat in [straight, turned] {
            if let Some(at) = (start..self.items.len()).find(|at| begins(&self.items[*at], seat.first)) {
                let mut whole = Vec::new();
                for item in self.items.drain(at..) {
                    if let Item::Along { main, .. } = item {
                        whole.extend(main);
                    }
                }
                self.items.push(Item::Along { main: whole, over: vec![seat] });
                return;
            }
        }
        self.along(straight, turned);
    }
}
