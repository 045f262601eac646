//! The form with every choice: each topology, control and rectifier, and each option of every other choice, chosen in the window.

use super::*;
use polewright::converter::{self, Reach};
use polewright::design::all_choices;
use polewright::window::Command;

fn choose(harness: &mut Harness<'_, App>, path: &'static str, key: &'static str) {
    harness.state_mut().ask(Command::Choose { path, key });
    harness.run();
}

/// Every row that applies has its field, and the schematic a part for the inductor.
fn form_is_whole(harness: &Harness<'_, App>, told: &str) {
    let session = harness.state().session();
    assert!(session.analysis().is_some_and(|analysis| analysis.shown.is_ok()) || session.stale(), "{told}");
    // Field and part; both name the inductor as its topology does.
    let path = "stage.inductor.inductance";
    let design = session.design();
    let field = design.entries().into_iter().find(|entry| entry.path == path).unwrap().name;
    let sketch = converter::sketch(&design.choices).unwrap();
    let part = sketch.parts.iter().find(|placed| placed.drawn.paths.iter().any(|of| of == path)).unwrap();
    for name in [field, part.drawn.name.as_str()] {
        assert!(harness.query_all_by_label_contains(name).count() >= 1, "{told}: {name}");
    }
}

#[test]
fn every_topology_control_and_rectifier_in_the_form() {
    let options = |path: &str| all_choices().find(|choice| choice.path == path).unwrap().options;
    for topology in converter::registry() {
        let mut harness = usual();
        choose(&mut harness, "stage.topology", topology.key);
        if topology.reach == Reach::BelowInput {
            // The built-in design boosts: its divider and output come down with the topology.
            harness.state_mut().ask(Command::Enter { path: "stage.output.voltage", text: "5".into() });
            harness.state_mut().ask(Command::Enter { path: "compensator.divider.lower", text: "12.1k".into() });
            harness.run();
        }
        for mode in options("control.mode") {
            for rectifier in options("stage.rectifier") {
                choose(&mut harness, "control.mode", mode.key);
                choose(&mut harness, "stage.rectifier", rectifier.key);
                let told = format!("{} {} {}", topology.key, mode.key, rectifier.key);
                assert_eq!(harness.state().session().problems(), [], "{told}");
                form_is_whole(&harness, &told);
            }
        }
    }
}

#[test]
fn every_option_of_every_choice_in_the_form() {
    for choice in all_choices() {
        for option in choice.options {
            let mut harness = usual();
            for (path, key) in [("stage.input-filter", "fitted"), ("stage.output-filter", "fitted")] {
                choose(&mut harness, path, key);
            }
            choose(&mut harness, choice.path, option.key);
            form_is_whole(&harness, &format!("{} {}", choice.path, option.key));
            harness.state_mut().ask(Command::Undo);
            harness.run();
        }
    }
}

#[test]
fn the_list_leads_to_the_field_of_an_entry() {
    let mut harness = usual();
    harness.key_press_modifiers(Modifiers::COMMAND, Key::K);
    harness.run();
    harness.get_by_label("Search a command").type_text("R2");
    harness.run();
    harness.key_press(Key::Enter);
    harness.run();
    let focused = harness.get_all_by_role(Role::TextInput).find(egui_kittest::Node::is_focused);
    focused.expect("a field with the cursor").type_text("4k7");
    harness.run();
    harness.key_press(Key::Enter);
    harness.run();
    assert!((value(&harness, "compensator.r2") - 4.7e3).abs() < 1e-9, "{}", value(&harness, "compensator.r2"));
}
