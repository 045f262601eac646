//! Symbols of parts, each on its axis with terminals at equal distance from its centre.
//!
//! *Source*: shapes after IEC 60617 as commonly drawn: rectangular resistor, inductor of four arcs, two plates, triangle with bar;
//! sources as circles with their polarity or the arrow of their current; switches as insulated-gate transistors.

use std::f64::consts::PI;

use super::pen::{Frame, LINE, Pen};
use super::stroke::Point;
use crate::circuit::Symbol;

/// Distance of a terminal from the centre [points].
pub(super) const HALF: f64 = 13.0;

/// Direction from a part's first node to its second.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Way {
    Right,
    Left,
    Down,
    Up,
}

impl Way {
    fn upright(self) -> bool {
        matches!(self, Way::Down | Way::Up)
    }

    /// A place beside a centre: `u` along the direction, `v` to the lower or left side of the axis.
    fn at(self, centre: Point, u: f64, v: f64) -> Point {
        let [x, y] = centre;
        match self {
            Way::Right => [x + u, y + v],
            Way::Left => [x - u, y + v],
            Way::Down => [x - v, y + u],
            Way::Up => [x - v, y - u],
        }
    }
}

/// Extent beside the axis, on the upper or right side and on the lower or left side [points].
fn sides(symbol: Symbol) -> (f64, f64) {
    match symbol {
        Symbol::Resistor => (4.5, 4.5),
        Symbol::Inductor => (5.0, 1.5),
        Symbol::Capacitor => (7.2, 7.2),
        Symbol::VoltageSource | Symbol::CurrentSource => (10.0, 10.0),
        Symbol::Switch => (1.5, 11.5),
        Symbol::Diode => (6.0, 6.0),
    }
}

/// The symbol's frame about its centre, terminals included.
pub(super) fn frame(symbol: Symbol, way: Way) -> Frame {
    let (upper, lower) = sides(symbol);
    if way.upright() { Frame::new(-lower, -HALF, upper, HALF) } else { Frame::new(-HALF, -upper, HALF, lower) }
}

/// Draws a symbol with the leads to its terminals.
pub(super) fn draw(pen: &mut Pen, symbol: Symbol, centre: Point, way: Way) {
    let at = |u: f64, v: f64| way.at(centre, u, v);
    let leads = |pen: &mut Pen, from: f64, to: f64| {
        pen.line(&[at(-HALF, 0.0), at(from, 0.0)]);
        pen.line(&[at(to, 0.0), at(HALF, 0.0)]);
    };
    match symbol {
        Symbol::Resistor => {
            leads(pen, -9.5, 9.5);
            pen.line(&[at(-9.5, -3.8), at(9.5, -3.8), at(9.5, 3.8), at(-9.5, 3.8), at(-9.5, -3.8)]);
        }
        Symbol::Inductor => inductor(pen, &at),
        Symbol::Capacitor => {
            leads(pen, -2.1, 2.1);
            for u in [-2.1, 2.1] {
                pen.thick(&[at(u, -6.8), at(u, 6.8)], LINE * 1.35);
            }
        }
        Symbol::VoltageSource => {
            leads(pen, -9.0, 9.0);
            pen.circle(centre, 9.0);
            polarity(pen, &at);
        }
        Symbol::CurrentSource => {
            leads(pen, -9.0, 9.0);
            pen.circle(centre, 9.0);
            pen.line(&[at(-6.0, 0.0), at(3.0, 0.0)]);
            pen.area(vec![at(6.2, 0.0), at(1.2, -2.8), at(1.2, 2.8)]);
        }
        Symbol::Diode => {
            pen.line(&[at(-HALF, 0.0), at(HALF, 0.0)]);
            pen.line(&[at(-5.0, -5.4), at(5.0, 0.0), at(-5.0, 5.4), at(-5.0, -5.4)]);
            pen.line(&[at(5.0, -5.4), at(5.0, 5.4)]);
        }
        Symbol::Switch => transistor(pen, &at),
    }
}

/// The dot of a coupled inductor, beside its first terminal.
pub(super) fn dot(pen: &mut Pen, centre: Point, way: Way) {
    pen.dot(way.at(centre, -HALF - 0.5, -4.6));
}

/// The winding of a transformer, its terminals above and below; it bulges towards the core.
pub(super) fn winding(pen: &mut Pen, centre: Point, core_at_right: bool) {
    let side = if core_at_right { 1.0 } else { -1.0 };
    inductor(pen, &|u, v| [centre[0] - side * v, centre[1] + u]);
}

/// Four half circles on the axis.
fn inductor(pen: &mut Pen, at: &dyn Fn(f64, f64) -> Point) {
    let mut points = vec![at(-HALF, 0.0)];
    for turn in 0..4_u8 {
        let middle = 6.0f64.mul_add(f64::from(turn), -9.0);
        points.extend((0..=10_u8).map(|step| {
            let angle = PI * f64::from(step) / 10.0;
            at(3.0f64.mul_add(-angle.cos(), middle), -4.4 * angle.sin())
        }));
    }
    points.push(at(HALF, 0.0));
    pen.line(&points);
}

/// Plus at the first terminal, minus at the second; the strokes of both lie level whatever the direction.
fn polarity(pen: &mut Pen, at: &dyn Fn(f64, f64) -> Point) {
    let (plus, minus) = (at(-4.2, 0.0), at(4.2, 0.0));
    for [x, y] in [plus, minus] {
        pen.line(&[[x - 2.2, y], [x + 2.2, y]]);
    }
    pen.line(&[[plus[0], plus[1] - 2.2], [plus[0], plus[1] + 2.2]]);
}

/// An enhancement-type n-channel transistor: source at the first terminal, so that its body conducts to the second.
fn transistor(pen: &mut Pen, at: &dyn Fn(f64, f64) -> Point) {
    pen.line(&[at(-HALF, 0.0), at(-6.5, 0.0), at(-6.5, 6.0)]);
    pen.line(&[at(HALF, 0.0), at(6.5, 0.0), at(6.5, 6.0)]);
    pen.line(&[at(-6.5, 0.0), at(0.0, 0.0), at(0.0, 2.0)]);
    pen.area(vec![at(0.0, 6.0), at(-2.3, 1.6), at(2.3, 1.6)]);
    for u in [-6.5, 0.0, 6.5] {
        pen.thick(&[at(u - 2.3, 6.0), at(u + 2.3, 6.0)], LINE * 1.2);
    }
    pen.line(&[at(8.0, 9.0), at(-6.5, 9.0), at(-6.5, 11.5)]);
}
