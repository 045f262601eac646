//! Benchmark of a frame while a lane is dragged, nine conditions on: the whole of it, and its parts. No display, no GL driver.

#![allow(missing_docs, reason = "the macros of criterion make public items")]
#![expect(clippy::expect_used, reason = "a benchmark may stop at a wrong value")]

use std::hint::black_box;
use std::time::{Duration, Instant};

use criterion::{Criterion, criterion_group, criterion_main};
use eframe::App as _;
use eframe::egui::{self, Event, Modifiers, PointerButton, Pos2, RawInput, Rect, Vec2, pos2, vec2};
use polewright::design::sample;
use polewright::window::App;

/// Size of the window [points].
const WINDOWS: [(&str, Vec2); 2] = [("1280 × 800", vec2(1280.0, 800.0)), ("1920 × 1080", vec2(1920.0, 1080.0))];
/// What the hand moves by from frame to frame, there and back over so many frames [points].
const STRIDE: f32 = 0.7;
const SWING: u16 = 120;

/// A window whose lane is held.
struct Hand {
    ctx: egui::Context,
    app: App,
    frame: eframe::Frame,
    size: Vec2,
    at: Pos2,
    turn: u16,
    clock: f64,
}

/// What a frame took.
#[derive(Clone, Copy, Default)]
struct Times {
    logic: Duration,
    ui: Duration,
    rest: Duration,
    tessellate: Duration,
}

impl Times {
    fn whole(&self) -> Duration {
        self.logic + self.ui + self.rest + self.tessellate
    }
}

impl Hand {
    /// Opens a window on the built-in design and takes the handle of its first zero.
    fn new(size: Vec2) -> Self {
        let ctx = egui::Context::default();
        let app = App::new(&ctx, sample::built_in(), None);
        let mut hand =
            Hand { ctx, app, frame: eframe::Frame::_new_kittest(), size, at: Pos2::ZERO, turn: 0, clock: 0.0 };
        for _ in 0..4 {
            hand.turn(Vec::new());
        }
        hand.at = hand.handle();
        let press = Event::PointerButton {
            pos: hand.at,
            button: PointerButton::Primary,
            pressed: true,
            modifiers: Modifiers::NONE,
        };
        // With Alt nothing snaps: every frame moves the lane and is analysed anew.
        hand.turn(vec![Event::ModifiersChanged(Modifiers::ALT), Event::PointerMoved(hand.at)]);
        hand.turn(vec![press]);
        for _ in 0..20 {
            hand.drag();
        }
        let r2 = |hand: &Hand| hand.app.session().design().values.get("compensator.r2");
        for _ in 0..2 * SWING {
            let before = r2(&hand);
            hand.drag();
            assert!(r2(&hand) != before, "every frame moves the lane");
        }
        let name = hand.app.session().history().undo_name();
        assert!(name.is_some_and(|name| name.starts_with("Move ")), "the lane follows the hand: {name:?}");
        hand
    }

    /// Where the handle of the first zero stands.
    fn handle(&self) -> Pos2 {
        let handle = self.ctx.read_response(egui::Id::unique(("lane", "zero-1")));
        handle.expect("the built-in design has zeros, and their lanes are drawn").rect.center()
    }

    /// One move of the hand and the frame that shows it.
    fn drag(&mut self) -> Times {
        self.turn = (self.turn + 1) % (2 * SWING);
        let way = if self.turn < SWING { 1.0 } else { -1.0 };
        self.at.x += way * STRIDE;
        self.turn(vec![Event::PointerMoved(self.at)])
    }

    fn turn(&mut self, events: Vec<Event>) -> Times {
        self.clock += 1.0 / 60.0;
        let input = RawInput {
            screen_rect: Some(Rect::from_min_size(pos2(0.0, 0.0), self.size)),
            time: Some(self.clock),
            events,
            focused: true,
            ..RawInput::default()
        };
        let mut times = Times::default();
        let (app, frame, ctx) = (&mut self.app, &mut self.frame, self.ctx.clone());
        let from = Instant::now();
        let output = self.ctx.run_ui(input, |ui| {
            let from = Instant::now();
            app.logic(&ctx, frame);
            times.logic += from.elapsed();
            let from = Instant::now();
            app.ui(ui, frame);
            times.ui += from.elapsed();
        });
        times.rest = from.elapsed().saturating_sub(times.logic + times.ui);
        let from = Instant::now();
        black_box(self.ctx.tessellate(output.shapes, output.pixels_per_point));
        times.tessellate = from.elapsed();
        times
    }
}

fn frame(criterion: &mut Criterion) {
    for (name, size) in WINDOWS {
        let mut hand = Hand::new(size);
        let mut part = |label: &str, pick: fn(&Times) -> Duration| {
            criterion.bench_function(&format!("frame while dragging, {name}: {label}"), |b| {
                b.iter_custom(|count| (0..count).map(|_| pick(&hand.drag())).sum());
            });
        };
        part("whole", Times::whole);
        part("logic, nine conditions and curves", |times| times.logic);
        part("layout and painting", |times| times.ui);
        part("the toolkit's own", |times| times.rest);
        part("tessellation", |times| times.tessellate);
    }
}

criterion_group!(benches, frame);
criterion_main!(benches);
