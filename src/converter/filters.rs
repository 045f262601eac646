//! How the input network and the second-stage output filter are drawn, into the netlist and into the sketch.
//!
//! The input network runs from the ideal source to the stage's input terminals: source resistance, filter inductor with its
//! winding, input capacitor with its ESR, damping branch. It is drawn for the stage and, alone, for its own impedance.

use super::drawing::Options;
use crate::circuit::{CircuitError, Compiled, Drawn, Netlist, Node, PartId, Sketch, Slot, Symbol};
use crate::linear::StateSpace;
use crate::quantity::Choices;

/// Branch that damps the input filter.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Damping {
    /// None but winding and ESR.
    None,
    /// A resistor in series with a capacitor, across the input capacitor.
    Capacitor,
    /// A resistor in series with an inductor, across the filter inductor.
    Inductor,
}

/// What is chosen of the second-stage output filter.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) struct OutputFilter {
    /// A resistor stands across its inductor.
    pub(super) damped: bool,
    /// The regulated voltage is that of the load, behind the filter; else that of the bank.
    pub(super) sensed_at_load: bool,
}

/// The input filter chosen.
pub(super) fn input_filter(choices: &Choices) -> Option<Damping> {
    choices.is("stage.input-filter", "fitted").then(|| match choices.get("stage.input-filter.damping") {
        Some("capacitor") => Damping::Capacitor,
        Some("inductor") => Damping::Inductor,
        _ => Damping::None,
    })
}

/// The output filter chosen.
pub(super) fn output_filter(choices: &Choices) -> Option<OutputFilter> {
    choices.is("stage.output-filter", "fitted").then(|| OutputFilter {
        damped: choices.is("stage.output-filter.damping", "resistor"),
        sensed_at_load: !choices.is("stage.output-filter.sense", "bank"),
    })
}

/// A resistance of the filters that carries a current and so loses power.
#[derive(Clone, Copy, Debug)]
pub(super) struct Lossy {
    /// Where the loss arises.
    pub(super) name: &'static str,
    pub(super) part: PartId,
    pub(super) ohms: Slot,
}

/// What the filters add to a stage: resistances and inductors of their own.
#[derive(Clone, Debug, Default)]
pub(super) struct FilterParts {
    pub(super) lossy: Vec<Lossy>,
    /// Inductors with their names; none carries switched current.
    pub(super) inductors: Vec<(&'static str, PartId)>,
}

impl FilterParts {
    pub(super) fn resistor(
        &mut self,
        netlist: &mut Netlist,
        name: &'static str,
        (from, to): (Node, Node),
        path: &str,
    ) -> PartId {
        let ohms = netlist.slot(path);
        let part = netlist.resistor(name, from, to, ohms);
        self.lossy.push(Lossy { name, part, ohms });
        part
    }
}

/// Where a stage is drawn into.
pub(super) struct Canvas<'a> {
    pub(super) netlist: &'a mut Netlist,
    pub(super) sketch: &'a mut Sketch,
    pub(super) parts: &'a mut FilterParts,
}

/// Draws the input network from the ideal source to the stage's input terminal; the source's current flows in the part returned.
pub(super) fn draw_input_network(canvas: &mut Canvas<'_>, source: Node, options: &Options) -> (Node, PartId) {
    let supply = canvas.netlist.node("supply");
    let end = if options.input_filter.is_some() { canvas.netlist.node("filter") } else { supply };
    let resistance = canvas.netlist.slot("stage.source.resistance");
    let source_resistance = canvas.netlist.resistor("source resistance", source, end, resistance);
    let drawn = Drawn::new(Symbol::Resistor, "Source resistance", "Rs").value("stage.source.resistance");
    canvas.sketch.part(source, end, drawn.wire_at_zero());
    if let Some(damping) = options.input_filter {
        draw_filter_inductor(canvas, (end, supply), damping);
    }
    if options.input_capacitor {
        draw_input_capacitor(canvas, supply);
    }
    if options.input_filter == Some(Damping::Capacitor) {
        draw_damping_capacitor(canvas, supply);
    }
    (supply, source_resistance)
}

fn draw_filter_inductor(canvas: &mut Canvas<'_>, (from, to): (Node, Node), damping: Damping) {
    let inner = canvas.netlist.node("filter winding");
    let henries = canvas.netlist.slot("stage.input-filter.inductance");
    let part = canvas.netlist.inductor(INPUT_INDUCTOR, from, inner, henries);
    canvas.parts.inductors.push((INPUT_INDUCTOR, part));
    canvas.parts.resistor(canvas.netlist, "input filter winding", (inner, to), "stage.input-filter.resistance");
    let drawn = Drawn::new(Symbol::Inductor, "Filter inductor", "Lf")
        .value("stage.input-filter.inductance")
        .quiet("stage.input-filter.resistance")
        .also(&["stage.input-filter"]);
    canvas.sketch.part(from, to, drawn);
    if damping == Damping::Inductor {
        let middle = canvas.netlist.node("filter damping");
        let henries = canvas.netlist.slot("stage.input-filter.damping.inductance");
        let part = canvas.netlist.inductor(DAMPING_INDUCTOR, from, middle, henries);
        canvas.parts.inductors.push((DAMPING_INDUCTOR, part));
        canvas.parts.resistor(canvas.netlist, INPUT_DAMPING, (middle, to), "stage.input-filter.damping.resistance");
        canvas.sketch.over(from, middle, damping_part(Symbol::Inductor, "Damping inductor", "Ld", "inductance"));
        canvas.sketch.over(middle, to, damping_part(Symbol::Resistor, "Damping resistor", "Rd", "resistance"));
    }
}

fn draw_input_capacitor(canvas: &mut Canvas<'_>, supply: Node) {
    let (inner, ground) = (canvas.netlist.node("input capacitor"), canvas.netlist.ground());
    let farads = canvas.netlist.slot("stage.input-capacitor.capacitance");
    canvas.netlist.capacitor("input capacitor", supply, inner, farads);
    canvas.parts.resistor(canvas.netlist, "input capacitor ESR", (inner, ground), "stage.input-capacitor.esr");
    let drawn = Drawn::new(Symbol::Capacitor, "Input capacitor", "Cin")
        .value("stage.input-capacitor.capacitance")
        .quiet("stage.input-capacitor.esr");
    canvas.sketch.part(supply, ground, drawn);
}

fn draw_damping_capacitor(canvas: &mut Canvas<'_>, supply: Node) {
    let (middle, ground) = (canvas.netlist.node("filter damping"), canvas.netlist.ground());
    canvas.parts.resistor(canvas.netlist, INPUT_DAMPING, (supply, middle), "stage.input-filter.damping.resistance");
    let farads = canvas.netlist.slot("stage.input-filter.damping.capacitance");
    canvas.netlist.capacitor("damping capacitor", middle, ground, farads);
    canvas.sketch.down(supply, middle, damping_part(Symbol::Resistor, "Damping resistor", "Rd", "resistance"));
    canvas.sketch.part(middle, ground, damping_part(Symbol::Capacitor, "Damping capacitor", "Cd", "capacitance"));
}

fn damping_part(symbol: Symbol, name: &str, designator: &str, what: &str) -> Drawn {
    let path = format!("stage.input-filter.damping.{what}");
    Drawn::new(symbol, name, designator).value(&path).also(&["stage.input-filter.damping"])
}

/// Draws the second stage behind the bank's terminals and returns the load's.
pub(super) fn draw_output_filter(
    canvas: &mut Canvas<'_>,
    (plus, minus): (Node, Node),
    filter: OutputFilter,
) -> (Node, Node) {
    let end = canvas.netlist.node("load");
    // The inductor stands in the wire that is not the ground; its current counts towards the load, and back from it.
    let inverted = plus.is_ground();
    let (from, to) = if inverted { (end, minus) } else { (plus, end) };
    let inner = canvas.netlist.node("second winding");
    let henries = canvas.netlist.slot("stage.output-filter.inductance");
    let part = canvas.netlist.inductor(OUTPUT_INDUCTOR, from, inner, henries);
    canvas.parts.inductors.push((OUTPUT_INDUCTOR, part));
    canvas.parts.resistor(canvas.netlist, "output filter winding", (inner, to), "stage.output-filter.resistance");
    let (left, right) = if inverted { (minus, end) } else { (plus, end) };
    let drawn = Drawn::new(Symbol::Inductor, "Second inductor", "Lo")
        .value("stage.output-filter.inductance")
        .quiet("stage.output-filter.resistance")
        .also(&["stage.output-filter"]);
    canvas.sketch.part(left, right, drawn);
    if filter.damped {
        let path = "stage.output-filter.damping.resistance";
        canvas.parts.resistor(canvas.netlist, "output filter damping", (from, to), path);
        let drawn = Drawn::new(Symbol::Resistor, "Second damping resistor", "Ro").value(path);
        canvas.sketch.over(left, right, drawn.also(&["stage.output-filter.damping"]));
    }
    let load = if inverted { (plus, end) } else { (end, minus) };
    let inner = canvas.netlist.node("second capacitor");
    let farads = canvas.netlist.slot("stage.output-filter.capacitance");
    canvas.netlist.capacitor("second capacitor", load.0, inner, farads);
    canvas.parts.resistor(canvas.netlist, "second capacitor ESR", (inner, load.1), "stage.output-filter.esr");
    let drawn = Drawn::new(Symbol::Capacitor, "Second capacitor", "Co")
        .value("stage.output-filter.capacitance")
        .quiet("stage.output-filter.esr")
        .also(&["stage.output-filter.sense"]);
    canvas.sketch.part(load.0, load.1, drawn);
    load
}

/// Name of the input filter's inductor.
pub(super) const INPUT_INDUCTOR: &str = "input filter inductor";
/// Name of the inductor of its damping branch.
pub(super) const DAMPING_INDUCTOR: &str = "damping inductor";
/// Name of the output filter's inductor.
pub(super) const OUTPUT_INDUCTOR: &str = "output filter inductor";
/// Name of the input filter's damping resistor.
const INPUT_DAMPING: &str = "input filter damping";

/// Output impedance of an input network alone [V/A]: voltage at the stage's input terminals from a current fed into them, the
/// ideal source being a short.
///
/// # Errors
/// As netlist extraction.
pub(super) fn network_impedance(
    options: &Options,
    lookup: &dyn Fn(&str) -> f64,
) -> Result<Option<StateSpace>, CircuitError> {
    let mut netlist = Netlist::new();
    let current = netlist.input("terminal current");
    let (source, ground) = (netlist.ground(), netlist.ground());
    let mut canvas =
        Canvas { netlist: &mut netlist, sketch: &mut Sketch::default(), parts: &mut FilterParts::default() };
    let (supply, _) = draw_input_network(&mut canvas, source, options);
    netlist.current_source("terminal current", ground, supply, current);
    netlist.voltage_output("terminal voltage", supply, ground);
    let values: Vec<f64> = netlist.slot_names().iter().map(|name| lookup(name)).collect();
    let (e, _) = Compiled::new(&netlist, |_| true, &values)?.equations(&values)?.independent();
    Ok(StateSpace::new(e.a, e.b, e.c, e.d, &["terminal current"], &["terminal voltage"]).ok())
}
