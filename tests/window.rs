//! The window driven by accessible name, without a display: handles, fields, undo, conditions, and handles against curves.

#![cfg(feature = "window")]
#![expect(clippy::unwrap_used, reason = "a test may stop at a wrong value")]

use eframe::egui::{self, Key, Modifiers, Pos2, Role, Vec2, pos2, vec2};
use egui_kittest::Harness;
use egui_kittest::kittest::{NodeT, Queryable};
use polewright::analysis::{Level, terms};
use polewright::design::sample;
use polewright::quantity::{Unit, parse};
use polewright::window::App;

#[path = "window/export.rs"]
mod export;
#[path = "window/forms.rs"]
mod forms;
#[path = "window/lanes.rs"]
mod lanes;
#[path = "window/safety.rs"]
mod safety;
#[path = "window/switched.rs"]
mod switched;
#[path = "window/walk.rs"]
mod walk;

fn window(size: Vec2, pixels_per_point: f32) -> Harness<'static, App> {
    let mut harness = Harness::builder()
        .with_size(size)
        .with_pixels_per_point(pixels_per_point)
        // The thread that watches files may wake the window once more.
        .with_max_steps(64)
        .build_eframe(|cc| App::new(&cc.egui_ctx, sample::built_in(), None));
    harness.run();
    harness
}

fn usual() -> Harness<'static, App> {
    window(vec2(1280.0, 800.0), 1.0)
}

fn value(harness: &Harness<'_, App>, path: &str) -> f64 {
    harness.state().session().design().values.get(path).unwrap()
}

fn lane_hz(harness: &Harness<'_, App>, key: &str) -> f64 {
    harness.state().session().lanes().iter().find(|lane| lane.key == key).unwrap().frequency_hz
}

fn lane_name(harness: &Harness<'_, App>, key: &str) -> &'static str {
    harness.state().session().lanes().iter().find(|lane| lane.key == key).unwrap().name
}

fn handle(harness: &Harness<'_, App>, key: &str) -> Pos2 {
    harness.get_by_label(lane_name(harness, key)).rect().center()
}

/// Where a frequency stands on the plots' axis, worked out here from the frame and the span alone.
fn place(harness: &Harness<'_, App>, frequency_hz: f64) -> f64 {
    let app = harness.state();
    let (from, to) = app.frequency_range_hz();
    let rect = app.gain_rect();
    f64::from(rect.left()) + f64::from(rect.width()) * (frequency_hz / from).ln() / (to / from).ln()
}

fn drag(harness: &mut Harness<'_, App>, from: Pos2, to: Pos2) {
    harness.hover_at(from);
    harness.step();
    harness.drag_at(from);
    harness.step();
    for part in 1..=8 {
        harness.hover_at(from + (to - from) * (part as f32 / 8.0));
        harness.step();
    }
    harness.drop_at(to);
    harness.run();
}

fn field<'h>(harness: &'h Harness<'_, App>, label: &'h str) -> egui_kittest::Node<'h> {
    harness.get_by_role_and_label(Role::TextInput, label)
}

fn enter(harness: &mut Harness<'_, App>, label: &str, text: &str) {
    field(harness, label).focus();
    harness.run();
    field(harness, label).type_text(text);
    harness.run();
    harness.key_press(Key::Enter);
    harness.run();
}

#[test]
fn a_window_opens_with_results() {
    let harness = usual();
    let session = harness.state().session();
    assert!(session.analysis().unwrap().shown.is_ok());
    assert!(!session.stale() && !session.unsaved());
}

#[test]
fn a_dragged_handle_moves_parts_and_margins() {
    let mut harness = usual();
    let before_hz = lane_hz(&harness, "zero-1");
    let margin = |harness: &Harness<'_, App>| {
        let analysis = harness.state().session().analysis().unwrap();
        analysis.readouts.iter().find(|readout| readout.key == "phase-margin").unwrap().value
    };
    let (margin_before, r2_before) = (margin(&harness), value(&harness, "compensator.r2"));
    let from = handle(&harness, "zero-1");
    let to = from + vec2(-60.0, 0.0);
    drag(&mut harness, from, to);
    let after_hz = lane_hz(&harness, "zero-1");
    assert!(after_hz < before_hz);
    assert!(
        (place(&harness, after_hz) - f64::from(to.x)).abs() < 4.5,
        "the handle is where it was dropped, or snapped"
    );
    assert!((value(&harness, "compensator.r2") - r2_before).abs() > 1e-3 * r2_before);
    assert_ne!(margin(&harness), margin_before);
    // One drag is one step, and it is named.
    let name = harness.state().session().history().undo_name().unwrap().to_owned();
    assert!(name.starts_with("Move "), "{name}");
    harness.get_by_label("Undo").click();
    harness.run();
    assert!((lane_hz(&harness, "zero-1") / before_hz - 1.0).abs() < 1e-12);
    assert_eq!(harness.state().session().history().undo_name(), None);
    harness.get_by_label("Redo").click();
    harness.run();
    assert!((lane_hz(&harness, "zero-1") / after_hz - 1.0).abs() < 1e-12);
}

#[test]
fn arrow_keys_move_a_handle() {
    let mut harness = usual();
    let before_hz = lane_hz(&harness, "pole-2");
    let name = lane_name(&harness, "pole-2");
    harness.get_by_label(name).focus();
    harness.run();
    harness.key_press(Key::ArrowLeft);
    harness.run();
    harness.key_press(Key::ArrowLeft);
    harness.run();
    let after_hz = lane_hz(&harness, "pole-2");
    // Two keys of a fortieth of a decade each.
    assert!((after_hz / before_hz - 10f64.powf(-0.05)).abs() < 1e-6, "{before_hz} to {after_hz}");
    harness.key_press_modifiers(Modifiers::COMMAND, Key::Z);
    harness.run();
    assert!((lane_hz(&harness, "pole-2") / before_hz - 1.0).abs() < 1e-12, "a run of keys is one step");
}

#[test]
fn a_lane_takes_a_typed_value() {
    let mut harness = usual();
    let name = lane_name(&harness, "zero-1");
    harness.get_by_label(&format!("Type {name}")).click();
    harness.run();
    harness.key_press_modifiers(Modifiers::COMMAND, Key::A);
    harness.run();
    field(&harness, &format!("{name} frequency")).type_text("1.7k");
    harness.run();
    harness.key_press(Key::Enter);
    harness.run();
    let found = lane_hz(&harness, "zero-1");
    assert!((found / 1700.0 - 1.0).abs() < 1e-6, "{found}");
}

#[test]
fn a_field_takes_engineering_notation() {
    let mut harness = usual();
    enter(&mut harness, "Inductor", "12u");
    assert!((value(&harness, "stage.inductor.inductance") - 12e-6).abs() < 1e-15);
    let shown = field(&harness, "Inductor").value().unwrap();
    assert!((parse(&shown, Unit::Henry).unwrap() - 12e-6).abs() < 1e-15, "{shown}");
    assert!(harness.state().session().unsaved());
}

#[test]
fn unreadable_text_stays_in_its_field_with_the_reason() {
    let mut harness = usual();
    let before = value(&harness, "stage.inductor.inductance");
    enter(&mut harness, "Inductor", "ten micro");
    let session = harness.state().session();
    assert!(session.stale() && session.analysis().is_some());
    assert!((value(&harness, "stage.inductor.inductance") - before).abs() < 1e-18);
    assert_eq!(field(&harness, "Inductor").value().as_deref(), Some("ten micro"));
    let reason = session.bad_text("stage.inductor.inductance").unwrap().finding.message.clone();
    assert!(harness.query_all_by(|node| node.value().is_some_and(|text| text.contains(&reason))).count() > 0);
    harness.key_press_modifiers(Modifiers::COMMAND, Key::Z);
    harness.run();
    assert!(!harness.state().session().stale());
}

#[test]
fn an_unusable_value_keeps_the_last_results_and_can_be_mended() {
    let mut harness = usual();
    enter(&mut harness, "Inductor", "-3u");
    assert!(harness.state().session().stale());
    assert!(harness.state().session().analysis().is_some());
    assert!((value(&harness, "stage.inductor.inductance") + 3e-6).abs() < 1e-15);
    enter(&mut harness, "Inductor", "10u");
    assert!(!harness.state().session().stale());
}

#[test]
fn another_condition_is_shown() {
    let mut harness = usual();
    assert_eq!(harness.state().session().shown(), (Level::Nominal, Level::Nominal));
    let duty = |harness: &Harness<'_, App>| {
        harness.state().session().analysis().unwrap().shown.as_ref().unwrap().operating_point.duty
    };
    let before = duty(&harness);
    harness.get_by_label("Operating condition shown").click();
    harness.run();
    let cell = |label: &str| label.starts_with("least input, greatest load");
    harness.get_by(|node| node.label().is_some_and(|label| cell(&label))).click();
    harness.run();
    assert_eq!(harness.state().session().shown(), (Level::Least, Level::Greatest));
    assert!((duty(&harness) - before).abs() > 0.01);
    harness.key_press_modifiers(Modifiers::COMMAND, Key::ArrowRight);
    harness.run();
    assert_eq!(harness.state().session().shown(), (Level::Nominal, Level::Least));
}

#[test]
fn parts_are_rounded_and_kept() {
    let mut harness = window(vec2(1280.0, 1300.0), 1.0);
    enter(&mut harness, "R2, sets the first zero", "8.123k");
    let locked = |harness: &Harness<'_, App>| harness.state().session().design().locks.contains("compensator.r2");
    harness.get_by_label("Keep R2").click();
    harness.run();
    assert!(locked(&harness));
    harness.get_by_label("Round parts to their series").click();
    harness.run();
    assert!((value(&harness, "compensator.r2") - 8123.0).abs() < 1e-9);
    harness.get_by_label("Keep R2").click();
    harness.run();
    assert!(!locked(&harness));
    harness.get_by_label("Round parts to their series").click();
    harness.run();
    assert!((value(&harness, "compensator.r2") - 8123.0).abs() > 1.0);
}

#[test]
fn unsaved_changes_are_asked_about_and_saved() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("try.ron");
    let mut harness = usual();
    enter(&mut harness, "Inductor", "12u");
    harness.key_press_modifiers(Modifiers::COMMAND, Key::O);
    harness.run();
    let sample = &sample::all()[1];
    harness.get_by_label(sample.title).click();
    harness.run();
    harness.get_by_label("Save").click();
    harness.run();
    field(&harness, "Path of the design file").focus();
    harness.run();
    harness.key_press_modifiers(Modifiers::COMMAND, Key::A);
    harness.get_by_label("Path of the design file").type_text(&path.display().to_string());
    harness.run();
    harness.get_by_label("Save").click();
    harness.run();
    let saved = polewright::design::file::load(&path).unwrap();
    assert!((saved.values.get("stage.inductor.inductance").unwrap() - 12e-6).abs() < 1e-15);
    assert_eq!(harness.state().session().design().title, sample.design().unwrap().title);
    assert!(!harness.state().session().unsaved());
}

#[test]
fn a_file_that_cannot_be_opened_is_told_and_nothing_is_lost() {
    let mut harness = usual();
    let title = harness.state().session().design().title.clone();
    harness.state_mut().ask(polewright::window::Command::OpenPath("/no/such/file.ron".into()));
    harness.run();
    assert!(harness.state().message().unwrap().failed);
    assert_eq!(harness.state().session().design().title, title);
}

#[test]
fn a_failed_open_is_told_once_and_is_over_after_cancel() {
    let mut harness = usual();
    harness.key_press_modifiers(Modifiers::COMMAND, Key::O);
    harness.run();
    harness.state_mut().ask(polewright::window::Command::OpenPath("/no/such/file.ron".into()));
    harness.run();
    let text = harness.state().message().unwrap().text.clone();
    let told = |harness: &Harness<'_, App>| {
        harness.query_all_by(|node| node.value().as_deref() == Some(text.as_str())).count()
    };
    assert_eq!(told(&harness), 1);
    harness.get_by_label("Cancel").click();
    harness.run();
    assert_eq!(told(&harness), 0);
    assert!(harness.state().message().is_none());
}

#[test]
fn shift_tells_redo_from_undo() {
    let mut harness = usual();
    enter(&mut harness, "Inductor", "12u");
    harness.key_press_modifiers(Modifiers::COMMAND, Key::Z);
    harness.run();
    assert!((value(&harness, "stage.inductor.inductance") - 10e-6).abs() < 1e-15);
    harness.key_press_modifiers(Modifiers::COMMAND | Modifiers::SHIFT, Key::Z);
    harness.run();
    assert!((value(&harness, "stage.inductor.inductance") - 12e-6).abs() < 1e-15);
}

#[test]
fn a_load_step_of_nothing_is_no_unstable_loop() {
    let mut design = sample::built_in();
    design.values.set("event.load-step.change", 0.0).unwrap();
    let mut harness =
        Harness::builder().with_size(vec2(1280.0, 800.0)).build_eframe(|cc| App::new(&cc.egui_ctx, design, None));
    harness.run();
    let shown = harness.get_by_role_and_label(Role::Button, "Load step").value().unwrap();
    assert_eq!(shown, "no step");
}

#[test]
fn the_crossover_window_has_words() {
    let harness = usual();
    let words =
        |text: &str| text.starts_with("Crossover window:") && text.contains("least") && text.contains("greatest");
    assert_eq!(harness.query_all_by(|node| node.value().is_some_and(|text| words(&text))).count(), 1);
}

#[test]
fn the_wheel_scrolls_where_the_plots_do_not_fit() {
    let wheel = |harness: &mut Harness<'_, App>, modifiers: Modifiers| {
        let over = harness.state().gain_rect().center();
        harness.hover_at(over);
        harness.step();
        harness.event(egui::Event::MouseWheel {
            unit: egui::MouseWheelUnit::Point,
            source: egui::MouseWheelSource::Wheel,
            delta: vec2(0.0, -60.0),
            phase: egui::TouchPhase::Move,
            modifiers,
        });
        harness.run();
    };
    let mut low = window(vec2(640.0, 400.0), 2.0);
    let (range, top) = (low.state().frequency_range_hz(), low.state().gain_rect().top());
    wheel(&mut low, Modifiers::NONE);
    assert_eq!(low.state().frequency_range_hz(), range);
    assert!(low.state().gain_rect().top() < top - 20.0, "the column moved");
    wheel(&mut low, Modifiers::COMMAND);
    assert_ne!(low.state().frequency_range_hz(), range);
    let mut high = usual();
    wheel(&mut high, Modifiers::NONE);
    assert_ne!(high.state().frequency_range_hz(), range);
}

#[test]
fn every_sample_is_drawn_with_every_control_named() {
    for sample in sample::all() {
        let design = sample.design().unwrap();
        let mut harness =
            Harness::builder().with_size(vec2(1280.0, 800.0)).build_eframe(|cc| App::new(&cc.egui_ctx, design, None));
        harness.run();
        harness.check_accessibility();
        assert!(harness.state().session().analysis().is_some(), "{}", sample.file);
        assert!(
            harness
                .state()
                .gain_rect()
                .contains(pos2(harness.state().gain_rect().center().x, harness.state().gain_rect().center().y))
        );
    }
}

#[test]
fn the_crossover_can_be_taken_on_the_curve() {
    let mut harness = usual();
    let crossover_hz = |harness: &Harness<'_, App>| {
        let analysis = harness.state().session().analysis().unwrap();
        let shown = analysis.shown.as_ref().unwrap();
        shown.loop_gain.margins.headline_crossover().unwrap().frequency_hz
    };
    let from = harness.get_by_label("Crossover handle").rect().center();
    assert!((place(&harness, crossover_hz(&harness)) - f64::from(from.x)).abs() < 1.0);
    let zero_hz = lane_hz(&harness, "zero-1");
    drag(&mut harness, from, from + vec2(-50.0, 0.0));
    let found = place(&harness, crossover_hz(&harness));
    assert!((found - f64::from(from.x - 50.0)).abs() < 2.0, "{found}");
    assert!((lane_hz(&harness, "zero-1") / zero_hz - 1.0).abs() < 1e-6, "zeros stay");
    harness.get_by_label("Undo").click();
    harness.run();
    assert_eq!(harness.state().session().history().undo_name(), None, "a drag is one step");
}

#[test]
fn held_tries_stay_and_are_dropped_one_by_one() {
    let mut harness = window(vec2(1280.0, 1300.0), 1.0);
    harness.get_by_label("Hold").click();
    harness.run();
    enter(&mut harness, "Inductor", "15u");
    harness.get_by_label("Hold").click();
    harness.run();
    let titles = |harness: &Harness<'_, App>| {
        harness.state().session().tries().iter().map(polewright::window::Held::title).collect::<Vec<_>>()
    };
    assert_eq!(titles(&harness), ["1: Gimbal rail", "2: Enter inductor"]);
    let beside = |harness: &Harness<'_, App>| harness.state().session().held().map(|held| held.number);
    assert_eq!(beside(&harness), Some(2), "the latest is drawn");
    harness.get_by_label("Held try 1: Gimbal rail").click();
    harness.run();
    assert_eq!(beside(&harness), Some(1));
    harness.get_by_label("Drop try 1: Gimbal rail").click();
    harness.run();
    assert_eq!(titles(&harness), ["2: Enter inductor"]);
    harness.key_press_modifiers(Modifiers::COMMAND | Modifiers::SHIFT, Key::H);
    harness.run();
    assert!(harness.state().session().tries().is_empty());
}

#[test]
fn held_tries_follow_the_condition_shown() {
    let mut harness = usual();
    harness.get_by_label("Hold").click();
    harness.run();
    harness.key_press_modifiers(Modifiers::COMMAND, Key::ArrowRight);
    harness.run();
    let session = harness.state().session();
    let (held, shown) = (&session.held().unwrap().analysis, session.analysis().unwrap());
    assert_eq!(held.condition, shown.condition);
    assert_eq!(held.readouts[0].value, shown.readouts[0].value, "the design did not change");
}

/// The label of the condition shown.
fn condition(harness: &Harness<'_, App>) -> String {
    harness.state().session().analysis().unwrap().condition.label.clone()
}

#[test]
fn the_review_steps_through_conditions_and_tries_and_changes_nothing() {
    let mut harness = usual();
    harness.get_by_label("Hold").click();
    harness.run();
    enter(&mut harness, "Inductor", "15u");
    let design = harness.state().session().design().clone();
    harness.key_press(Key::F5);
    harness.run();
    assert!(harness.state().reviewing());
    assert!(harness.query_by_role_and_label(Role::TextInput, "Inductor").is_none());
    assert!(harness.query_by_label("Crossover handle").is_none());
    assert_eq!(harness.query_all_by_role(Role::Slider).count(), 0, "no handle to move");
    harness.key_press(Key::ArrowUp);
    harness.key_press(Key::ArrowRight);
    harness.run();
    assert_eq!(condition(&harness), "least input 9 V, greatest load 1.5 A");
    harness.key_press(Key::ArrowRight);
    harness.run();
    assert_eq!(condition(&harness), "least input 9 V, greatest load 1.5 A", "the last one stays");
    let crossover = |harness: &Harness<'_, App>| harness.state().session().analysis().unwrap().readouts[0].value;
    let present = crossover(&harness);
    harness.key_press(Key::PageDown);
    harness.run();
    assert_eq!(harness.state().session().reviewed().unwrap().number, 1);
    assert_eq!(condition(&harness), "least input 9 V, greatest load 1.5 A");
    assert_ne!(crossover(&harness), present);
    // Undo, rounding and lanes are the design's; here they say so and do nothing.
    harness.key_press_modifiers(Modifiers::COMMAND, Key::Z);
    harness.key_press_modifiers(Modifiers::COMMAND, Key::R);
    harness.run();
    assert_eq!(harness.state().session().design(), &design);
    assert!(harness.state().message().unwrap().text.contains("for reading"));
    harness.key_press(Key::Escape);
    harness.run();
    assert!(!harness.state().reviewing());
    assert!(harness.state().session().reviewed().is_none());
    assert_eq!(crossover(&harness), present);
}

#[test]
fn every_sample_is_reviewed_with_every_control_named() {
    for sample in sample::all() {
        for (size, scale) in [(vec2(1280.0, 800.0), 1.0), (vec2(640.0, 400.0), 2.0)] {
            let design = sample.design().unwrap();
            let mut harness = Harness::builder()
                .with_size(size)
                .with_pixels_per_point(scale)
                .build_eframe(|cc| App::new(&cc.egui_ctx, design, None));
            harness.run();
            harness.key_press(Key::F5);
            harness.run();
            harness.check_accessibility();
            assert!(harness.query_by_label("Phase margin").is_some(), "{}", sample.file);
            assert!(harness.query_by_label("Back to the design").is_some());
        }
    }
}

#[test]
fn a_what_if_stands_beside_the_nine() {
    let mut harness = usual();
    let nominal = condition(&harness);
    harness.key_press(Key::F5);
    harness.run();
    enter(&mut harness, "What-if input voltage", "ten");
    assert_eq!(condition(&harness), nominal);
    let told = |harness: &Harness<'_, App>, text: &str| {
        harness.query_all_by(|node| node.value().is_some_and(|value| value.contains(text))).count()
    };
    assert_eq!(told(&harness, "Input voltage: "), 1, "the reason stands under the field");
    assert_eq!(field(&harness, "What-if input voltage").value().as_deref(), Some("ten"));
    field(&harness, "What-if input voltage").focus();
    harness.run();
    harness.key_press_modifiers(Modifiers::COMMAND, Key::A);
    field(&harness, "What-if input voltage").type_text("10.5");
    harness.run();
    enter(&mut harness, "What-if load current", "750m");
    assert_eq!(condition(&harness), "input 10.5 V, load 750 mA");
    assert_eq!(told(&harness, "Input voltage: "), 0);
    assert_eq!(told(&harness, "What if: input 10.5 V"), 1, "it is labelled");
    assert_eq!(harness.state().session().analysis().unwrap().conditions.len(), 9);
    harness.get_by(|node| node.label().is_some_and(|label| label.starts_with("Back to the nine"))).click();
    harness.run();
    assert_eq!(condition(&harness), nominal);
}

#[test]
fn an_idle_window_asks_for_no_frame() {
    let mut harness = usual();
    harness.run_steps(3);
    let output = harness.output();
    let delay = output.viewport_output.values().map(|viewport| viewport.repaint_delay).min().unwrap();
    assert!(delay > std::time::Duration::from_secs(10), "{delay:?}");
}

#[test]
fn large_text_in_a_small_window_leaves_room_for_the_plots() {
    let mut harness = window(vec2(640.0, 400.0), 2.0);
    assert!(harness.state().gain_rect().width() > 150.0);
    assert!(harness.query_by_role_and_label(Role::TextInput, "Inductor").is_none());
    harness.key_press(Key::F6);
    harness.run();
    assert!(harness.query_by_role_and_label(Role::TextInput, "Inductor").is_some());
    assert!(harness.state().gain_rect().width() > 150.0);
}

#[test]
fn a_new_design_is_proposed_with_its_assumptions_and_created() {
    let mut harness = usual();
    enter(&mut harness, "Inductor", "12u");
    harness.key_press_modifiers(Modifiers::COMMAND, Key::N);
    harness.run();
    let told = |harness: &Harness<'_, App>, text: &str| {
        harness.query_all_by(|node| node.value().is_some_and(|value| value.contains(text))).count()
    };
    assert_eq!(told(&harness, "Stable and within all"), 1);
    assert!(told(&harness, "common practice") > 5);
    let set = |harness: &mut Harness<'_, App>, label: &str, text: &str| {
        field(harness, label).focus();
        harness.run();
        harness.key_press_modifiers(Modifiers::COMMAND, Key::A);
        field(harness, label).type_text(text);
        harness.run();
        harness.key_press(Key::Enter);
        harness.run();
    };
    set(&mut harness, "Input, least, of the new design", "nine");
    assert_eq!(told(&harness, "Stable and within all"), 0);
    assert_eq!(told(&harness, "is not a number"), 1, "the reason stands under the field");
    set(&mut harness, "Input, least, of the new design", "18");
    assert_eq!(told(&harness, "must not be above"), 1);
    set(&mut harness, "Input, least, of the new design", "10");
    assert_eq!(told(&harness, "Stable and within all"), 1);
    harness.get_by_label("Create").click();
    harness.run();
    // The design that stood there has unsaved changes.
    harness.get_by_label("Discard changes").click();
    harness.run();
    let session = harness.state().session();
    assert!((session.design().values.get("stage.input.least").unwrap() - 10.0).abs() < 1e-12);
    assert!(session.unsaved(), "it is in no file yet");
    assert!(session.analysis().unwrap().all_met());
    assert!(session.design().notes.contains("common practice"));
}

#[test]
fn a_dialog_of_any_size_has_every_control_named() {
    for (size, scale) in [(vec2(1280.0, 800.0), 1.0), (vec2(640.0, 400.0), 2.0)] {
        for key in [Key::N, Key::O, Key::K] {
            let mut harness = window(size, scale);
            harness.key_press_modifiers(Modifiers::COMMAND, key);
            harness.run();
            harness.check_accessibility();
            assert!(harness.query_by_label("Cancel").is_some() || key == Key::K);
        }
    }
}

#[test]
fn the_hint_is_shown_when_asked_for_and_closed() {
    for (size, scale) in [(vec2(1280.0, 800.0), 1.0), (vec2(640.0, 400.0), 2.0)] {
        let mut harness = window(size, scale);
        harness.key_press(Key::F1);
        harness.run();
        assert!(harness.state().hinting());
        let sentences = harness.query_all_by(|node| node.value().is_some_and(|text| text.contains("Drag a handle")));
        assert_eq!(sentences.count(), 1);
        harness.check_accessibility();
        harness.get_by_label("Got it").click();
        harness.run();
        assert!(!harness.state().hinting());
    }
}

#[test]
fn every_read_out_is_explained_with_its_formula_in_letters_the_font_has() {
    let harness = usual();
    for readout in &harness.state().session().analysis().unwrap().readouts {
        let node = harness.get_by_role_and_label(Role::Button, readout.name);
        let term = terms::find(readout.key).unwrap();
        let description = node.accesskit_node().description().unwrap_or_default();
        assert!(description.contains(term.formula), "{}: {description}", readout.key);
    }
    let font = egui::FontId::proportional(13.0);
    for term in terms::TERMS {
        for letter in term.name.chars().chain(term.text.chars()).chain(term.formula.chars()) {
            let there = letter == '\n' || harness.ctx.fonts_mut(|fonts| fonts.has_glyph(&font, letter));
            assert!(there, "{letter} of {}", term.key);
        }
    }
}

/// The part of a schematic whose accessible name begins so.
fn part<'h>(harness: &'h Harness<'_, App>, begin: &'h str) -> egui_kittest::Node<'h> {
    harness
        .get_by(move |node| node.role() == Role::Button && node.label().is_some_and(|label| label.starts_with(begin)))
}

#[test]
fn a_part_of_the_schematic_leads_to_its_field() {
    let mut harness = usual();
    part(&harness, "Inductor 10 µH").click();
    harness.run();
    assert!(field(&harness, "Inductor").is_focused());
    // By keyboard, and into a section that is folded; its heading may have been scrolled away, so it is pressed by name.
    harness.get_by_label("Power stage").click_accesskit();
    harness.run();
    assert!(harness.query_by_role_and_label(Role::TextInput, "Inductor").is_none());
    part(&harness, "Input 12 V").focus();
    harness.run();
    harness.key_press(Key::Enter);
    harness.run();
    assert!(field(&harness, "Input, nominal").is_focused());
    // What findings leave of the column may not reach down to it.
    part(&harness, "Reference").click_accesskit();
    harness.run();
    assert!(field(&harness, "Reference voltage").is_focused());
}

#[test]
fn a_part_and_what_it_sets_light_each_other() {
    let mut harness = window(vec2(1280.0, 1300.0), 1.0);
    let lit = |harness: &mut Harness<'_, App>| harness.state_mut().lit();
    let has = |names: &[String], begin: &str| names.iter().any(|name| name.starts_with(begin));
    part(&harness, "R2,").hover();
    harness.run();
    let names = lit(&mut harness);
    for wanted in ["R2,", "first zero", "first pole", "zero ", "pole "] {
        assert!(has(&names, wanted), "{wanted}: {names:?}");
    }
    assert!(!has(&names, "second zero") && !has(&names, "C1,") && !has(&names, "LC resonance"), "{names:?}");
    harness.get_by_label("second zero").hover();
    harness.run();
    let names = lit(&mut harness);
    for wanted in ["R3,", "C3,", "Upper divider resistor"] {
        assert!(has(&names, wanted), "{wanted}: {names:?}");
    }
    assert!(!has(&names, "R2,"), "{names:?}");
    part(&harness, "Inductor").hover();
    harness.run();
    let names = lit(&mut harness);
    assert!(has(&names, "LC resonance") && !has(&names, "ESR zero"), "{names:?}");
    harness.hover_at(pos2(640.0, 3.0));
    harness.run();
    assert!(lit(&mut harness).is_empty());
}

#[test]
fn schematics_fold() {
    let mut harness = usual();
    part(&harness, "Inductor 10 µH");
    harness.key_press(Key::F8);
    harness.run();
    assert_eq!(harness.query_all_by_label("Inductor 10 µH").count(), 0);
}
