//! One mode: a configuration of the switches with a side for every limiter, its forces eliminated, ready to be propagated and watched.

use super::flow::{Flow, dot};
use super::plant::{Act, Plant};
use crate::linear::LinearError;
use nalgebra::{DMatrix, RowDVector};

/// Where a limiter stands.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Side {
    /// Within its limits.
    Free,
    /// At its least value.
    Least,
    /// At its greatest value.
    Greatest,
}

/// What a watch tells.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Role {
    /// The comparator trips.
    Comparator,
    /// The current limit trips.
    CurrentLimit,
    /// The rectifier's current has fallen to zero.
    Rectifier,
    /// The rectifier begins to conduct.
    Wake,
    /// A limiter changes its side.
    Limiter(usize),
}

/// A signal that tells when it leaves an interval.
#[derive(Clone, Debug)]
pub(super) struct Watch {
    pub(super) role: Role,
    /// The signal over states and forcing signals.
    pub(super) row: Vec<f64>,
    pub(super) least: f64,
    pub(super) greatest: f64,
    /// The signal after 1, 2, … steps of each table of the flow: one column of steps for each entry of the extended state.
    pub(super) tables: Vec<Vec<f64>>,
}

impl Watch {
    fn new(flow: &Flow, role: Role, row: &[f64], (least, greatest): (f64, f64)) -> Self {
        let (n, m, width) = (flow.n, flow.m, flow.width());
        let tables = flow.tables.iter().enumerate().map(|(t, table)| {
            let mut columns = vec![0.0; width * table.count];
            for step in 1..=table.count {
                let map = flow.map(t, step);
                for (j, column) in map.chunks_exact(flow.stride).enumerate() {
                    let direct = match j {
                        _ if j < n => 0.0,
                        _ if j < n + m => row[j],
                        _ => row[j - m] * table.step * step as f64,
                    };
                    columns[j * table.count + step - 1] = dot(&row[..n], column) + direct;
                }
            }
            columns
        });
        let tables = tables.collect();
        Watch { role, row: row.to_vec(), least, greatest, tables }
    }

    /// Whether a value has left the interval.
    pub(super) fn out(&self, value: f64) -> bool {
        value <= self.least || value >= self.greatest
    }
}

/// What one limiter needs beside its watch.
#[derive(Clone, Debug)]
pub(super) struct Held {
    /// The signal over states and forcing signals; of a sink, what it would take less its level.
    pub(super) signal: Vec<f64>,
    /// Rate of a held signal if nothing held it.
    pub(super) rate: Vec<f64>,
    /// Change of the scaled states that raises a held signal by one.
    pub(super) raise: Vec<f64>,
}

/// A mode.
#[derive(Clone, Debug)]
pub(super) struct Mode {
    pub(super) flow: Flow,
    pub(super) watches: Vec<Watch>,
    /// Those that are looked at now and then only, as bits.
    pub(super) rare: u32,
    /// All probes over states and forcing signals, columns padded.
    pub(super) probes: Vec<f64>,
    /// Length of a column of the probes.
    pub(super) probe_stride: usize,
    pub(super) held: Vec<Held>,
    /// Rate of the rectifier's current if it conducted.
    pub(super) wake: Vec<f64>,
}

/// What is watched in a configuration beside the limiters.
pub(super) struct Watched<'a> {
    /// Roles with their rows among the probes, and the intervals they may stay in.
    pub(super) probes: &'a [(Role, usize, (f64, f64))],
    /// Whether the rectifier's current is watched, and whether its beginning is.
    pub(super) rectifier: bool,
    pub(super) wake: bool,
    /// Rows among the probes that are recorded.
    pub(super) recorded: &'a [usize],
    pub(super) period: f64,
}

impl Mode {
    /// Eliminates the forces.
    pub(super) fn new(plant: &Plant, k: usize, sides: &[Side], watched: &Watched<'_>) -> Result<Self, LinearError> {
        let (n, m) = (plant.n, plant.m);
        let mut rows = plant.rows[k].clone();
        let mut extra = Vec::new();
        for (i, (limiter, side)) in plant.limiters.iter().zip(sides).enumerate() {
            let force = n + m + i;
            let signal: RowDVector<f64> = rows.row(n + plant.probes + i).into_owned();
            let mut rate = RowDVector::zeros(rows.ncols());
            let mut told = signal.clone();
            let mut is = RowDVector::zeros(rows.ncols());
            match limiter.act {
                Act::Hold => {
                    rate = signal.columns(0, n) * rows.rows(0, n);
                    let gain = rate[force];
                    rate[force] = 0.0;
                    if *side != Side::Free {
                        is = &rate * -gain.recip();
                    }
                }
                Act::Saturate => {
                    told[force] = 0.0;
                    let level = if *side == Side::Least { limiter.least } else { limiter.greatest };
                    if *side != Side::Free {
                        is = -&told;
                        // The last forcing signal is the constant one.
                        is[n + m - 1] += level;
                    }
                }
                Act::Sink { siemens, level } => {
                    told *= siemens;
                    told[n + level] -= 1.0;
                    if *side == Side::Free {
                        is = &signal * (siemens / (1.0 - siemens * signal[force]));
                        is[force] = 0.0;
                    } else {
                        is[n + level] = 1.0;
                    }
                }
            }
            let raise: Vec<f64> = rows.column(force).rows(0, n).iter().copied().collect();
            extra.push((told, rate, raise));
            eliminate(&mut rows, &mut extra, force, &is);
        }
        Self::ready(plant, &rows, extra, sides, watched)
    }

    fn ready(
        plant: &Plant,
        rows: &DMatrix<f64>,
        extra: Vec<(RowDVector<f64>, RowDVector<f64>, Vec<f64>)>,
        sides: &[Side],
        watched: &Watched<'_>,
    ) -> Result<Self, LinearError> {
        let (n, m) = (plant.n, plant.m);
        let flow = Flow::new(
            &rows.view((0, 0), (n, n)).into_owned(),
            &rows.view((0, n), (n, m)).into_owned(),
            watched.period,
        )?;
        let over = |row: &RowDVector<f64>| row.iter().take(n + m).copied().collect::<Vec<f64>>();
        let probe = |k: usize| over(&rows.row(n + k).into_owned());
        let mut watches: Vec<Watch> = watched
            .probes
            .iter()
            .map(|(role, row, interval)| {
                let mut row = probe(*row);
                if let (Role::Comparator, Some(ramp)) = (role, plant.ramp) {
                    row[ramp] -= plant.scale[ramp];
                }
                Watch::new(&flow, *role, &row, *interval)
            })
            .collect();
        if let (true, Some(rest)) = (watched.rectifier, &plant.rest) {
            let row: Vec<f64> = rest.iter().copied().chain(std::iter::repeat_n(0.0, m)).collect();
            watches.push(Watch::new(&flow, Role::Rectifier, &row, (0.0, f64::INFINITY)));
        }
        let wake = probe(plant.probes - 1);
        if watched.wake {
            watches.push(Watch::new(&flow, Role::Wake, &wake, (f64::NEG_INFINITY, 0.0)));
        }
        let mut held = Vec::with_capacity(extra.len());
        for (i, ((signal, rate, raise), side)) in extra.into_iter().zip(sides).enumerate() {
            let limiter = &plant.limiters[i];
            let (signal, rate) = (over(&signal), over(&rate));
            let (row, interval) = match (limiter.act, side) {
                (Act::Sink { .. }, Side::Free) => (&signal, (f64::NEG_INFINITY, 0.0)),
                (Act::Sink { .. }, _) => (&signal, (0.0, f64::INFINITY)),
                (Act::Hold, Side::Greatest) => (&rate, (0.0, f64::INFINITY)),
                (Act::Hold, Side::Least) => (&rate, (f64::NEG_INFINITY, 0.0)),
                (Act::Saturate, Side::Greatest) => (&signal, (limiter.greatest, f64::INFINITY)),
                (Act::Saturate, Side::Least) => (&signal, (f64::NEG_INFINITY, limiter.least)),
                (_, Side::Free) => (&signal, (limiter.least, limiter.greatest)),
            };
            if interval.0.is_finite() || interval.1.is_finite() {
                watches.push(Watch::new(&flow, Role::Limiter(i), row, interval));
            }
            let gain = dot(&signal[..n], &raise);
            let raise = raise.iter().map(|v| v / gain).collect();
            held.push(Held { signal, rate, raise });
        }
        let probe_stride = watched.recorded.len().next_multiple_of(4);
        let mut probes = vec![0.0; probe_stride * (n + m)];
        for (r, row) in watched.recorded.iter().enumerate() {
            for (j, value) in probe(*row).into_iter().enumerate() {
                probes[j * probe_stride + r] = value;
            }
        }
        let rare = watches.iter().enumerate().filter(|(_, watch)| matches!(watch.role, Role::Limiter(_)));
        let rare = rare.fold(0, |bits, (k, _)| bits | 1 << k);
        Ok(Mode { flow, watches, rare, probes, probe_stride, held, wake })
    }
}

/// Puts a force's expression in its place everywhere.
fn eliminate(
    rows: &mut DMatrix<f64>,
    extra: &mut [(RowDVector<f64>, RowDVector<f64>, Vec<f64>)],
    force: usize,
    is: &RowDVector<f64>,
) {
    for r in 0..rows.nrows() {
        let factor = rows[(r, force)];
        if factor != 0.0 {
            for (j, value) in is.iter().enumerate() {
                rows[(r, j)] += factor * value;
            }
            rows[(r, force)] = 0.0;
        }
    }
    for (signal, rate, _) in extra {
        for row in [signal, rate] {
            let factor = row[force];
            if factor != 0.0 {
                *row += is * factor;
                row[force] = 0.0;
            }
        }
    }
}
