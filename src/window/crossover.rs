//! The crossover as a handle: taken on the gain curve and moved along the axis, the gain of the compensator follows.
//!
//! *Conventions* as for lanes: Shift is ten times finer, arrow keys move by a fortieth of a decade.

use eframe::egui::{
    self, CursorIcon, EventFilter, Id, Key, Modifiers, Rect, Sense, Stroke, StrokeKind, Ui, WidgetInfo, vec2,
};

use super::bode::Stack;
use super::command::Command;
use super::theme::palette;
use super::view::{Desk, Drag};
use crate::quantity::{self, Unit};

/// One arrow key [decades].
const NUDGE: f64 = 1.0 / 40.0;
/// What Shift does to drags and arrow keys.
const FINE: f32 = 0.1;

/// Lets the headline crossover be dragged and moved by keys.
pub(super) fn crossover_ui(ui: &mut Ui, stack: &Stack, desk: &mut Desk<'_>) {
    let detail = desk.session.analysis().and_then(|analysis| analysis.shown.as_ref().ok());
    let Some(crossover) = detail.and_then(|detail| detail.loop_gain.margins.headline_crossover()) else { return };
    let frequency_hz = crossover.frequency_hz;
    if !stack.gain.x.holds(frequency_hz) {
        return;
    }
    let at = stack.gain.at(frequency_hz, 0.0);
    let id = Id::unique("crossover handle");
    let response = ui.interact(Rect::from_center_size(at, vec2(20.0, 20.0)), id, Sense::click_and_drag());
    response.widget_info(|| WidgetInfo::slider(true, frequency_hz, "Crossover handle"));
    let text = quantity::print(frequency_hz, Unit::Hertz);
    ui.ctx().accesskit_node_builder(response.id, |node| {
        node.set_value(text);
        node.add_action(egui::accesskit::Action::Increment);
        node.add_action(egui::accesskit::Action::Decrement);
    });
    let colour = palette(ui).accent;
    if response.hovered() || response.dragged() || response.has_focus() {
        ui.painter().circle_stroke(at, 8.0, Stroke::new(1.5, colour));
    }
    if response.has_focus() {
        ui.painter().rect_stroke(
            Rect::from_center_size(at, vec2(22.0, 22.0)),
            5.0,
            Stroke::new(1.5, colour),
            StrokeKind::Outside,
        );
    }
    let response = response.on_hover_and_drag_cursor(CursorIcon::ResizeHorizontal);
    drag(ui, stack, frequency_hz, &response, desk);
    keys(ui, frequency_hz, &response, desk);
    if !response.dragged() {
        response.on_hover_text("Crossover. Drag it: the gain of the compensator follows, poles and zeros stay.");
    }
}

fn drag(ui: &Ui, stack: &Stack, frequency_hz: f64, response: &egui::Response, desk: &mut Desk<'_>) {
    if response.drag_started() {
        desk.view.gesture = desk.view.gesture.next();
        let handle_x = stack.gain.x.at(frequency_hz);
        let press = ui.input(|input| input.pointer.press_origin());
        desk.view.drag =
            Some(Drag { handle_x, pointer_x: press.map_or(handle_x, |at| at.x), gesture: desk.view.gesture });
    }
    if let (true, Some(drag), Some(pointer)) =
        (response.dragged(), &mut desk.view.drag, response.interact_pointer_pos())
        && drag.moved_to(pointer.x)
    {
        let fine = ui.input(|input| input.modifiers.shift);
        let x = drag.follow(pointer.x, if fine { FINE } else { 1.0 });
        let gesture = drag.gesture;
        desk.ask(Command::MoveCrossover { frequency_hz: stack.gain.x.value(x), gesture });
    }
    if response.drag_stopped() {
        desk.view.drag = None;
    }
}

fn keys(ui: &Ui, frequency_hz: f64, response: &egui::Response, desk: &mut Desk<'_>) {
    if !response.has_focus() {
        return;
    }
    if response.gained_focus() {
        desk.view.gesture = desk.view.gesture.next();
    }
    let filter = EventFilter { horizontal_arrows: true, ..EventFilter::default() };
    ui.memory_mut(|memory| memory.set_focus_lock_filter(response.id, filter));
    let steps = ui.input_mut(|input| {
        let mut steps = 0.0;
        for (key, way) in [(Key::ArrowRight, 1.0), (Key::ArrowLeft, -1.0)] {
            steps += way * input.count_and_consume_key(Modifiers::NONE, key) as f64;
            steps += way * f64::from(FINE) * input.count_and_consume_key(Modifiers::SHIFT, key) as f64;
        }
        steps += input.num_accesskit_action_requests(response.id, egui::accesskit::Action::Increment) as f64;
        steps - input.num_accesskit_action_requests(response.id, egui::accesskit::Action::Decrement) as f64
    });
    if steps != 0.0 {
        let frequency_hz = frequency_hz * 10f64.powf(steps * NUDGE);
        let gesture = desk.view.gesture;
        desk.ask(Command::MoveCrossover { frequency_hz, gesture });
    }
}
