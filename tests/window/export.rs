//! What leaves the window: pictures, curves, tables.

use eframe::egui;
use egui_kittest::Harness;
use egui_kittest::kittest::Queryable;
use polewright::window::{App, Command, Exported};

use super::{enter, usual};

#[test]
fn plots_and_curves_go_into_files_and_tables_onto_the_clipboard() {
    let folder = tempfile::tempdir().unwrap();
    let mut harness = usual();
    let export = |harness: &mut Harness<'_, App>, what, name: &str| {
        let path = folder.path().join(name);
        harness.state_mut().ask(Command::ExportPath { what, path: path.clone() });
        harness.run();
        (harness.state().message().unwrap().clone(), std::fs::read(path).ok())
    };
    for (what, name) in [(Exported::Bode, "b"), (Exported::Step, "s"), (Exported::Response, "r")] {
        let (message, svg) = export(&mut harness, what, &format!("{name}.svg"));
        assert!(!message.failed, "{}", message.text);
        let svg = String::from_utf8(svg.unwrap()).unwrap();
        assert!(svg.contains("Gimbal rail") && svg.contains("nominal input 12 V"), "{svg}");
        assert!(!svg.contains("NaN") && !svg.contains("inf"));
        let (_, png) = export(&mut harness, what, &format!("{name}.PNG"));
        assert!(png.unwrap().starts_with(b"\x89PNG"));
    }
    let (message, file) = export(&mut harness, Exported::Bode, "b.txt");
    assert!(message.failed && file.is_none() && message.text.contains(".png or .svg"), "{}", message.text);
    let (_, csv) = export(&mut harness, Exported::Curves, "c.csv");
    let csv = String::from_utf8(csv.unwrap()).unwrap();
    let rows = harness.state().session().analysis().unwrap().shown.as_ref().unwrap().curves.frequencies_hz.len();
    assert_eq!(csv.lines().count(), rows + 1);
    for (command, word) in [(Command::CopyParts, "R2"), (Command::CopyMargins, "Phase margin")] {
        harness.state_mut().ask(command);
        harness.step();
        let copied = harness.output().platform_output.commands.iter().find_map(|command| match command {
            egui::OutputCommand::CopyText(text) => Some(text.clone()),
            _ => None,
        });
        assert!(copied.unwrap().contains(word));
    }
    enter(&mut harness, "Inductor", "0");
    let (message, file) = export(&mut harness, Exported::Bode, "stale.svg");
    assert!(message.failed && file.is_none() && message.text.contains("out of date"), "{}", message.text);
}

#[test]
fn the_load_sweep_is_shown_and_saved() {
    let folder = tempfile::tempdir().unwrap();
    let mut harness = usual();
    harness.key_press(egui::Key::F9);
    harness.run();
    harness.get_by_label("Load sweep");
    harness.get_by_label("Close").click();
    harness.run();
    assert!(harness.query_by_label("Load sweep").is_none());
    let path = folder.path().join("sweep.svg");
    harness.state_mut().ask(Command::ExportPath { what: Exported::Sweep, path: path.clone() });
    harness.run();
    let svg = std::fs::read_to_string(path).unwrap();
    assert!(svg.contains("Phase margin") && svg.contains("No discontinuous conduction"));
}
