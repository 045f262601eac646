//! Lanes by hand: where handles stand, fine drags, ties, returning to the rules, and what a lane says while it is held.

use super::*;
use polewright::compensator::LaneKind;

#[test]
fn handles_stand_under_the_curves_at_every_size_and_scale() {
    let sizes =
        [vec2(800.0, 560.0), vec2(1000.0, 700.0), vec2(1280.0, 800.0), vec2(1366.0, 768.0), vec2(1920.0, 1080.0)];
    for size in sizes {
        for scale in [0.8, 1.0, 1.25, 2.0] {
            let harness = window(size, scale);
            let app = harness.state();
            let (left, right) = (f64::from(app.gain_rect().left()), f64::from(app.gain_rect().right()));
            for lane in app.session().lanes() {
                let wanted = place(&harness, lane.frequency_hz).clamp(left, right);
                let found = f64::from(handle(&harness, lane.key).x);
                let apart = (wanted - found).abs() * f64::from(scale);
                assert!(apart < 1.0, "{} is {apart} pixels off at {size} × {scale}", lane.key);
            }
        }
    }
}

/// The same after zooming: the axis is one for curves and lanes.
#[test]
fn handles_follow_the_axis() {
    let mut harness = usual();
    let whole = harness.state().frequency_range_hz();
    for (modifiers, key) in [
        (Modifiers::COMMAND, Key::ArrowUp),
        (Modifiers::COMMAND | Modifiers::SHIFT, Key::ArrowLeft),
        (Modifiers::COMMAND, Key::ArrowDown),
        (Modifiers::COMMAND | Modifiers::SHIFT, Key::ArrowRight),
    ] {
        let before = harness.state().frequency_range_hz();
        harness.key_press_modifiers(modifiers, key);
        harness.run();
        assert_ne!(harness.state().frequency_range_hz(), before, "{key:?}");
        for lane in ["zero-1", "pole-2"] {
            let apart = place(&harness, lane_hz(&harness, lane)) - f64::from(handle(&harness, lane).x);
            assert!(apart.abs() < 1.0, "{lane}: {apart}");
        }
    }
    harness.key_press_modifiers(Modifiers::COMMAND, Key::Home);
    harness.run();
    assert_eq!(harness.state().frequency_range_hz(), whole);
}

#[test]
fn shift_makes_a_drag_ten_times_finer_without_a_jump() {
    let mut harness = usual();
    let from = handle(&harness, "pole-2");
    let start = place(&harness, lane_hz(&harness, "pole-2"));
    harness.hover_at(from);
    harness.step();
    harness.drag_at(from);
    harness.step();
    harness.hover_at(from - vec2(40.0, 0.0));
    harness.step();
    harness.step();
    let coarse = place(&harness, lane_hz(&harness, "pole-2"));
    assert!((coarse - (start - 40.0)).abs() < 4.5, "{coarse}");
    harness.event(egui::Event::ModifiersChanged(Modifiers::SHIFT));
    harness.hover_at(from - vec2(60.0, 0.0));
    harness.step();
    harness.step();
    let fine = place(&harness, lane_hz(&harness, "pole-2"));
    // 20 points of the hand are two of the handle; the coarse part may have been snapped.
    assert!((fine - (start - 42.0)).abs() < 0.5, "{fine} from {start}");
    harness.event(egui::Event::ModifiersChanged(Modifiers::NONE));
    harness.drop_at(from - vec2(60.0, 0.0));
    harness.run();
}

/// A window with the pace of a screen, since the harness' own is too slow for a double click.
fn at_pace() -> Harness<'static, App> {
    let builder = Harness::builder().with_size(vec2(1280.0, 800.0)).with_step_dt(1.0 / 60.0);
    let mut harness = builder.build_eframe(|cc| App::new(&cc.egui_ctx, sample::built_in(), None));
    harness.run();
    harness
}

fn double_click(harness: &mut Harness<'_, App>, at: Pos2) {
    harness.hover_at(at);
    harness.step();
    for pressed in [true, false, true, false] {
        let button = egui::PointerButton::Primary;
        harness.event(egui::Event::PointerButton { pos: at, button, pressed, modifiers: Modifiers::NONE });
    }
    harness.run();
}

#[test]
fn a_double_click_returns_a_lane_to_the_rule() {
    let mut harness = at_pace();
    let at = handle(&harness, "zero-1");
    drag(&mut harness, at, at - vec2(70.0, 0.0));
    let moved = handle(&harness, "zero-1");
    double_click(&mut harness, moved);
    // The rule puts zeros on the highest LC resonance. Textbook, lossless boost: Vin/Vout / (2π√(LC)), at 16 V input.
    let vout = harness.state().session().design().check().unwrap().stage.output_voltage;
    let resonance = 16.0 / vout / (std::f64::consts::TAU * (10e-6_f64 * 150.15e-6).sqrt());
    let found = lane_hz(&harness, "zero-1");
    let why = harness.state().session().lane_remark("zero-1");
    assert!((found / resonance - 1.0).abs() < 1e-6, "{found} and {resonance}: {why:?}");
    let remark = harness.state().session().lane_remark("zero-1").unwrap().to_owned();
    assert!(remark.contains("LC resonance"), "{remark}");
    harness.get_by_label("Undo").click();
    harness.run();
    assert!((lane_hz(&harness, "zero-1") - found).abs() > 1.0, "it is a step of its own");
}

#[test]
fn home_on_the_gain_lets_the_loop_cross_at_the_aim() {
    let mut harness = usual();
    field(&harness, "Crossover aimed at").focus();
    harness.run();
    field(&harness, "Crossover aimed at").type_text("6k");
    harness.run();
    harness.get_by_label(lane_name(&harness, "gain")).focus();
    harness.run();
    harness.key_press(Key::Home);
    harness.run();
    let crossover = crossover(&harness);
    assert!((crossover.0 / 6e3 - 1.0).abs() < 2e-3, "{crossover:?}");
}

fn crossover(harness: &Harness<'_, App>) -> (f64, f64) {
    let analysis = harness.state().session().analysis().unwrap();
    let shown = analysis.shown.as_ref().unwrap();
    let crossover = shown.loop_gain.margins.headline_crossover().unwrap();
    (crossover.frequency_hz, crossover.phase_margin_deg)
}

#[test]
fn tied_zeros_move_together_as_one_step() {
    let mut harness = usual();
    let ratio = lane_hz(&harness, "zero-2") / lane_hz(&harness, "zero-1");
    let before = lane_hz(&harness, "zero-1");
    harness.get_by_label("Tie the zeros").click();
    harness.run();
    assert!(harness.state().session().tied(LaneKind::Zero) && !harness.state().session().tied(LaneKind::Pole));
    assert_eq!(harness.state().session().history().undo_name(), None, "a tie changes no part");
    let at = handle(&harness, "zero-2");
    drag(&mut harness, at, at + vec2(-50.0, 0.0));
    let (one, other) = (lane_hz(&harness, "zero-1"), lane_hz(&harness, "zero-2"));
    assert!((other / one / ratio - 1.0).abs() < 1e-6 && one < 0.9 * before, "{one} {other}");
    assert_eq!(harness.state().session().history().undo_name(), Some("Move the tied zeros"));
    harness.get_by_label("Undo").click();
    harness.run();
    assert!((lane_hz(&harness, "zero-1") / before - 1.0).abs() < 1e-12);
    harness.get_by_label("Tie the zeros").click();
    harness.run();
    let at = handle(&harness, "zero-2");
    drag(&mut harness, at, at + vec2(-50.0, 0.0));
    assert!((lane_hz(&harness, "zero-1") / before - 1.0).abs() < 1e-6, "untied, the other stays");
}

#[test]
fn placements_meet_their_aim_or_say_why_not() {
    let mut harness = window(vec2(1280.0, 1300.0), 1.0);
    let type_into = |harness: &mut Harness<'_, App>, label: &str, text: &str| {
        field(harness, label).focus();
        harness.run();
        harness.key_press_modifiers(Modifiers::COMMAND, Key::A);
        field(harness, label).type_text(text);
        harness.run();
    };
    type_into(&mut harness, "Crossover aimed at", "7.5k");
    type_into(&mut harness, "Phase margin aimed at", "64");
    harness.get_by_label("Place by K factor").click();
    harness.run();
    let (crossover_hz, margin_deg) = crossover(&harness);
    assert!(
        (crossover_hz / 7.5e3 - 1.0).abs() < 1e-4 && (margin_deg - 64.0).abs() < 1e-2,
        "{crossover_hz} {margin_deg}"
    );
    assert_eq!(harness.state().session().history().undo_name(), Some("Place by K factor"));
    let design = harness.state().session().design().clone();
    type_into(&mut harness, "Phase margin aimed at", "179");
    type_into(&mut harness, "Crossover aimed at", "120k");
    harness.get_by_label("Place by K factor").click();
    harness.run();
    assert_eq!(harness.state().session().design(), &design, "an impossible aim changes nothing");
    let says = |word: &str| harness.query_all_by(|node| node.value().is_some_and(|text| text.contains(word))).count();
    assert!(says("boost") > 0, "and says why");
    type_into(&mut harness, "Crossover aimed at", "fast");
    harness.get_by_label("Place by pole-zero rules").click();
    harness.run();
    assert_eq!(harness.state().session().design(), &design);
    type_into(&mut harness, "Crossover aimed at", "7k");
    harness.get_by_label("Place by pole-zero rules").click();
    harness.run();
    assert!((crossover(&harness).0 / 7e3 - 1.0).abs() < 1e-4);
}

/// No more points than pixel columns: frequencies asked for at many widths.
#[test]
fn curves_have_at_most_one_point_per_column() {
    for width in [700.0, 900.0, 1280.0, 1500.0, 1920.0, 3840.0] {
        let harness = window(vec2(width, 800.0), 1.0);
        let analysis = harness.state().session().analysis().unwrap();
        let points = analysis.shown.as_ref().unwrap().curves.frequencies_hz.len();
        let columns = harness.state().gain_rect().width();
        assert!(points as f32 <= columns && points as f32 > 0.5 * columns, "{points} points in {columns} columns");
    }
}
