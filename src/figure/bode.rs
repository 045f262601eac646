//! Gain and phase of plant, compensator and loop over frequency, with the margins of the shown condition and its landmarks.

use super::axis::extent;
use super::chart::{Chart, Pen, SMALL, Span, WIDTHS, heading, legend, line, text};
use super::stroke::{Align, Dash, Figure, Mark, Role, Weight};
use crate::analysis::{Analysis, Curves, Detail, Referee};
use crate::quantity::{Unit, print_digits};

/// Which curves a Bode plot shows.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Shown {
    /// Control voltage to output voltage.
    pub plant: bool,
    /// Output voltage to control voltage.
    pub compensator: bool,
    /// Their product.
    pub loop_gain: bool,
    /// Band of the loop gain over the conditions.
    pub band: bool,
}

/// Left, right, top and bottom room around the frames [points].
const ROOM: [f64; 4] = [62.0, 18.0, 76.0, 44.0];
/// Distance between the gain's and the phase's frame [points].
const GAP: f64 = 14.0;
/// Mean width of a letter of a landmark's name [points]; names stand well apart, so an estimate serves.
const LETTER: f64 = 6.0;
/// Gains that are shown at most [dB].
const GAINS: (f64, f64) = (-80.0, 100.0);

/// Bode plot of the shown condition; `held` is what is compared with, by its name. Size in points.
///
/// None when the shown condition has no results.
pub fn bode(
    title: &str,
    analysis: &Analysis,
    (held, exact): (Option<(&str, &Analysis)>, Option<&Referee>),
    shown: Shown,
    size: [f64; 2],
) -> Option<Figure> {
    let detail = analysis.shown.as_ref().ok()?;
    let mut figure = Figure { size, ..Figure::default() };
    let (gain, phase) = charts(&detail.curves, size)?;
    heading(&mut figure, title, &format!("Loop gain at {}", analysis.place()));
    if shown.band {
        bands(&mut figure, analysis, (&gain, &phase));
    }
    for (chart, labels) in [(&gain, false), (&phase, true)] {
        chart.decades(&mut figure, labels);
    }
    gain.levels(&mut figure, Unit::Decibel, Some(20.0), 0.0);
    phase.levels(&mut figure, Unit::Degree, Some(45.0), -180.0);
    landmarks(&mut figure, detail, (&gain, &phase));
    let mut names = Vec::new();
    if let Some((name, held)) = held
        && let Ok(held) = &held.shown
    {
        let pen = Pen { role: Role::Held, width: WIDTHS.1, dash: Dash::Dotted };
        pair(&mut figure, (&gain, &phase), (&held.curves, &held.curves.loop_db, &held.curves.loop_deg), pen);
        names.push((pen, format!("held: {name}")));
    }
    if let Some(exact) = exact {
        names.extend(exact_curves(&mut figure, (&gain, &phase), exact, shown));
    }
    for (wanted, role, name) in [
        (shown.plant, Role::Plant, "plant"),
        (shown.compensator, Role::Compensator, "compensator"),
        (shown.loop_gain, Role::LoopGain, "loop"),
    ] {
        if wanted {
            let (pen, gains, phases) = of(&detail.curves, role);
            pair(&mut figure, (&gain, &phase), (&detail.curves, gains, phases), pen);
            names.push((pen, name.to_owned()));
        }
    }
    gain.frame(&mut figure);
    phase.frame(&mut figure);
    margins(&mut figure, detail, (&gain, &phase));
    if let Some(exact) = exact {
        reach(&mut figure, exact, &gain);
    }
    legend(&mut figure, [size[0] - ROOM[1], ROOM[2] - 14.0], &names);
    Some(figure)
}

/// Width of an exact curve, under the averaged one [points].
pub(super) const EXACT_WIDTH: f64 = 5.5;

/// Exact curves of what is shown, with a word for the legend.
fn exact_curves(figure: &mut Figure, charts: (&Chart, &Chart), exact: &Referee, shown: Shown) -> Option<(Pen, String)> {
    let curves = &exact.curves;
    let pen = |role| Pen { role, width: EXACT_WIDTH, dash: Dash::Solid };
    let of = [
        (shown.plant, Role::ExactPlant, &curves.plant_db, &curves.plant_deg),
        (shown.loop_gain, Role::ExactLoop, &curves.loop_db, &curves.loop_deg),
    ];
    let mut last = None;
    for (_, role, db, deg) in of.into_iter().filter(|(wanted, ..)| *wanted) {
        charts.0.curve(figure, &curves.frequencies_hz, db, pen(role));
        charts.1.curve(figure, &curves.frequencies_hz, deg, pen(role));
        last = Some((pen(role), "exact".to_owned()));
    }
    last
}

/// Up to where the averaged model holds, between gain and phase.
fn reach(figure: &mut Figure, exact: &Referee, gain: &Chart) {
    let [[left, _], [right, bottom]] = gain.corners;
    let Some(hz) = exact.reach.frequency_hz else { return };
    let (x, y) = (f64::from(gain.x.at(hz)).clamp(left, right), bottom + GAP / 2.0);
    let words = match exact.reach.by {
        Some(_) => format!("averaged holds to {}", print_digits(hz, Unit::Hertz, 3)),
        None => "averaged holds throughout".to_owned(),
    };
    // The words stand in the line where they have the room, else behind it.
    let width = LETTER * words.chars().count() as f64;
    let within = x - left > width + 30.0;
    let (end, align) = if within { (x - width - 16.0, Align::End) } else { (x, Align::Start) };
    line(figure, vec![[left, y], [end, y]], Role::Landmark, (1.5, Dash::Solid));
    if gain.x.holds(hz) {
        line(figure, vec![[x, y - 4.5], [x, y + 4.5]], Role::Landmark, (1.5, Dash::Solid));
    }
    let at = [if within { x - 7.0 } else { x + 7.0 }, y];
    text(figure, at, &words, (Role::Quiet, 10.0, Weight::Regular), (align, Align::Middle));
}

fn of(curves: &Curves, role: Role) -> (Pen, &[f64], &[f64]) {
    match role {
        Role::Plant => (Pen { role, width: WIDTHS.1, dash: Dash::Dashed }, &curves.plant_db, &curves.plant_deg),
        Role::Compensator => {
            (Pen { role, width: WIDTHS.1, dash: Dash::DashDot }, &curves.compensator_db, &curves.compensator_deg)
        }
        _ => (Pen { role, width: WIDTHS.0, dash: Dash::Solid }, &curves.loop_db, &curves.loop_deg),
    }
}

fn charts(curves: &Curves, size: [f64; 2]) -> Option<(Chart, Chart)> {
    let (from, to) = (*curves.frequencies_hz.first()?, *curves.frequencies_hz.last()?);
    let [left, right, top, bottom] = ROOM;
    let middle = top + (size[1] - top - bottom - GAP) * 0.54;
    let across = Span::Logarithmic(from, to);
    let gains = curves.plant_db.iter().chain(&curves.compensator_db).chain(&curves.loop_db).copied();
    let (least, greatest) = extent(gains)?;
    let low = ((least / 20.0).floor() * 20.0).clamp(GAINS.0, -20.0);
    let high = ((greatest / 20.0).ceil() * 20.0).clamp(20.0, GAINS.1);
    let gain = Chart::new([[left, top], [size[0] - right, middle]], across, Span::Linear(low, high));
    let phases = curves.plant_deg.iter().chain(&curves.compensator_deg).chain(&curves.loop_deg).copied();
    let (least, greatest) = extent(phases)?;
    let low = (((least - 5.0) / 45.0).floor() * 45.0).clamp(-540.0, -225.0);
    let high = (((greatest + 5.0) / 45.0).ceil() * 45.0).clamp(0.0, 360.0);
    let corners = [[left, middle + GAP], [size[0] - right, size[1] - bottom]];
    Some((gain, Chart::new(corners, across, Span::Linear(low, high))))
}

fn pair(figure: &mut Figure, (gain, phase): (&Chart, &Chart), (curves, db, deg): (&Curves, &[f64], &[f64]), pen: Pen) {
    gain.curve(figure, &curves.frequencies_hz, db, pen);
    phase.curve(figure, &curves.frequencies_hz, deg, pen);
}

/// Least and greatest loop gain and phase over the conditions that have any.
fn bands(figure: &mut Figure, analysis: &Analysis, (gain, phase): (&Chart, &Chart)) {
    let usable: Vec<_> = analysis.conditions.iter().filter_map(|condition| condition.outcome.as_ref().ok()).collect();
    let over = |take: &dyn Fn(usize) -> Option<(f64, f64)>| -> Vec<(f64, f64)> {
        (0..analysis.band_frequencies_hz.len()).map(|k| take(k).unwrap_or((f64::NAN, f64::NAN))).collect()
    };
    let gains = over(&|k| extent(usable.iter().filter_map(|summary| summary.loop_db.get(k).copied())));
    let phases = over(&|k| extent(usable.iter().filter_map(|summary| summary.loop_deg.get(k).copied())));
    gain.band(figure, &analysis.band_frequencies_hz, &gains, Role::Band);
    phase.band(figure, &analysis.band_frequencies_hz, &phases, Role::Band);
}

fn landmarks(figure: &mut Figure, detail: &Detail, (gain, phase): (&Chart, &Chart)) {
    let mut marks: Vec<_> = detail.landmarks.iter().filter(|mark| gain.x.holds(mark.frequency_hz)).collect();
    marks.sort_by(|one, other| one.frequency_hz.total_cmp(&other.frequency_hz));
    let mut taken = [f64::NEG_INFINITY; 2];
    for mark in marks {
        for chart in [gain, phase] {
            chart.vertical(figure, mark.frequency_hz, Role::Landmark, (1.0, Dash::Dotted));
        }
        let half = LETTER * mark.name.chars().count() as f64 / 2.0;
        let x = f64::from(gain.x.at(mark.frequency_hz)).min(figure.size[0] - half - 4.0);
        // Two rows of names; a name that has room in neither is left to its line.
        let Some(row) = taken.iter().position(|end| end + 8.0 < x - half) else { continue };
        taken[row] = x + half;
        let at = [x, 12.0f64.mul_add(row as f64, phase.corners[1][1] + 19.0)];
        text(figure, at, mark.name, (Role::Landmark, 10.0, Weight::Regular), (Align::Middle, Align::Start));
    }
}

/// Crossover, phase margin and gain margin of the shown condition; an unstable loop's stand back, and are called so.
fn margins(figure: &mut Figure, detail: &Detail, (gain, phase): (&Chart, &Chart)) {
    let stable = detail.loop_gain.stable();
    let role = if stable { Role::Good } else { Role::Held };
    let margins = &detail.loop_gain.margins;
    let bold = (role, 12.0, Weight::Bold);
    let up = margins.gain_margin_up_db();
    let of_gain = margins.phase_crossovers.iter().find(|crossing| Some(crossing.gain_margin_db) == up);
    if let Some(crossing) = of_gain.filter(|crossing| gain.x.holds(crossing.frequency_hz)) {
        let (from, to) =
            (gain.at(crossing.frequency_hz, 0.0), gain.at(crossing.frequency_hz, -crossing.gain_margin_db));
        let to = [to[0], to[1].clamp(gain.corners[0][1], gain.corners[1][1])];
        line(figure, vec![from, to], role, (3.0, Dash::Solid));
        let words = print_digits(crossing.gain_margin_db, Unit::Decibel, 3);
        text(figure, [from[0], from[1] - 6.0], &words, bold, (Align::Middle, Align::End));
    }
    if let Some(crossover) = margins.headline_crossover().filter(|c| gain.x.holds(c.frequency_hz)) {
        for chart in [gain, phase] {
            chart.vertical(figure, crossover.frequency_hz, role, (1.2, Dash::Solid));
        }
        let at = gain.at(crossover.frequency_hz, 0.0);
        figure.marks.push(Mark::Circle { centre: at, radius: 4.0, role, width: None });
        let words = print_digits(crossover.frequency_hz, Unit::Hertz, 3);
        text(figure, [at[0] + 8.0, at[1] - 8.0], &words, bold, (Align::Start, Align::End));
        let curves = &detail.curves;
        let after = curves.frequencies_hz.partition_point(|frequency| *frequency < crossover.frequency_hz);
        if let Some(degrees) = curves.loop_deg.get(after).or(curves.loop_deg.last()) {
            // The half turn the margin is measured from is the one nearest to where the curve minus the margin lies.
            let turns = ((degrees - crossover.phase_margin_deg + 180.0) / 360.0).round();
            let foot = turns.mul_add(360.0, -180.0);
            let points = [foot, foot + crossover.phase_margin_deg].map(|deg| phase.at(crossover.frequency_hz, deg));
            let [top, bottom] = [phase.corners[0][1], phase.corners[1][1]];
            let points = points.map(|[x, y]| [x, y.clamp(top, bottom)]);
            line(figure, points.to_vec(), role, (3.0, Dash::Solid));
            let words = print_digits(crossover.phase_margin_deg, Unit::Degree, 3);
            let at = [points[0][0] + 8.0, points[0][1].midpoint(points[1][1])];
            text(figure, at, &words, bold, (Align::Start, Align::Middle));
        }
    }
    if !stable {
        let at = [gain.corners[0][0] + 10.0, gain.corners[1][1] - 8.0];
        let words = (Role::Missed, SMALL + 1.0, Weight::Bold);
        text(figure, at, "the closed loop is not stable", words, (Align::Start, Align::End));
    }
}
