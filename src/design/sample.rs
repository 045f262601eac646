//! The designs that come with the program: own scenarios, one file each in `sample-designs/`.

use super::Design;
use super::file::{FileError, read};

/// A design that comes with the program.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Sample {
    /// Name of its file.
    pub file: &'static str,
    /// Its title, as in the file.
    pub title: &'static str,
    /// What it shows, in one line.
    pub line: &'static str,
    /// Text of its file.
    pub ron: &'static str,
}

macro_rules! sample {
    ($file:literal, $title:literal, $line:literal) => {
        Sample { file: $file, title: $title, line: $line, ron: include_str!(concat!("../../sample-designs/", $file)) }
    };
}

static ALL: &[Sample] = &[
    sample!("gimbal-rail.ron", "Gimbal rail", "A finished boost, 9 to 16 V in, 24 V out, that meets all it is asked."),
    sample!(
        "sensor-mast.ron",
        "Sensor mast",
        "A buck with ceramic capacitors only, type III, the ramp following the line."
    ),
    sample!(
        "pump-controller.ron",
        "Pump controller",
        "A buck with one large electrolytic capacitor and a type II network."
    ),
    sample!(
        "depth-sounder.ron",
        "Depth sounder",
        "A boost with ceramics beside a polymer capacitor: landmarks read off the model."
    ),
    sample!(
        "trail-radio.ron",
        "Trail radio",
        "A steep boost whose right-half-plane zero comes near the crossover; one requirement is missed."
    ),
    sample!("lamp-driver.ron", "Lamp driver", "A 240 V boost with a diode, and the caution that belongs to it."),
    sample!("negative-rail.ron", "Negative rail", "An inverting buck-boost with a constant-current load."),
    sample!("camera-core.ron", "Camera core", "A synchronous buck around a transconductance amplifier, type II."),
    sample!("clock-oven.ron", "Clock oven", "A slow loop: one capacitor, type I, crossing below the LC resonance."),
    sample!(
        "field-laptop.ron",
        "Field laptop",
        "A buck that feeds a constant-power load through three unlike branches."
    ),
    sample!(
        "weather-buoy.ron",
        "Weather buoy",
        "A buck in peak current mode; at light load its diode lets the current rest."
    ),
    sample!(
        "harbour-light.ron",
        "Harbour light",
        "A boost in peak current mode: no LC resonance, but the right-half-plane zero."
    ),
    sample!(
        "winch-buffer.ron",
        "Winch buffer",
        "A boost in average current mode, a voltage loop around a current loop."
    ),
    sample!(
        "map-table.ron",
        "Map table",
        "A buck in valley current mode, as a data sheet states it: A/V, offset, clamp."
    ),
    sample!(
        "tram-display.ron",
        "Tram display",
        "A buck behind an input filter whose damping keeps it off the converter's impedance."
    ),
    sample!("ultrasound-probe.ron", "Ultrasound probe", "A buck with a second-stage output filter inside the loop."),
    sample!(
        "hive-scale.ron",
        "Hive scale",
        "A buck with a diode that falls into discontinuous conduction when its radio sleeps."
    ),
    sample!(
        "tide-gauge.ron",
        "Tide gauge",
        "A boost whose synchronous switch emulates a diode: both conduction modes in one day's work."
    ),
    sample!(
        "star-tracker.ron",
        "Star tracker",
        "A buck with a difference equation in a microcontroller, coefficients in words of 16 bits."
    ),
    sample!("ferry-gate.ron", "Ferry gate", "An isolated flyback in peak current mode, sensed on the primary side."),
    sample!("market-stall.ron", "Market stall", "A SEPIC whose coupled inductors move the zero pair out of the way."),
    sample!("organ-tuner.ron", "Organ tuner", "A Ćuk whose coupling capacitor is damped by a branch."),
    sample!(
        "ridge-relay.ron",
        "Ridge relay",
        "A four-switch buck-boost: a boost from an empty battery, a buck from the panels."
    ),
    sample!("loom-vision.ron", "Loom vision", "Three interleaved buck phases in peak current mode, 1.2 V at 60 A."),
    sample!("signal-box.ron", "Signal box", "A forward whose magnetising current does the work of slope compensation."),
    sample!("slipway-hoist.ron", "Slipway hoist", "A full bridge from a 390 V bus, two pulses per switching period."),
    sample!(
        "canal-lock.ron",
        "Canal lock",
        "A flyback with isolated feedback, its fast path taken ahead of a second stage."
    ),
    sample!(
        "bench-exercise.ron",
        "Bench exercise, unstable on purpose",
        "An integrator that crosses above the LC resonance, to be mended."
    ),
];

impl Sample {
    /// The design itself.
    ///
    /// # Errors
    /// None in a release: a test reads every sample.
    pub fn design(&self) -> Result<Design, FileError> {
        read(&mut self.ron.as_bytes())
    }
}

/// Every sample, in the order shown.
pub fn all() -> &'static [Sample] {
    ALL
}

/// The design the program opens with.
pub fn built_in() -> Design {
    // A test reads every sample; a broken one would still leave a program that opens.
    ALL.first().and_then(|sample| sample.design().ok()).unwrap_or_default()
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::design::file::write;
    use crate::finding::Severity;
    use std::collections::BTreeSet;

    #[test]
    fn every_sample_can_be_used_and_is_written_as_the_program_writes() {
        for sample in all() {
            let design = sample.design().unwrap_or_else(|error| panic!("{}: {error}", sample.file));
            assert_eq!(design.title, sample.title, "{}", sample.file);
            assert!(!design.notes.is_empty() && !sample.line.is_empty(), "{}", sample.file);
            design.check().unwrap_or_else(|problems| panic!("{}: {problems:?}", sample.file));
            let mut text = Vec::new();
            write(&design, &mut text).expect("written");
            assert_eq!(String::from_utf8(text).expect("UTF-8"), sample.ron, "{}", sample.file);
        }
    }

    #[test]
    fn every_file_is_listed_once() {
        let folder = std::path::Path::new(env!("CARGO_MANIFEST_DIR")).join("sample-designs");
        let name = |entry: std::io::Result<std::fs::DirEntry>| entry.expect("readable").file_name().into_string();
        let files: BTreeSet<String> =
            std::fs::read_dir(folder).expect("there").map(|entry| name(entry).expect("UTF-8")).collect();
        let listed: BTreeSet<String> = all().iter().map(|sample| sample.file.to_owned()).collect();
        assert_eq!(files, listed);
        assert_eq!(listed.len(), all().len());
    }

    #[test]
    fn the_built_in_design_has_nothing_to_remark() {
        let checked = built_in().check().expect("usable");
        assert_eq!(checked.findings, []);
        assert!(checked.requirements.len() >= 8);
    }

    #[test]
    fn high_voltage_is_cautioned_and_its_energy_told() {
        let lamp = all().iter().find(|sample| sample.file == "lamp-driver.ron").expect("listed");
        let design = lamp.design().expect("read");
        let caution = design.check().expect("usable").findings.into_iter().find(|f| f.message.starts_with("Caution"));
        let caution = caution.expect("240 V is above 60 V");
        assert_eq!(caution.severity, Severity::Notice);
        // ½·(2 × 47 µF)·(240.75 V)² = 2.724 J.
        assert!(caution.message.contains("2.724 J"), "{}", caution.message);
        // A forward's open switch holds off twice its 60 V; a full bridge stands on a 420 V bus.
        let high = [lamp.file, "signal-box.ron", "slipway-hoist.ron"];
        for sample in all() {
            let findings = sample.design().expect("read").check().expect("usable").findings;
            let cautioned = findings.iter().any(|f| f.message.starts_with("Caution"));
            assert_eq!(cautioned, high.contains(&sample.file), "{}", sample.file);
        }
    }
}
