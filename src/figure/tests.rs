//! Whole registry: schematics of every topology under every choice that draws parts, and of every compensator, keep their rules.

use super::plan::{Item, plan};
use super::{Figure, Mark, Numbers, Place, Point, compensator_schematic, schematic, stage_schematic};
use crate::circuit::{Drawn, Netlist, Node, Sketch, Symbol};
use crate::compensator::Compensator;
use crate::converter;
use crate::design::{self, Design, sample};

/// Widths a column may have [points].
const WIDTHS: [f64; 3] = [200.0, 252.0, 314.0];

/// Width of a text by a measure of its own: seven tenths of its height a letter, half of that where letters are narrow.
fn text_frame(mark: &Mark) -> Option<(String, [Point; 2])> {
    let Mark::Text { at, text, size, align, .. } = mark else { return None };
    let narrow = |c: char| matches!(c, ' ' | '.' | 'i' | 'l' | 'f' | 't' | 'r');
    let letters: f64 = text.chars().map(|c| if narrow(c) { 0.33 } else { 0.64 }).sum();
    let (width, height) = (letters * size, 0.75 * size);
    let start = |at: f64, extent: f64, align: super::Align| match align {
        super::Align::Start => at,
        super::Align::Middle => at - extent / 2.0,
        super::Align::End => at - extent,
    };
    let (left, top) = (start(at[0], width, align.0), start(at[1], height, align.1));
    Some((text.clone(), [[left, top], [left + width, top + height]]))
}

/// Straight pieces of all lines, and the frames of circles and areas as lines.
fn strokes(figure: &Figure) -> Vec<[Point; 2]> {
    let mut all = Vec::new();
    for mark in &figure.marks {
        match mark {
            Mark::Line { points, .. } | Mark::Area { points, .. } => {
                all.extend(points.windows(2).map(|pair| [pair[0], pair[1]]));
            }
            Mark::Circle { centre: [x, y], radius: r, .. } => {
                all.push([[x - r, *y], [x + r, *y]]);
                all.push([[*x, y - r], [*x, y + r]]);
            }
            Mark::Text { .. } => {}
        }
    }
    all
}

fn overlap(one: &[Point; 2], other: &[Point; 2]) -> bool {
    (0..2).all(|k| one[0][k] < other[1][k] - 1e-6 && other[0][k] < one[1][k] - 1e-6)
}

/// Whether a straight piece passes through a frame: sampled, as pieces are short.
fn strikes(piece: &[Point; 2], frame: &[Point; 2]) -> bool {
    (0..=40_u8).any(|k| {
        let share = f64::from(k) / 40.0;
        let point = [0, 1].map(|i| piece[0][i] + share * (piece[1][i] - piece[0][i]));
        (0..2).all(|i| point[i] > frame[0][i] + 0.2 && point[i] < frame[1][i] - 0.2)
    })
}

fn inside(figure: &Figure, point: Point) -> bool {
    (0..2).all(|k| point[k] >= -1e-6 && point[k] <= figure.size[k] + 1e-6 && point[k].is_finite())
}

/// Every end of a line meets another mark, or is the end of a symbol's stroke within its place.
fn keeps_rules(figure: &Figure, what: &str) {
    let texts: Vec<_> = figure.marks.iter().filter_map(text_frame).collect();
    let lines = strokes(figure);
    for (k, (text, frame)) in texts.iter().enumerate() {
        assert!(frame.iter().all(|corner| inside(figure, *corner)), "{what}: {text} leaves the figure");
        for (other, theirs) in &texts[k + 1..] {
            assert!(!overlap(frame, theirs), "{what}: {text} overlaps {other}");
        }
        for piece in &lines {
            assert!(!strikes(piece, frame), "{what}: {text} is struck by {piece:?}");
        }
    }
    for piece in &lines {
        assert!(piece.iter().all(|point| inside(figure, *point)), "{what}: {piece:?} leaves the figure");
    }
    for (k, place) in figure.places.iter().enumerate() {
        assert!(place.corners.iter().all(|corner| inside(figure, *corner)), "{what}: {}", place.name);
        assert!(!place.name.is_empty() && !place.paths.is_empty() && !place.marks.is_empty(), "{what}: {}", place.name);
        for other in &figure.places[k + 1..] {
            assert!(!overlap(&place.corners, &other.corners), "{what}: {} overlaps {}", place.name, other.name);
            assert_ne!(place.name, other.name, "{what}");
        }
    }
    wires_meet(figure, what);
    no_wires_cross(figure, what);
}

/// Marks outside places are wires, dots, terminals and grounds; the ends of long wires lie on something else.
fn wires(figure: &Figure) -> Vec<[Point; 2]> {
    let outside = |k: &usize| !figure.places.iter().any(|place| place.marks.contains(k));
    let of_mark = |mark: &Mark| match mark {
        Mark::Line { points, .. } => points.windows(2).map(|pair| [pair[0], pair[1]]).collect(),
        _ => Vec::new(),
    };
    let all = (0..figure.marks.len()).filter(outside).flat_map(|k| of_mark(&figure.marks[k]));
    all.filter(|[a, b]| (a[0] - b[0]).abs() + (a[1] - b[1]).abs() > 13.0).collect()
}

fn wires_meet(figure: &Figure, what: &str) {
    let lines = strokes(figure);
    for wire in wires(figure) {
        for end in wire {
            let touch = |piece: &[Point; 2]| *piece != wire && distance(end, piece) < 0.3;
            let circles = figure.marks.iter().any(|mark| {
                matches!(mark, Mark::Circle { centre, radius, .. } if (centre[0] - end[0]).hypot(centre[1] - end[1]) < radius + 0.3)
            });
            assert!(circles || lines.iter().any(touch), "{what}: a wire ends in the air at {end:?}");
        }
    }
}

fn distance(point: Point, [from, to]: &[Point; 2]) -> f64 {
    let (dx, dy) = (to[0] - from[0], to[1] - from[1]);
    let length = dx.mul_add(dx, dy * dy);
    let along = ((point[0] - from[0]) * dx + (point[1] - from[1]) * dy) / length.max(1e-12);
    let along = along.clamp(0.0, 1.0);
    (point[0] - from[0] - along * dx).hypot(point[1] - from[1] - along * dy)
}

/// Where an upright and a level wire pass through one another there would be a crossing.
fn no_wires_cross(figure: &Figure, what: &str) {
    let all = wires(figure);
    for one in &all {
        for other in &all {
            let (upright, level) = ((one[0][0] - one[1][0]).abs() < 1e-9, (other[0][1] - other[1][1]).abs() < 1e-9);
            if !upright || !level {
                continue;
            }
            let (x, y) = (one[0][0], other[0][1]);
            let within = |a: f64, b: f64, v: f64| v > a.min(b) + 0.5 && v < a.max(b) - 0.5;
            let cross = within(other[0][0], other[1][0], x) && within(one[0][1], one[1][1], y);
            assert!(!cross, "{what}: wires cross at {x}, {y}");
        }
    }
}

fn numbers(design: &Design) -> Numbers<'_> {
    Numbers { design, condition: None }
}

/// Every design the choices of the stage can make, with values that differ in length.
fn designs() -> Vec<(String, Design)> {
    let mut all = Vec::new();
    for topology in converter::registry() {
        for bank in ["1", "2", "3", "4"] {
            for load in ["resistor", "current", "power"] {
                for rectifier in design::choice("stage.rectifier").unwrap().options {
                    for capacitor in ["none", "fitted"] {
                        let mut design = Design::default();
                        for (path, key) in [
                            ("stage.topology", topology.key),
                            ("stage.bank", bank),
                            ("stage.load", load),
                            ("stage.rectifier", rectifier.key),
                            ("stage.input-capacitor", capacitor),
                        ] {
                            design.set_from_text(path, key).unwrap();
                        }
                        for resistance in [0.0, 0.0125] {
                            design.values.set("stage.source.resistance", resistance).unwrap();
                            design.values.set("stage.bank.1.count", 3.0).unwrap();
                            let what =
                                format!("{} {bank} {load} {} {capacitor} {resistance}", topology.key, rectifier.key);
                            all.push((what, design.clone()));
                        }
                    }
                }
            }
        }
    }
    for sample in sample::all() {
        all.push((sample.file.to_owned(), sample.design().unwrap()));
    }
    all.extend(further());
    all
}

/// Every combination of all other choices of the stage, which add filters and what is not thought of yet; of those that only some
/// topologies have, with these alone.
fn further() -> Vec<(String, Design)> {
    let mut all = Vec::new();
    for topology in converter::registry() {
        for bank in ["1", "4"] {
            for combination in combinations(topology) {
                let mut design = Design::default();
                design.values.set("stage.source.resistance", 0.0125).unwrap();
                for (path, key) in [("stage.topology", topology.key), ("stage.bank", bank)].iter().chain(&combination) {
                    design.set_from_text(path, key).unwrap();
                }
                all.push((format!("{} {bank} {combination:?}", topology.key), design));
            }
        }
    }
    all
}

fn combinations(topology: &converter::Topology) -> Vec<Vec<(&'static str, &'static str)>> {
    let known = ["stage.topology", "stage.bank", "stage.load", "stage.rectifier"];
    let own = |path: &str| topology.choices.iter().any(|choice| choice.path == path);
    let others = converter::choices()
        .iter()
        .filter(|choice| !known.contains(&choice.path) && (converter::is_common(choice.path) || own(choice.path)));
    let mut combinations = vec![Vec::new()];
    for choice in others {
        let each = |chosen: &Vec<(&'static str, &'static str)>| {
            let one = |key| chosen.iter().copied().chain([(choice.path, key)]).collect::<Vec<_>>();
            choice.options.iter().map(|option| one(option.key)).collect::<Vec<_>>()
        };
        combinations = combinations.iter().flat_map(each).collect();
    }
    combinations
}

#[test]
fn stage_schematics_keep_the_rules() {
    for (what, design) in designs() {
        for width in WIDTHS {
            let figure = stage_schematic(&numbers(&design), width).unwrap();
            keeps_rules(&figure, &format!("{what} at {width}"));
        }
    }
}

/// The wire of a node runs along one rail: on both it would be two wires that do not meet.
#[test]
fn every_node_stands_on_one_rail() {
    for (what, design) in designs() {
        let sketch = converter::sketch(&design.choices).unwrap();
        let mut seats: Vec<(Node, bool)> = Vec::new();
        for item in plan(&sketch, |_| false) {
            match item {
                Item::Along { main, .. } => {
                    seats.extend(main.first().map(|seat| (seat.first, true)));
                    seats.extend(main.last().map(|seat| (seat.last, true)));
                }
                Item::Column { chain, second } => {
                    seats.extend(chain.first().map(|seat| (seat.first, true)));
                    seats.extend(chain.last().map(|seat| (seat.last, false)));
                    seats.extend(second.into_iter().flat_map(|w| [(w.upper, true), (w.lower, false)]));
                }
            }
        }
        for (node, upper) in &seats {
            let same = seats.iter().filter(|(other, _)| other == node).all(|(_, rail)| rail == upper);
            assert!(same, "{what}: {node:?} stands on both rails");
        }
    }
}

/// A choice may add entries of parts; whatever applies and can be seen in a circuit stands at some place.
#[test]
fn every_part_with_entries_is_in_the_schematic() {
    for (what, design) in designs() {
        let figure = stage_schematic(&numbers(&design), 252.0).unwrap();
        let stands = |path: &str| figure.places.iter().any(|place: &Place| place.paths.iter().any(|p| p == path));
        for entry in design.entries().iter().filter(|entry| entry.path.starts_with("stage.")) {
            let absent = entry.path == "stage.source.resistance" && design.values.get(entry.path) == Some(0.0);
            assert!(stands(entry.path) != absent, "{what}: {}", entry.path);
        }
    }
}

#[test]
fn compensator_schematics_keep_the_rules_and_have_every_part() {
    for kind in ["1", "2", "3"] {
        for amplifier in ["op-amp", "transconductance"] {
            for feedforward in ["none", "fitted"] {
                let mut design = Design::default();
                design.set_from_text("compensator.type", kind).unwrap();
                design.set_from_text("compensator.amplifier", amplifier).unwrap();
                design.set_from_text("compensator.feedforward-capacitor", feedforward).unwrap();
                for (r2, c1) in [(10e3, 22e-9), (12.34e3, 1e-12)] {
                    design.values.set("compensator.r2", r2).unwrap();
                    design.values.set("compensator.c1", c1).unwrap();
                    let compensator = Compensator::from_values(&design.values, &design.choices).unwrap();
                    let figure = compensator_schematic(&compensator, &numbers(&design));
                    let what = format!("{kind} {amplifier} {feedforward}");
                    keeps_rules(&figure, &what);
                    let stands = |path: &str| figure.places.iter().any(|place| place.paths.iter().any(|p| p == path));
                    for entry in design.entries().iter().filter(|entry| entry.path.starts_with("compensator.")) {
                        assert!(stands(entry.path), "{what}: {}", entry.path);
                    }
                }
            }
        }
    }
}

#[test]
fn schematics_of_isolated_feedback_keep_the_rules_and_have_every_part() {
    for (kind, fast, series) in [
        ("1", "none", "none"),
        ("2", "load", "none"),
        ("2", "bank", "fitted"),
        ("2", "none", "none"),
        ("3", "load", "none"),
        ("3", "bank", "fitted"),
        ("3", "none", "none"),
    ] {
        for (speed, led) in [("pole", 1e3), ("capacitance", 12.34)] {
            let mut design = Design::default();
            for (path, key) in [
                ("compensator.type", kind),
                ("compensator.amplifier", "shunt-regulator"),
                ("compensator.opto.fast-path", fast),
                ("compensator.shunt.series-resistor", series),
                ("compensator.opto.speed", speed),
            ] {
                design.set_from_text(path, key).unwrap();
            }
            design.values.set("compensator.opto.led-resistor", led).unwrap();
            let compensator = Compensator::from_values(&design.values, &design.choices).unwrap();
            let figure = compensator_schematic(&compensator, &numbers(&design));
            let what = format!("{kind} {fast} {series}");
            keeps_rules(&figure, &what);
            let stands = |path: &str| figure.places.iter().any(|place| place.paths.iter().any(|p| p == path));
            for entry in design.entries().iter().filter(|entry| entry.path.starts_with("compensator.")) {
                assert!(stands(entry.path), "{what}: {}", entry.path);
            }
        }
    }
}

#[test]
fn drawings_of_difference_equations_keep_the_rules_and_have_every_entry() {
    for mode in ["voltage", "peak-current", "average-current"] {
        for order in ["2", "3"] {
            for zeros in ["1", "2"] {
                for (bits, frequency) in [(16.0, 300e3), (32.0, 1.234e6), (8.0, 20e3)] {
                    let mut design = Design::default();
                    for (path, key) in [
                        ("compensator.amplifier", "digital"),
                        ("control.mode", mode),
                        ("compensator.digital.order", order),
                        ("compensator.digital.zeros", zeros),
                        ("compensator.digital.method", "tustin-prewarped"),
                    ] {
                        design.set_from_text(path, key).unwrap();
                    }
                    design.values.set("compensator.digital.bits", bits).unwrap();
                    design.values.set("stage.switching-frequency", frequency).unwrap();
                    for lane in ["pole-1", "pole-2", "prewarp"] {
                        design.values.set(&format!("compensator.digital.{lane}"), 0.2 * frequency).unwrap();
                    }
                    let compensator = Compensator::from_values(&design.values, &design.choices).unwrap();
                    let figure = compensator_schematic(&compensator, &numbers(&design));
                    let what = format!("{mode} {order} {zeros} {bits}");
                    keeps_rules(&figure, &what);
                    let stands = |path: &str| figure.places.iter().any(|place| place.paths.iter().any(|p| p == path));
                    for entry in design.entries().iter().filter(|entry| entry.path.starts_with("compensator.")) {
                        assert!(stands(entry.path), "{what}: {}", entry.path);
                    }
                }
            }
        }
    }
}

/// Stages that no topology draws yet: parts over others, chains in columns, a transformer, a capacitor along the rail.
#[test]
fn sketches_of_other_stages_keep_the_rules() {
    let design = Design::default();
    for (what, sketch) in
        [("filters", filters()), ("flyback", isolated(false)), ("forward", isolated(true)), ("sepic", sepic())]
    {
        for width in WIDTHS {
            let figure = schematic(&sketch, &numbers(&design), width);
            keeps_rules(&figure, &format!("{what} at {width}"));
            assert_eq!(figure.places.len(), sketch.parts.len(), "{what}");
        }
    }
}

fn part(symbol: Symbol, name: &str) -> Drawn {
    let path = match symbol {
        Symbol::Inductor => "stage.inductor.inductance",
        Symbol::Capacitor => "stage.bank.1.capacitance",
        Symbol::VoltageSource => "stage.input.nominal",
        _ => "stage.inductor.resistance",
    };
    Drawn::new(symbol, name, name).value(path).quiet("stage.inductor.resistance")
}

fn filters() -> Sketch {
    let mut n = Netlist::new();
    let ground = n.ground();
    let [source, inner, supply, damped, node, output, end] =
        ["a", "b", "c", "d", "e", "f", "g"].map(|name| n.node(name));
    let mut sketch = Sketch::default();
    sketch.part(source, ground, part(Symbol::VoltageSource, "Vin"));
    sketch.part(source, supply, part(Symbol::Inductor, "Lf"));
    sketch.over(source, inner, part(Symbol::Inductor, "Ld"));
    sketch.over(inner, supply, part(Symbol::Resistor, "Rd"));
    sketch.part(supply, ground, part(Symbol::Capacitor, "Cin"));
    sketch.down(supply, damped, part(Symbol::Resistor, "Rx"));
    sketch.part(damped, ground, part(Symbol::Capacitor, "Cx"));
    sketch.part(supply, node, part(Symbol::Switch, "S"));
    sketch.part(ground, node, part(Symbol::Diode, "D"));
    sketch.part(node, output, part(Symbol::Inductor, "L"));
    sketch.part(output, ground, part(Symbol::Capacitor, "C1"));
    sketch.part(output, end, part(Symbol::Inductor, "L2"));
    sketch.part(end, ground, part(Symbol::Capacitor, "C2"));
    sketch.part(end, ground, part(Symbol::CurrentSource, "I"));
    sketch
}

fn isolated(forward: bool) -> Sketch {
    let mut n = Netlist::new();
    let ground = n.ground();
    let [supply, drain, second, node, output] = ["a", "b", "c", "d", "e"].map(|name| n.node(name));
    let mut sketch = Sketch::default();
    sketch.part(supply, ground, part(Symbol::VoltageSource, "Vin"));
    sketch.transformer((supply, drain), (second, ground), part(Symbol::Inductor, "T"));
    sketch.part(ground, drain, part(Symbol::Switch, "S"));
    sketch.part(second, node, part(Symbol::Diode, "D1"));
    if forward {
        sketch.part(ground, node, part(Symbol::Diode, "D2"));
        sketch.part(node, output, part(Symbol::Inductor, "L"));
    }
    let output = if forward { output } else { node };
    sketch.part(output, ground, part(Symbol::Capacitor, "C"));
    sketch.part(output, ground, part(Symbol::Resistor, "R"));
    sketch
}

fn sepic() -> Sketch {
    let mut n = Netlist::new();
    let ground = n.ground();
    let [supply, drain, second, output] = ["a", "b", "c", "d"].map(|name| n.node(name));
    let mut sketch = Sketch::default();
    sketch.part(supply, ground, part(Symbol::VoltageSource, "Vin"));
    sketch.part(supply, drain, part(Symbol::Inductor, "L1"));
    sketch.part(ground, drain, part(Symbol::Switch, "S"));
    sketch.part(drain, second, part(Symbol::Capacitor, "Cs"));
    sketch.part(second, ground, part(Symbol::Inductor, "L2"));
    sketch.part(second, output, part(Symbol::Diode, "D"));
    sketch.part(output, ground, part(Symbol::Capacitor, "C"));
    sketch.part(output, ground, part(Symbol::Resistor, "R"));
    sketch
}
