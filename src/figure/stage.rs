//! The schematic of a power stage, from the sketch that its topology recorded.

use super::ladder::{Block, Heights, Ladder, Manner, Spot, WINDINGS, ladder};
use super::pen::{Pen, finished};
use super::plan::{Item, Winding, plan};
use super::stroke::{Figure, Place};
use super::symbol::{self, HALF};
use super::values::{Numbers, Words};
use crate::circuit::{Drawn, Node, Placed, Sketch};
use crate::converter;

/// How far a drawing may be wider than wished before its words stand elsewhere: shrunk by as much they can still be read.
const OVER: f64 = 1.08;

/// The schematic of a design's stage for a wished width [points]; wider where its parts need more. None for an unknown topology.
pub fn stage_schematic(numbers: &Numbers<'_>, width: f64) -> Option<Figure> {
    Some(schematic(&converter::sketch(&numbers.design.choices)?, numbers, width))
}

/// The schematic of a sketch for a wished width [points].
pub fn schematic(sketch: &Sketch, numbers: &Numbers<'_>, width: f64) -> Figure {
    let wire = |placed: &Placed| {
        placed.drawn.wire_at_zero && placed.drawn.value.as_ref().is_some_and(|value| numbers.is_zero(value))
    };
    let items = plan(sketch, wire);
    let words: Vec<Words> = sketch.parts.iter().map(|placed| Words::of(&placed.drawn, numbers)).collect();
    let terse: Vec<Words> = words.iter().map(Words::value_alone).collect();
    let words_in = |manner| if manner == Manner::Tight { &terse } else { &words };
    // In a drawing that full, designators and lesser numbers would leave no room to read the values.
    let tried = Manner::ALL.map(|manner| (manner, ladder(&items, sketch, words_in(manner), manner, width)));
    let fits = tried.iter().position(|(_, ladder)| ladder.frame.right - ladder.frame.left <= width * OVER);
    let [.., last] = &tried;
    let (manner, ladder) = fits.map_or(last, |at| &tried[at]);
    paint(sketch, &items, words_in(*manner), ladder)
}

/// Terminals of one node on one rail.
struct Reach {
    node: Node,
    xs: Vec<f64>,
}

/// Terminals of the nodes of both rails.
#[derive(Default)]
struct Rails {
    upper: Vec<Reach>,
    lower: Vec<Reach>,
}

fn reach(rail: &mut Vec<Reach>, node: Node, x: f64) {
    match rail.iter_mut().find(|reach| reach.node == node) {
        Some(reach) => reach.xs.push(x),
        None => rail.push(Reach { node, xs: vec![x] }),
    }
}

fn paint(sketch: &Sketch, items: &[Item], words: &[Words], ladder: &Ladder) -> Figure {
    let mut pen = Pen::default();
    wires(&mut pen, items, ladder);
    let mut places = Vec::new();
    for ((item, block), x) in items.iter().zip(&ladder.blocks).zip(&ladder.places) {
        let second = if let Item::Column { second, .. } = item { *second } else { None };
        for (k, spot) in block.spots.iter().enumerate() {
            let start = pen.marks.len();
            part(
                &mut pen,
                &sketch.parts[spot.seat.part].drawn,
                spot,
                *x,
                second.filter(|_| k == 0).map(|winding| (winding, ladder.heights)),
            );
            places.push(Place {
                name: words[spot.seat.part].name.clone(),
                corners: spot.place.moved(*x, 0.0).corners(),
                paths: sketch.parts[spot.seat.part].drawn.paths.clone(),
                marks: start..pen.marks.len(),
            });
        }
    }
    finished(pen.marks, places, ladder.frame)
}

/// One part with its words; a transformer's comes with its second winding and the rails.
fn part(pen: &mut Pen, drawn: &Drawn, spot: &Spot, x: f64, second: Option<(Winding, Heights)>) {
    let centre = [x + spot.centre[0], spot.centre[1]];
    match second {
        Some((second, heights)) => transformer(pen, centre, spot.seat.flipped, second, heights),
        None => symbol::draw(pen, drawn.symbol, centre, spot.way),
    }
    if drawn.dotted {
        symbol::dot(pen, centre, spot.way);
    }
    for (label, at, align) in &spot.labels {
        pen.label(label, [x + at[0], at[1]], *align);
    }
    if let Some([from, to]) = spot.leader {
        pen.leader(&[[x + from[0], from[1]], [x + to[0], to[1]]]);
    }
}

/// All wires, junctions and the ground symbol.
fn wires(pen: &mut Pen, items: &[Item], ladder: &Ladder) {
    let mut rails = Rails::default();
    for ((item, block), x) in items.iter().zip(&ladder.blocks).zip(&ladder.places) {
        match item {
            Item::Along { main, over } => {
                along_wires(pen, &mut rails, (main.len(), over.len()), block, *x, ladder.heights);
            }
            Item::Column { chain, second } => {
                column_wires(pen, block, *x, ladder.heights);
                let ends = chain.first().zip(chain.last()).map(|(first, last)| (first.first, last.last));
                for ((first, last), x) in
                    ends.map(|ends| (ends, *x)).into_iter().chain(second.map(|s| ((s.upper, s.lower), x + WINDINGS)))
                {
                    reach(&mut rails.upper, first, x);
                    reach(&mut rails.lower, last, x);
                }
            }
        }
    }
    rail_wires(pen, &rails.upper, ladder.heights.rail);
    rail_wires(pen, &rails.lower, ladder.heights.ground);
    ground(pen, &rails.lower, ladder);
}

/// Wires between the parts of an item on the rail, and round the parts over them.
fn along_wires(
    pen: &mut Pen,
    rails: &mut Rails,
    (main, over): (usize, usize),
    block: &Block,
    x: f64,
    heights: Heights,
) {
    let (on_rail, above) = block.spots.split_at(block.over_from);
    for (spots, count, y) in [(on_rail, main, heights.rail), (above, over, heights.over)] {
        let ends: Vec<f64> =
            spots.iter().take(count).flat_map(|spot| [x + spot.centre[0] - HALF, x + spot.centre[0] + HALF]).collect();
        let (Some(first), Some(last)) = (ends.first(), ends.last()) else { continue };
        pen.line(&[[x - block.half, y], [*first, y]]);
        pen.line(&[[*last, y], [x + block.half, y]]);
        for pair in ends[1..ends.len() - 1].chunks(2) {
            if let [from, to] = pair {
                pen.line(&[[*from, y], [*to, y]]);
            }
        }
    }
    if over > 0 {
        for side in [x - block.half, x + block.half] {
            pen.line(&[[side, heights.over], [side, heights.rail]]);
            pen.dot([side, heights.rail]);
        }
    }
    let ends = on_rail.first().zip(on_rail.last());
    if let Some((first, last)) = ends {
        reach(&mut rails.upper, first.seat.first, x - block.half);
        reach(&mut rails.upper, last.seat.last, x + block.half);
    }
}

/// Wires from rail to rail through the parts of a column.
fn column_wires(pen: &mut Pen, block: &Block, x: f64, heights: Heights) {
    let mut y = heights.rail;
    for spot in &block.spots {
        pen.line(&[[x, y], [x, spot.centre[1] - HALF]]);
        y = spot.centre[1] + HALF;
    }
    pen.line(&[[x, y], [x, heights.ground]]);
}

/// The wire of each node along its rail, with dots where columns meet it between its ends.
fn rail_wires(pen: &mut Pen, rail: &[Reach], y: f64) {
    for Reach { xs, .. } in rail {
        let (least, most) = xs.iter().fold((f64::INFINITY, f64::NEG_INFINITY), |(a, b), x| (a.min(*x), b.max(*x)));
        if most > least {
            pen.line(&[[least, y], [most, y]]);
        }
        for x in xs.iter().filter(|x| **x > least + 0.1 && **x < most - 0.1) {
            pen.dot([*x, y]);
        }
    }
}

/// The ground symbol under the first column, where that reaches the ground.
fn ground(pen: &mut Pen, lower: &[Reach], ladder: &Ladder) {
    let Some(reach) = lower.iter().find(|reach| reach.node.is_ground()) else { return };
    let x = reach.xs.iter().copied().fold(f64::INFINITY, f64::min);
    if ladder.places.first() == Some(&x) {
        pen.ground([x, ladder.heights.ground]);
        if reach.xs.len() > 1 {
            pen.dot([x, ladder.heights.ground]);
        }
    }
}

/// Two windings with their core and the dots of their first ends.
fn transformer(pen: &mut Pen, centre: [f64; 2], first_turned: bool, second: Winding, heights: Heights) {
    let [x, y] = centre;
    symbol::winding(pen, centre, true);
    symbol::winding(pen, [x + WINDINGS, y], false);
    for side in [x + 8.5, x + 12.5] {
        pen.line(&[[side, y - HALF], [side, y + HALF]]);
    }
    for (side, turned) in [(x - 4.0, first_turned), (x + WINDINGS + 4.0, second.turned)] {
        let end = HALF - 3.0;
        pen.dot([side, if turned { y + end } else { y - end }]);
    }
    pen.line(&[[x + WINDINGS, heights.rail], [x + WINDINGS, y - HALF]]);
    pen.line(&[[x + WINDINGS, y + HALF], [x + WINDINGS, heights.ground]]);
}
