//! Landmarks of a stage in current mode: the inductor is no state of its own any more, so its resonance goes, and a low pole
//! and the sampling pair come.

use super::law::{ControlLaw, Controlled, Mode};
use crate::converter::Landmark;
use crate::linear::Zpk;
use std::f64::consts::TAU;

const READ_OFF: &str = "read off the poles of the derived model";

impl ControlLaw {
    /// The stage's landmarks as this law leaves them; `plant` runs from control to output voltage.
    pub fn landmarks(&self, mut stage: Vec<Landmark>, plant: &Zpk, controlled: &Controlled) -> Vec<Landmark> {
        if matches!(self.mode, Mode::Voltage(_)) {
            return stage;
        }
        // Without the inductor's resonance, the load discharges the bank.
        let resonance = stage.iter().find(|mark| mark.key == "lc-resonance");
        let bank = resonance.into_iter().flat_map(|mark| &mark.parts).filter(|path| path.ends_with(".capacitance"));
        let parts: Vec<String> = bank.cloned().chain(["stage.load.nominal".to_owned()]).collect();
        stage.retain(|mark| mark.key != "lc-resonance");
        let lowest = plant.poles.iter().filter(|p| p.im == 0.0 && p.re < 0.0).map(|p| -p.re / TAU);
        if let Some(frequency_hz) = lowest.min_by(f64::total_cmp) {
            let (key, name) = ("low-pole", "Low pole");
            stage.insert(0, Landmark { key, name, frequency_hz, formula: READ_OFF, derived: true, parts });
        }
        if let (Some(mark), Some(_)) = (stage.iter_mut().find(|mark| mark.key == "half-switching"), controlled.sampling)
        {
            mark.name = "Sampling pair, ½ fs";
        }
        stage
    }
}
