//! The exact side in the window: its curves and margins, the waveforms, and the transient on its worker.

use eframe::egui::{Key, Role, vec2};
use egui_kittest::Harness;
use egui_kittest::kittest::{NodeT, Queryable};
use polewright::analysis::{Level, TransientEvent, Wave, WaveKind};
use polewright::window::{App, Command, Exported, Page};

use super::{enter, usual, window};

fn ask(harness: &mut Harness<'_, App>, command: Command) {
    harness.state_mut().ask(command);
    harness.run();
}

/// The words that begin so.
fn labelled<'h>(harness: &'h Harness<'_, App>, begin: &'h str) -> egui_kittest::Node<'h> {
    harness.get_by(move |node| node.role() == Role::Label && node.value().is_some_and(|words| words.starts_with(begin)))
}

/// Steps until the run under way has ended; nothing is timed, a run that never ends hangs the test.
fn finish(harness: &mut Harness<'_, App>) {
    harness.run();
    while harness.state().transient_runs() {
        harness.step();
        std::thread::yield_now();
    }
    harness.run();
}

#[test]
fn exact_margins_stand_beside_the_averaged_ones_and_follow_a_lane() {
    let mut harness = usual();
    let margin = |harness: &Harness<'_, App>| {
        let exact = harness.state().session().referee().unwrap().as_ref().unwrap();
        exact.margins.headline_crossover().unwrap().phase_margin_deg
    };
    let before = margin(&harness);
    let said = |harness: &Harness<'_, App>| {
        let node = harness.get_by_role_and_label(Role::Button, "Phase margin");
        node.accesskit_node().value().unwrap()
    };
    assert!(said(&harness).contains(&format!("exact {before:.1}°")), "{}", said(&harness));
    let name = super::lane_name(&harness, "pole-2");
    harness.get_by_label(name).focus();
    harness.run();
    (0..4).for_each(|_| harness.key_press(Key::ArrowLeft));
    harness.run();
    assert!((margin(&harness) - before).abs() > 0.1, "the exact margin follows");
    // Switched off, nothing of it is worked out or shown.
    ask(&mut harness, Command::ToggleExact);
    assert!(harness.state().session().referee().is_none());
    assert!(!said(&harness).contains("exact"));
    harness.get_by_label("Exact curves").click();
    harness.run();
    assert!(harness.state().session().referee().is_some());
}

#[test]
fn the_reach_of_the_averaged_model_is_marked_and_explained() {
    let harness = usual();
    let reach = harness.state().session().referee().unwrap().as_ref().unwrap().reach;
    let label = labelled(&harness, "Up to");
    assert!(reach.frequency_hz.is_some() && label.rect().width() > 20.0);
    let gain = harness.state().gain_rect();
    assert!(gain.left() < label.rect().left() && label.rect().right() < gain.right() + 2.0);
}

#[test]
fn exact_results_of_an_unusable_design_stay_and_stand_back() {
    let mut harness = usual();
    let before = harness.state().session().referee().unwrap().as_ref().unwrap().margins.clone();
    enter(&mut harness, "Inductor", "0");
    assert!(harness.state().session().stale());
    assert_eq!(harness.state().session().referee().unwrap().as_ref().unwrap().margins, before);
}

#[test]
fn waveforms_follow_the_condition_and_are_put_out() {
    let mut harness = usual();
    assert!(harness.state().session().steady().is_none(), "nothing is worked out that nobody looks at");
    harness.key_press(Key::F3);
    harness.run();
    let greatest = |harness: &Harness<'_, App>| {
        let steady = harness.state().session().steady().unwrap().as_ref().unwrap();
        let current = |wave: &&Wave| wave.kind == WaveKind::Inductor;
        let wave = steady.waves.iter().find(current).unwrap();
        wave.values.iter().copied().fold(f64::NEG_INFINITY, f64::max)
    };
    let nominal = greatest(&harness);
    labelled(&harness, "inductor current: greatest 3.0");
    ask(&mut harness, Command::Show(Level::Least, Level::Greatest));
    assert!(greatest(&harness) > nominal + 1.0, "least input and greatest load ask more of the inductor");
    // The cursor goes by keys.
    harness.get_by_label("Waveforms plot").focus();
    harness.run();
    harness.key_press(Key::ArrowRight);
    harness.run();
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("w.svg");
    ask(&mut harness, Command::ExportPath { what: Exported::Waves, path: path.clone() });
    let svg = std::fs::read_to_string(&path).unwrap();
    assert!(svg.contains("One steady period") && svg.contains("least input 9 V") && !svg.contains("NaN"));
    let path = folder.path().join("w.csv");
    ask(&mut harness, Command::ExportPath { what: Exported::WaveCurves, path: path.clone() });
    let csv = std::fs::read_to_string(&path).unwrap();
    assert!(csv.starts_with("time_s,inductor_a,switch_a,"), "{}", csv.lines().next().unwrap());
    assert!(csv.lines().count() > 100);
    harness.key_press(Key::F2);
    harness.run();
    assert!(harness.state().session().steady().is_none());
}

#[test]
fn a_transient_runs_by_itself_and_follows_event_and_design() {
    let mut harness = usual();
    assert!(harness.state().transient().is_none() && !harness.state().transient_runs());
    harness.key_press(Key::F4);
    finish(&mut harness);
    let shown = |harness: &Harness<'_, App>| {
        let run = harness.state().transient().unwrap();
        (run.event, run.condition.label.clone(), run.figures.deviation_v)
    };
    let (event, label, deviation) = shown(&harness);
    assert_eq!(event, TransientEvent::LoadStep);
    assert!(label.contains("nominal load 1 A") && deviation.unwrap() < -0.01);
    labelled(&harness, "Deviation: ");
    ask(&mut harness, Command::Show(Level::Nominal, Level::Greatest));
    finish(&mut harness);
    assert!(shown(&harness).1.contains("greatest load"), "{}", shown(&harness).1);
    harness.get_by_label("Line step").click();
    finish(&mut harness);
    assert_eq!(shown(&harness).0, TransientEvent::LineStep);
    let folder = tempfile::tempdir().unwrap();
    for (what, name, begins) in
        [(Exported::Transient, "t.svg", "<svg"), (Exported::TransientCurves, "t.csv", "time_s,load_voltage_v_least,")]
    {
        let path = folder.path().join(name);
        ask(&mut harness, Command::ExportPath { what, path: path.clone() });
        let text = std::fs::read_to_string(&path).unwrap();
        assert!(text.starts_with(begins) && !text.contains("NaN"), "{}", &text[..80]);
    }
}

/// A result is shown only while it is that of the design: an edit takes it away until the next run has ended.
#[test]
fn a_result_of_an_older_design_is_none() {
    let mut harness = usual();
    harness.key_press(Key::F4);
    finish(&mut harness);
    let before = harness.state().transient().unwrap().figures.deviation_v;
    let path = tempfile::tempdir().unwrap().path().join("none.svg");
    // The edit and the question come in one turn: the run for the edit has just been started, what was shown no longer counts.
    harness.state_mut().ask(Command::Enter { path: "stage.bank.1.capacitance", text: "22u".to_owned() });
    harness.state_mut().ask(Command::ExportPath { what: Exported::Transient, path: path.clone() });
    harness.step();
    assert!(harness.state().message().unwrap().failed && !path.exists());
    finish(&mut harness);
    assert_ne!(harness.state().transient().unwrap().figures.deviation_v, before);
    // Leaving the page stops what runs.
    harness.state_mut().ask(Command::RunTransient);
    harness.step();
    harness.state_mut().ask(Command::Page(Page::Loop));
    harness.step();
    harness.step();
    assert!(!harness.state().transient_runs());
}

#[test]
fn the_pages_have_room_in_every_window() {
    for (size, scale) in [(vec2(1280.0, 800.0), 1.0), (vec2(1920.0, 1080.0), 1.0), (vec2(640.0, 400.0), 2.0)] {
        for page in [Page::Loop, Page::Waveforms, Page::Transient] {
            let mut harness = window(size, scale);
            ask(&mut harness, Command::Page(page));
            finish(&mut harness);
            let name = ["Gain plot", "Waveforms plot", "Transient plot"][page as usize];
            let plot = harness.get_by_label(name).rect();
            assert!(plot.height() > 60.0 && plot.width() > 100.0, "{name} at {size}: {plot}");
        }
    }
}
