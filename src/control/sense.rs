//! The current sense of peak and valley current mode: gain, filter, offset and compensating ramp.
//!
//! *Conventions*: everything is referred to the control voltage. `ohms` are volts of control per ampere, the ramp at the
//! comparator is divided by the divider; the steady control voltage is the sensed current at the comparator's instant, a
//! delay before the switch node follows, plus the ramp there (peak) or less it (valley).

use super::law::Edge;
use super::rested::Rested;
use super::sampling::{Interval, Sampling, opposing_slope, sensed_slope};
use crate::converter::{Conduction, OperatingPoint};
use crate::finding::{Finding, Remedy};
use crate::quantity::{Choices, Unit, print};

/// How the compensating ramp is stated.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Slope {
    /// Slope at the comparator [V/s].
    Rate(f64),
    /// Share of the slope it works against, at the nominal condition.
    Share(f64),
    /// Quality factor of the sampling pair at the nominal condition.
    Quality(f64),
}

/// The current sense with usable values.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct CurrentSense {
    /// Control voltage per ampere of the switch's current, or of the switched one where it was referred to that
    /// [V/A].
    pub ohms: f64,
    /// Time constant of the sense filter [s]; 0 for none.
    pub filter_s: f64,
    /// Comparator's volts per volt of control voltage.
    pub divider: f64,
    /// Control voltage of no current [V].
    pub offset: f64,
    /// Compensating ramp.
    pub slope: Slope,
    /// How long after the clock's edge the comparator is blind [s].
    pub blanking_s: f64,
    /// Shortest time the switch conducts [s].
    pub on_time_least_s: f64,
}

impl CurrentSense {
    /// From entered values; `get` reads the control's rows.
    pub(super) fn read(get: impl Fn(&str) -> f64, choices: &Choices) -> Self {
        let divider = get("control.sense.divider");
        let ohms = if choices.is("control.sense", "transconductance") {
            1.0 / get("control.sense.transconductance")
        } else {
            get("control.sense.gain") / divider
        };
        let slope = match choices.get("control.slope") {
            Some("rate") => Slope::Rate(get("control.slope.rate")),
            Some("share") => Slope::Share(get("control.slope.share")),
            _ => Slope::Quality(get("control.slope.quality")),
        };
        CurrentSense {
            ohms,
            filter_s: get("control.sense.filter"),
            divider,
            offset: get("control.sense.offset"),
            slope,
            blanking_s: get("control.blanking"),
            on_time_least_s: get("control.on-time.least"),
        }
    }

    /// The same sense as it acts on the switched current at an operating point: the switch carries so many times that one.
    #[must_use]
    pub(super) fn referred(&self, point: &OperatingPoint) -> Self {
        CurrentSense { ohms: self.ohms * point.sense_ratio, ..*self }
    }

    /// Comparator's volts per ampere, as of `ohms` [V/A].
    pub fn comparator_ohms(&self) -> f64 {
        self.ohms * self.divider
    }

    /// Compensating ramp at the comparator [V/s]; zero until it is settled.
    pub fn ramp(&self) -> f64 {
        if let Slope::Rate(rate) = self.slope { rate } else { 0.0 }
    }

    /// The ramp as amperes of sensed current per second [A/s].
    pub(super) fn ramp_amperes(&self) -> f64 {
        self.ramp() / self.comparator_ohms()
    }

    /// The same with the ramp that the sensed current has of its own [A/s]: only the switch carries a magnetising current, so
    /// only a peak has it.
    pub(super) fn ramp_at(&self, edge: Edge, point: &OperatingPoint) -> f64 {
        self.ramp_amperes() + edge.natural(point)
    }

    pub(super) fn unsettled(&self) -> bool {
        !matches!(self.slope, Slope::Rate(_))
    }

    /// Settles the ramp by the nominal condition.
    pub(super) fn settle(&mut self, edge: Edge, nominal: &OperatingPoint, period: f64, delay: f64) {
        let amperes = match self.slope {
            Slope::Rate(_) => return,
            Slope::Share(share) => share * opposing_slope(edge, nominal),
            Slope::Quality(quality) => {
                let difference = nominal.on_slope - nominal.off_slope;
                // The share of continuous conduction, also where the nominal condition is discontinuous.
                let share = opposing_slope(edge, nominal) / difference;
                let whole = self.interval_of(share, period, delay).ramp_for(quality, difference);
                (whole - edge.natural(nominal)).max(0.0)
            }
        };
        self.slope = Slope::Rate(amperes * self.comparator_ohms());
    }

    fn interval_of(&self, share: f64, period: f64, delay: f64) -> Interval {
        Interval { share, period, delay, filter: self.filter_s }
    }

    /// The sensed interval at an operating point.
    pub(super) fn interval(&self, edge: Edge, point: &OperatingPoint, period: f64, delay: f64) -> Interval {
        self.interval_of(edge.share(point.duty), period, delay)
    }

    /// The sampling figures; none in discontinuous conduction, where every period starts anew.
    pub(super) fn sampling(&self, edge: Edge, point: &OperatingPoint, period: f64, delay: f64) -> Option<Sampling> {
        let interval = self.interval(edge, point, period, delay);
        (point.conduction != Conduction::Discontinuous)
            .then(|| Sampling::new(&interval, edge, point, self.ramp_amperes(), self.comparator_ohms()))
    }

    /// Control voltage that holds an operating point [V].
    pub(super) fn control_voltage(&self, edge: Edge, point: &OperatingPoint, period: f64, delay: f64) -> f64 {
        let interval = self.interval(edge, point, period, delay);
        let ramp = self.ramp_at(edge, point) * (interval.share * period - delay);
        let amperes = match (point.conduction, edge) {
            (Conduction::Discontinuous, Edge::Peak) => Rested::new(self, point, period, delay).sensed() + ramp,
            // The current has come to rest; the ramp alone meets the control voltage.
            (Conduction::Discontinuous, Edge::Valley) => -ramp,
            _ => {
                let difference = point.on_slope - point.off_slope;
                let slope = sensed_slope(edge, point);
                let sensed = point.switched_current.average - delay * slope;
                sensed + edge.sign() * (interval.ripple() * difference + ramp)
            }
        };
        self.offset + self.ohms * amperes
    }

    /// Swing of sensed current and ramp over a period, as control voltage [V].
    pub(super) fn swing(&self, edge: Edge, point: &OperatingPoint, period: f64) -> f64 {
        let time = edge.share(point.duty) * period;
        self.ohms * (sensed_slope(edge, point).abs() + self.ramp_at(edge, point)) * time
    }

    /// Problems between entries.
    pub(super) fn problems(&self, clamp: Option<f64>, switching_frequency: Option<f64>) -> Vec<Finding> {
        let mut problems = Vec::new();
        if let Some(clamp) = clamp.filter(|clamp| *clamp <= self.offset) {
            problems.push(clamp_too_low(clamp, self.offset));
        }
        let Some(period) = switching_frequency.filter(|f| *f > 0.0).map(f64::recip) else { return problems };
        for (path, name, time) in [
            ("control.blanking", "Blanking", self.blanking_s),
            ("control.on-time.least", "Least on-time", self.on_time_least_s),
        ] {
            if time >= period {
                let message = format!(
                    "{name}, {}, must be below the switching period, {}.",
                    print(time, Unit::Second),
                    print(period, Unit::Second)
                );
                problems.push(Finding::problem(path, message).with_hint("times within a period are some 100 ns"));
            }
        }
        problems
    }
}

/// A clamp that lets no current through.
pub(super) fn clamp_too_low(clamp: f64, nothing: f64) -> Finding {
    let message = format!(
        "The control voltage clamp, {}, must be above the control voltage of no current, {}.",
        print(clamp, Unit::Volt),
        print(nothing, Unit::Volt)
    );
    Finding::problem("control.clamp", message)
        .with_hint("enter the data sheet's greatest control voltage, or leave it empty")
}

impl Edge {
    /// Share of the period of the interval whose end the comparator decides.
    pub(super) fn share(self, duty: f64) -> f64 {
        match self {
            Edge::Peak => duty,
            Edge::Valley => 1.0 - duty,
        }
    }

    /// Ramp that the sensed current has of its own, in amperes of switched current [A/s].
    pub(super) fn natural(self, point: &OperatingPoint) -> f64 {
        match self {
            Edge::Peak => point.natural_ramp,
            Edge::Valley => 0.0,
        }
    }

    /// +1 where the ripple adds to the average, −1 where it takes away.
    pub(super) fn sign(self) -> f64 {
        match self {
            Edge::Peak => 1.0,
            Edge::Valley => -1.0,
        }
    }
}

/// A change that sets the compensating ramp [V/s at the comparator].
pub fn ramp_remedy(rate: f64, label: String) -> Remedy {
    Remedy {
        label,
        values: vec![("control.slope.rate".to_owned(), rate)],
        choices: vec![("control.slope".to_owned(), "rate".to_owned())],
    }
}
