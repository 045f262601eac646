//! A converter at rest has at its output what it is charged to, and no current in its inductors, whatever its parts are.

use super::super::loop_model::Shared;
use super::super::result::{Condition, Level};
use super::model::Model;
use crate::analysis::Shown;
use crate::converter;
use crate::design::Design;

/// A stage by topology with some resistances, its input and output apart by a ratio [V/V].
fn stage(topology: &str, ohms: [&str; 3], volts: [&str; 2]) -> Design {
    let mut design = Design::default();
    let rows = [
        ("stage.topology", topology),
        ("stage.rectifier", "synchronous"),
        ("stage.source.resistance", ohms[0]),
        ("stage.switch.resistance", ohms[1]),
        ("stage.inductor.resistance", ohms[2]),
        ("stage.input.least", volts[0]),
        ("stage.input.nominal", volts[0]),
        ("stage.input.greatest", volts[0]),
        ("stage.output.voltage", volts[1]),
        ("stage.load.least", "100m"),
        ("stage.load.nominal", "351.46643733601385m"),
        ("control.duty.greatest", "1"),
    ];
    for (path, text) in rows {
        design.set_from_text(path, text).expect("an entry");
    }
    design
}

#[test]
fn nothing_flows_and_the_output_is_empty() {
    let ohms = [
        ["68m", "120m", "68m"],
        ["10m", "20m", "0"],
        ["33m", "47m", "7m"],
        ["0.1m", "3m", "1m"],
        ["0.123", "5m", "30m"],
    ];
    let mut rested = 0;
    for topology in converter::registry() {
        for volts in [["28.718455470916588", "55.13943450415985"], ["36", "12"], ["12", "5"], ["10", "36"]] {
            for ohms in ohms {
                let Ok(design) = stage(topology.key, ohms, volts).check() else { continue };
                let Ok(shared) = Shared::new(&design) else { continue };
                let condition = Condition::shown(&design.stage, Shown::Levels(Level::Nominal, Level::Nominal));
                let Ok(model) = Model::new(&design, &shared, &condition) else { continue };
                let (x, configuration) = model.system.at_rest(&model.at_rest(0.0));
                let (piece, places) = (model.system.piece(configuration), &model.system.places);
                let held = (piece.c.row(places.stage.load_voltage) * &x)[0];
                assert!(held.abs() < 1e-6, "{} {volts:?} {ohms:?}: {held} V", topology.key);
                for row in &places.inductor_currents {
                    let flows = (piece.c.row(*row) * &x)[0];
                    assert!(flows.abs() < 1e-6, "{} {volts:?} {ohms:?}: {flows} A", topology.key);
                }
                rested += 1;
            }
        }
    }
    assert!(rested > 80, "{rested}");
}
