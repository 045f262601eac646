//! The exact switched stage against independent calculations in Python, remade and compared by CI.
//!
//! *Source*: `tests/reference/orbit.py`: matrix exponentials of hand-written interval equations; nothing there knows this crate. Its
//! results stand beside those of the averaged loops: the plant as an analyser reads it, the greatest multiplier of the closed loop.
//!
//! *Tolerance*: 1e-7 of the plant, 1e-6 of the multiplier: what the printed digits and the reference's own root finding leave.

use crate::common::{assert_absolute, assert_relative, exact_loop};
use crate::reference::{complex, designs, number, numbers};
use polewright::switched::{Quantity, Stability};

const REFERENCES: [&str; 3] = [
    include_str!("../reference/discontinuous.json"),
    include_str!("../reference/current_mode.json"),
    include_str!("../reference/filters.json"),
];

#[test]
fn plants_as_an_analyser_reads_them() {
    for (design, row) in REFERENCES.iter().flat_map(|text| designs(text, |row| row["switched"].is_object())) {
        let wanted = &row["switched"];
        let exact = exact_loop(&design, None);
        assert_relative(&design.title, exact.open.orbit().duty, number(&wanted["duty"]), 1e-9);
        let mut plant = exact.reader(Quantity::Plant).expect("a plant");
        for (f, value) in numbers(&wanted["frequencies_hz"]).into_iter().zip(complex(&wanted["plant"])) {
            let found = plant.at(f).expect("a value");
            let error = (found - value).norm() / value.norm();
            assert!(error < 1e-7, "{} at {f} Hz: {found}, wanted {value}, off by {error:e}", design.title);
        }
    }
}

#[test]
fn multipliers_of_closed_loops() {
    for (design, row) in REFERENCES.iter().flat_map(|text| designs(text, |row| row["switched"].is_object())) {
        let stability = Stability::new(&exact_loop(&design, None).closed).expect("multipliers");
        let wanted = number(&row["switched"]["greatest_closed_multiplier"]);
        assert_absolute(&design.title, stability.growth_per_period(), wanted, 1e-6);
    }
}
