//! The averaged stage in discontinuous conduction: the switched current is a pulse that starts and ends at zero.
//!
//! *Method*: the full-order averaged model. Of the states x = x0 + v·s only the switched current s follows the switches;
//! x0 = P·x moves little within a period T. The pulse rises over d·T with the slope m1 to 2h and falls over d2·T, so while
//! it lasts the states average to x1 = x0 + v·h:
//!
//! - h = d·T·m1/2, with m1 = c·(Aon·x1 + Bon·u), which is solved for m1 because x1 holds h itself;
//! - the average is s = (d + d2)·h, which gives d2 from the states: no algebraic current, no state lost;
//! - x' = d·(Aon·x1 + Bon·u) + d2·(Aoff·x1 + Boff·u) + (1 − d − d2)·(Aidle·x0 + Bidle·u), and the outputs alike.
//!
//! At d + d2 = 1 these are the equations of continuous conduction. Derivatives are exact, never differences.
//! *Source*: Sun, Mitchell, Greuel, Krein & Bass, IEEE Trans. Power Electronics 16 (2001), 101 (from memory): full-order model
//! with corrected averages, there for one inductor; here for whatever current stops.
//! *Valid* below about a third of the switching frequency.

use super::operating_point::Solution;
use super::signals::{INPUTS, OUTPUTS};
use super::stage::{Intervals, with_duty};
use crate::circuit::StateEquations;
use crate::linear::StateSpace;
use nalgebra::allocator::Allocator;
use nalgebra::{DMatrix, DVector, DefaultAllocator, Dim, OMatrix, RowDVector};

/// The switched current of one period in discontinuous conduction, and the states about it.
#[derive(Clone, Debug)]
pub(super) struct Pulse {
    /// Average while it lasts, half its peak [A].
    pub(super) half: f64,
    /// Slope while the switch conducts [A/s].
    pub(super) on_slope: f64,
    /// Fraction of the period in which the rectifier conducts.
    pub(super) second_duty: f64,
    /// States averaged over the pulse.
    pub(super) conducting: DVector<f64>,
    /// States while nothing conducts.
    pub(super) resting: DVector<f64>,
}

/// How a number answers states, inputs and duty ratio.
struct Derivative {
    x: RowDVector<f64>,
    u: RowDVector<f64>,
    duty: f64,
}

/// A vector averaged over the period, and how it answers states, inputs and duty ratio.
pub(super) struct Averaged {
    pub(super) value: DVector<f64>,
    pub(super) x: DMatrix<f64>,
    pub(super) u: DMatrix<f64>,
    pub(super) duty: DVector<f64>,
}

/// A pair of matrices that act on states and inputs.
type Pair = (DMatrix<f64>, DMatrix<f64>);

/// Below this share of the magnitudes it was summed from, an entry counts as cancelled to zero. What is left of it would
/// be a path from duty ratio to output that does not exist, and zeros of the plant far beyond all frequencies.
const CANCELLED: f64 = 1e-10;

/// A sum whose cancelled entries are exactly zero.
fn total<R: Dim, C: Dim, const N: usize>(terms: &[OMatrix<f64, R, C>; N]) -> OMatrix<f64, R, C>
where
    DefaultAllocator: Allocator<R, C>,
{
    let mut magnitude = terms[0].abs();
    let mut sum = terms[0].clone();
    for term in &terms[1..] {
        sum += term;
        magnitude += term.abs();
    }
    sum.zip_apply(&magnitude, |value, magnitude| {
        if value.abs() <= CANCELLED * magnitude {
            *value = 0.0;
        }
    });
    sum
}

impl Intervals {
    /// The pulse at averaged states and a duty ratio; none where the current would not rise.
    pub(super) fn pulse(&self, period: f64, duty: f64, x: &DVector<f64>) -> Option<Pulse> {
        let (c, v) = (&self.cell.c, &self.cell.v);
        let resting = &self.cell.rest * x;
        let drive = (c * (&self.on.a * &resting + &self.on.b * &self.inputs))[0];
        let on_slope = drive / (1.0 - duty * period * self.decay() / 2.0);
        let half = duty * period * on_slope / 2.0;
        if !(half.is_finite() && half > 0.0) {
            return None;
        }
        let second_duty = (c * x)[0] / half - duty;
        let conducting = &resting + v * half;
        Some(Pulse { half, on_slope, second_duty, conducting, resting })
    }

    /// How the switched current's slope answers it while the switch conducts [1/s], not positive.
    fn decay(&self) -> f64 {
        (&self.cell.c * &self.on.a * &self.cell.v)[0]
    }

    /// Derivatives of half the peak and of the second duty ratio.
    fn pulse_derivatives(&self, period: f64, duty: f64, pulse: &Pulse) -> [Derivative; 2] {
        let c = &self.cell.c;
        let share = 2.0 - duty * period * self.decay();
        let gain = duty * period / share;
        let half = Derivative {
            x: c * &self.on.a * &self.cell.rest * gain,
            u: c * &self.on.b * gain,
            duty: 2.0 * pulse.half / (duty * share),
        };
        let turns = -(duty + pulse.second_duty) / pulse.half;
        let second =
            Derivative { x: c / pulse.half + &half.x * turns, u: &half.u * turns, duty: half.duty * turns - 1.0 };
        [half, second]
    }

    /// The average over the period of what the three intervals make of states and inputs.
    fn average(&self, duty: f64, pulse: &Pulse, [half, second]: &[Derivative; 2], parts: &[Pair; 3]) -> Averaged {
        let [on, off, idle] = parts;
        let v = &self.cell.v;
        // What an interval makes of its states beyond what the rest makes of them: as changes of the equations, because the
        // values themselves are nearly alike.
        let beyond = |(a, b): &Pair| {
            let (by_states, by_inputs) = (total(&[a.clone(), -&idle.0]), total(&[b.clone(), -&idle.1]));
            by_states * &pulse.resting + by_inputs * &self.inputs + a * v * pulse.half
        };
        let (first, traded) = (beyond(on), beyond(off));
        let rest = 1.0 - duty - pulse.second_duty;
        let during = &on.0 * duty + &off.0 * pulse.second_duty;
        let lifted = &during * v;
        Averaged {
            value: &first * duty + &traded * pulse.second_duty + &idle.0 * &pulse.resting + &idle.1 * &self.inputs,
            x: total(&[(&during + &idle.0 * rest) * &self.cell.rest, &lifted * &half.x, &traded * &second.x]),
            u: total(&[
                &on.1 * duty + &off.1 * pulse.second_duty + &idle.1 * rest,
                &lifted * &half.u,
                &traded * &second.u,
            ]),
            duty: total(&[first, lifted * half.duty, traded * second.duty]),
        }
    }

    /// Rates of the states, and the output rows asked for.
    pub(super) fn pulse_averages(&self, period: f64, duty: f64, pulse: &Pulse, rows: &[usize]) -> [Averaged; 2] {
        let derivatives = self.pulse_derivatives(period, duty, pulse);
        let equations = [&self.on, &self.off, &self.cell.idle];
        let rates = equations.map(|e: &StateEquations| (e.a.clone(), e.b.clone()));
        let outputs = equations.map(|e| (e.c.select_rows(rows), e.d.select_rows(rows)));
        [rates, outputs].map(|parts| self.average(duty, pulse, &derivatives, &parts))
    }

    /// The stage linearised about a point in discontinuous conduction, with the output rows asked for ahead of switched
    /// current, slope difference and slope.
    pub(super) fn linearise_pulse(
        &self,
        solution: &Solution,
        pulse: &Pulse,
        rows: &[usize],
        period: f64,
    ) -> Option<StateSpace> {
        let duty = solution.duty;
        let [rates, outputs] = self.pulse_averages(period, duty, pulse, rows);
        let [half, _] = self.pulse_derivatives(period, duty, pulse);
        let c = &self.cell.c;
        let (turn, push) = (c * (&self.on.a - &self.off.a), c * (&self.on.b - &self.off.b));
        let lifted = (&turn * &self.cell.v)[0];
        let (natural_x, natural_u) = self.natural_rows();
        let natural = (&natural_x * &self.cell.v)[0];
        // m1 = 2h/(d·T).
        let slope = 2.0 / (duty * period);
        let own = [
            Derivative { x: c.clone(), u: RowDVector::zeros(rates.u.ncols()), duty: 0.0 },
            Derivative {
                x: &turn * &self.cell.rest + &half.x * lifted,
                u: push + &half.u * lifted,
                duty: half.duty * lifted,
            },
            Derivative { x: &half.x * slope, u: &half.u * slope, duty: half.duty * slope - pulse.on_slope / duty },
            Derivative {
                x: &natural_x * &self.cell.rest + &half.x * natural,
                u: natural_u + &half.u * natural,
                duty: half.duty * natural,
            },
        ];
        let below = rows.len();
        let stack = |top: &DMatrix<f64>, row: fn(&Derivative) -> &RowDVector<f64>| {
            DMatrix::from_fn(below + own.len(), top.ncols(), |r, k| {
                if r < below { top[(r, k)] } else { row(&own[r - below])[k] }
            })
        };
        let jump =
            DVector::from_fn(below + own.len(), |r, _| if r < below { outputs.duty[r] } else { own[r - below].duty });
        let c = stack(&outputs.x, |d| &d.x);
        let d = with_duty(&jump, &stack(&outputs.u, |d| &d.u));
        StateSpace::new(rates.x, with_duty(&rates.duty, &rates.u), c, d, &INPUTS, &OUTPUTS).ok()
    }
}
