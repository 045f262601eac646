//! A walk through every view and dialog: nothing unnamed, a value where there is one, a focus that is seen; every command by name.

use super::*;
use eframe::egui::accesskit::{Action, Role as NodeRole};
use egui_kittest::kittest::NodeT;
use polewright::window::{Command, Exported, Page, command_names};

/// A stop of the walk: its name, and what leads there from a window on the built-in design.
struct Stop {
    name: &'static str,
    reach: fn(&mut Harness<'_, App>),
}

/// Every view and dialog. Whoever adds one adds its line here.
const STOPS: &[Stop] = &[
    Stop { name: "the plots", reach: |_| {} },
    Stop { name: "all sections of the form", reach: |harness| unfold(harness) },
    Stop { name: "held curves", reach: |harness| ask(harness, Command::Hold) },
    Stop { name: "the list of commands", reach: |harness| ask(harness, Command::ListCommands) },
    Stop { name: "open", reach: |harness| ask(harness, Command::Open) },
    Stop { name: "a new design", reach: |harness| ask(harness, Command::NewDesign) },
    Stop { name: "a picture to export", reach: |harness| ask(harness, Command::Export(Exported::Bode)) },
    Stop { name: "the load sweep", reach: |harness| ask(harness, Command::SweepLoad) },
    Stop { name: "curves to export", reach: |harness| ask(harness, Command::Export(Exported::Curves)) },
    Stop { name: "what was left unsaved", reach: |harness| ask(harness, Command::FindUnsaved) },
    Stop { name: "the review", reach: |harness| ask(harness, Command::Review) },
    Stop {
        name: "the review of a held try",
        reach: |harness| {
            ask(harness, Command::Hold);
            enter(harness, "Inductor", "15u");
            ask(harness, Command::Hold);
            ask(harness, Command::Review);
            let number = harness.state().session().tries()[0].number;
            ask(harness, Command::ReviewTry(Some(number)));
        },
    },
    Stop {
        name: "a file that changed on disk",
        reach: |harness| {
            let folder = tempfile::tempdir().unwrap();
            let path = folder.path().join("design.ron");
            ask(harness, Command::SavePath(path.clone()));
            enter(harness, "Inductor", "12u");
            let text = std::fs::read_to_string(&path).unwrap().replace("Gimbal rail", "Gimbal rail of another");
            std::fs::write(&path, text).unwrap();
            ask(harness, Command::Save);
        },
    },
    Stop { name: "save as", reach: |harness| ask(harness, Command::SaveAs) },
    Stop {
        name: "unsaved changes",
        reach: |harness| {
            enter(harness, "Inductor", "12u");
            ask(harness, Command::Quit);
        },
    },
    Stop { name: "a failure told", reach: |harness| ask(harness, Command::OpenPath("/no/such/file.ron".into())) },
    Stop { name: "text that is no number", reach: |harness| enter(harness, "Inductor", "ten micro") },
    Stop { name: "an unusable value", reach: |harness| enter(harness, "Inductor", "-3u") },
    Stop { name: "a missed requirement with its remedies", reach: |harness| enter(harness, "Output", "30") },
    Stop {
        name: "an impossible placement",
        reach: |harness| {
            field(harness, "Crossover aimed at").focus();
            harness.run();
            field(harness, "Crossover aimed at").type_text("1M");
            harness.run();
            harness.get_by_label("Place by K factor").click_accesskit();
            harness.run();
        },
    },
    Stop { name: "the nine conditions", reach: |harness| press(harness, "Operating condition shown") },
    Stop { name: "the menu of the design", reach: |harness| press(harness, "Design") },
    Stop { name: "the menu of changes", reach: |harness| press(harness, "Edit") },
    Stop { name: "the menu of the view", reach: |harness| press(harness, "View") },
    Stop {
        name: "the samples",
        reach: |harness| {
            press(harness, "Design");
            press(harness, "Samples");
        },
    },
    Stop {
        name: "what can be exported",
        reach: |harness| {
            press(harness, "Design");
            press(harness, "Copy and export");
        },
    },
    Stop { name: "a list of options", reach: |harness| press(harness, "Topology") },
    Stop {
        name: "a lane's number being typed",
        reach: |harness| {
            let name = format!("Type {}", lane_name(harness, "zero-1"));
            press(harness, &name);
        },
    },
    Stop { name: "the waveforms", reach: |harness| ask(harness, Command::Page(Page::Waveforms)) },
    Stop { name: "the transient", reach: |harness| ask(harness, Command::Page(Page::Transient)) },
    Stop { name: "a transient to export", reach: |harness| ask(harness, Command::Export(Exported::Transient)) },
    Stop { name: "the line step", reach: |harness| press(harness, "Line step") },
    Stop { name: "the line to the output", reach: |harness| press(harness, "Line to output") },
    Stop {
        name: "the columns put away",
        reach: |harness| {
            ask(harness, Command::ToggleStage);
            ask(harness, Command::ToggleReadouts);
        },
    },
];

fn ask(harness: &mut Harness<'_, App>, command: Command) {
    harness.state_mut().ask(command);
    harness.run();
}

fn press(harness: &mut Harness<'_, App>, label: &str) {
    let found =
        harness.get_all_by_label(label).find(|node| node.accesskit_node().data().supports_action(Action::Focus));
    found.unwrap().click_accesskit();
    harness.run();
}

/// Opens every section that can be folded.
fn unfold(harness: &mut Harness<'_, App>) {
    for heading in ["Requirements", "Steps", "Divider, amplifier, anchor"] {
        press(harness, heading);
    }
}

/// Roles that hold something: they must say what.
fn holds_a_value(role: NodeRole) -> bool {
    matches!(role, NodeRole::TextInput | NodeRole::Slider | NodeRole::SpinButton | NodeRole::ComboBox)
}

#[test]
fn the_walk_finds_nothing_unnamed() {
    for stop in STOPS {
        let mut harness = usual();
        (stop.reach)(&mut harness);
        harness.check_accessibility();
        let mut controls = 0;
        for node in harness.root().children_recursive().map(|node| node.accesskit_node()) {
            let data = node.data();
            if !data.supports_action(Action::Focus) {
                continue;
            }
            controls += 1;
            let (label, hint) = (node.label().unwrap_or_default(), data.placeholder().unwrap_or_default());
            let place = node.raw_bounds();
            assert!(
                !label.trim().is_empty() || !hint.trim().is_empty(),
                "{}: {:?} at {place:?}",
                stop.name,
                node.role()
            );
            let value = node.value().is_some() || node.numeric_value().is_some() || !hint.is_empty();
            assert!(value || !holds_a_value(node.role()), "{}: “{label}” has no value", stop.name);
        }
        assert!(controls > 3, "{}: only {controls} controls", stop.name);
    }
}

/// Whatever can have the keyboard looks otherwise when it has it.
#[test]
fn the_focus_is_seen_everywhere() {
    let mut focused = 0;
    for stop in STOPS {
        let mut harness = window(vec2(1280.0, 1600.0), 1.0);
        (stop.reach)(&mut harness);
        harness.run_steps(2);
        let focusable = |harness: &Harness<'_, App>| -> Vec<_> {
            let nodes = harness.root().children_recursive().map(|node| node.accesskit_node());
            nodes
                .filter(|node| node.data().supports_action(Action::Focus) && !node.is_disabled())
                .map(|node| node.id())
                .collect()
        };
        let ids = focusable(&harness);
        let mut last: Option<(String, _)> = None;
        for id in ids {
            let Some(node) = harness.root().children_recursive().find(|node| node.accesskit_node().id() == id) else {
                continue;
            };
            let name = node.accesskit_node().label().unwrap_or_default();
            node.focus();
            harness.run_steps(2);
            // Behind a dialog nothing can have it.
            let has =
                |node: &egui_kittest::Node<'_>| node.accesskit_node().id() == id && node.accesskit_node().is_focused();
            if !harness.root().children_recursive().any(|node| has(&node)) {
                continue;
            }
            let shapes = harness.output().shapes.clone();
            if let Some((before, old)) = &last {
                assert!(*old != shapes, "{}: “{name}” looks as if “{before}” still had the focus", stop.name);
            }
            focused += 1;
            last = Some((name, shapes));
        }
    }
    assert!(focused > 20 * STOPS.len(), "only {focused} controls had the keyboard");
}

#[test]
fn every_command_is_reached_by_its_name() {
    for name in command_names() {
        let mut harness = usual();
        ask(&mut harness, Command::ListCommands);
        let in_list = harness.get_all_by_label(name).last().unwrap();
        in_list.click_accesskit();
        harness.run();
        let open = harness.query_by_label("Search a command").is_some();
        assert_eq!(open, name == "All commands…", "{name}: the list closes, whatever else opens");
        // And from its menu, by the same name.
        let found = [&["Design"][..], &["Design", "Copy and export"], &["Edit"], &["View"]].iter().any(|menus| {
            let mut harness = usual();
            menus.iter().for_each(|menu| press(&mut harness, menu));
            harness.query_all_by_label(name).count() > usize::from(matches!(name, "Undo" | "Redo"))
        });
        assert!(found, "{name} is in no menu");
    }
}
