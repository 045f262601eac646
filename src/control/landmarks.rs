//! Landmarks of a stage in current mode: the inductor is no state of its own any more, so its resonance goes, and a low pole
//! and the sampling pair come.

use super::law::{ControlLaw, Controlled, Mode};
use crate::converter::Landmark;
use crate::linear::Zpk;
use std::f64::consts::TAU;

const READ_OFF: &str = "read off the poles of the derived model";

/// The low pole follows from the output bank and the load.
fn low_pole_parts(stage: &[Landmark]) -> Vec<String> {
    let resonance = stage.iter().find(|mark| matches!(mark.key, "lc-resonance" | "low-pole"));
    let capacitances = resonance.into_iter().flat_map(|mark| &mark.parts).filter(|path| path.contains(".bank."));
    capacitances.cloned().chain(["stage.load.nominal".to_owned()]).collect()
}

impl ControlLaw {
    /// The stage's landmarks as this law leaves them; `plant` runs from control to output voltage.
    pub fn landmarks(&self, mut stage: Vec<Landmark>, plant: &Zpk, controlled: &Controlled) -> Vec<Landmark> {
        if matches!(self.mode, Mode::Voltage(_)) {
            return stage;
        }
        let parts = low_pole_parts(&stage);
        // The current loop takes the inductor out of the plant, in either conduction mode.
        stage.retain(|mark| !matches!(mark.key, "lc-resonance" | "second-resonance" | "low-pole" | "second-pole"));
        let lowest = plant.poles.iter().filter(|p| p.im == 0.0 && p.re < 0.0).map(|p| -p.re / TAU);
        if let Some(frequency_hz) = lowest.min_by(f64::total_cmp) {
            let low =
                Landmark { key: "low-pole", name: "Low pole", frequency_hz, formula: READ_OFF, derived: true, parts };
            stage.insert(0, low);
        }
        if let (Some(mark), Some(_)) = (stage.iter_mut().find(|mark| mark.key == "half-switching"), controlled.sampling)
        {
            mark.name = "Sampling pair, ½ fs";
        }
        stage
    }
}
