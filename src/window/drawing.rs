//! What is worked out once per analysis so that a frame only has to place it: logarithms, bands, ranges of the axes.

use crate::analysis::{Analysis, Curves};
use crate::figure::axis::extent;

/// Least and greatest loop gain and phase over the conditions that have any, on the band's frequencies.
#[derive(Clone, Debug, Default, PartialEq)]
pub(super) struct Band {
    /// Decimal logarithms of the frequencies [Hz].
    pub log_hz: Vec<f64>,
    /// Least and greatest gain [dB].
    pub gain_db: Vec<(f64, f64)>,
    /// Least and greatest phase [°].
    pub phase_deg: Vec<(f64, f64)>,
}

/// An analysis made ready to be drawn.
#[derive(Clone, Debug, Default, PartialEq)]
pub(super) struct Drawing {
    /// Decimal logarithms of the frequencies of the curves [Hz].
    pub log_hz: Vec<f64>,
    /// The band over the nine conditions.
    pub band: Band,
    /// Gains the gain plot has to show [dB].
    pub gain_range: (f64, f64),
    /// Phases the phase plot has to show [°].
    pub phase_range: (f64, f64),
}

impl Drawing {
    /// Prepares an analysis.
    pub(super) fn new(analysis: &Analysis) -> Self {
        let band = band(analysis);
        let Ok(detail) = &analysis.shown else {
            return Drawing { band, gain_range: (-40.0, 40.0), phase_range: (-180.0, 0.0), ..Drawing::default() };
        };
        let curves = &detail.curves;
        Drawing {
            log_hz: curves.frequencies_hz.iter().map(|frequency| frequency.log10()).collect(),
            gain_range: gain_range(curves),
            phase_range: phase_range(curves),
            band,
        }
    }
}

fn band(analysis: &Analysis) -> Band {
    let mut band = Band {
        log_hz: analysis.band_frequencies_hz.iter().map(|frequency| frequency.log10()).collect(),
        ..Band::default()
    };
    let usable: Vec<_> = analysis.conditions.iter().filter_map(|condition| condition.outcome.as_ref().ok()).collect();
    for index in 0..band.log_hz.len() {
        let gains = usable.iter().filter_map(|summary| summary.loop_db.get(index).copied());
        let phases = usable.iter().filter_map(|summary| summary.loop_deg.get(index).copied());
        match (extent(gains), extent(phases)) {
            (Some(gain), Some(phase)) => {
                band.gain_db.push(gain);
                band.phase_deg.push(phase);
            }
            _ => return Band::default(),
        }
    }
    band
}

/// Range of the gain plot: whole steps of 20 dB around all curves, cut where nobody reads a loop any more [dB].
fn gain_range(curves: &Curves) -> (f64, f64) {
    const MOST: f64 = 100.0;
    const LEAST: f64 = -80.0;
    let all = curves.plant_db.iter().chain(&curves.compensator_db).chain(&curves.loop_db).copied();
    let (least, greatest) = extent(all).unwrap_or((-40.0, 40.0));
    let low = ((least / 20.0).floor() * 20.0).clamp(LEAST, -20.0);
    let high = ((greatest / 20.0).ceil() * 20.0).clamp(20.0, MOST);
    (low, high)
}

/// Range of the phase plot: whole steps of 45° around all curves, half a turn down at least [°].
fn phase_range(curves: &Curves) -> (f64, f64) {
    let all = curves.plant_deg.iter().chain(&curves.compensator_deg).chain(&curves.loop_deg).copied();
    let (least, greatest) = extent(all).unwrap_or((-180.0, 0.0));
    let low = ((least - 5.0) / 45.0).floor() * 45.0;
    let high = ((greatest + 5.0) / 45.0).ceil() * 45.0;
    (low.clamp(-540.0, -225.0), high.clamp(0.0, 360.0))
}
