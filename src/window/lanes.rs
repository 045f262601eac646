//! Lanes: one slider per pole, zero and gain of the compensator, on the frequency axis of the plots above.
//!
//! *Conventions*: a zero is a ring, a pole a cross, the gain a diamond. The handle stands where the parts put the lane; a
//! short bar on the rail shows the aim where the two differ. Dragging with Shift is ten times finer; arrow keys move by a
//! fortieth of a decade, with Shift by a tenth of that; Enter or a press on the number types a value; a double click or Home
//! returns a lane to the placement rule.

use eframe::egui::{
    self, Align2, CursorIcon, EventFilter, Id, Key, Modifiers, Painter, Pos2, Rect, Response, Sense, Stroke,
    StrokeKind, Ui, WidgetInfo, pos2, vec2,
};

use super::bode::Stack;
use super::command::Command;
use super::lane_card::{self, Held};
use super::pointed::Pointed;
use super::theme::{self, Palette, palette};
use super::ties;
use super::view::{Desk, Drag, Typing};
use crate::compensator::{Lane, LaneKind};
use crate::quantity::{self, Unit};

/// One arrow key [decades].
const NUDGE: f64 = 1.0 / 40.0;
/// What Shift does to drags and arrow keys.
const FINE: f32 = 0.1;
/// Distance at which aim and as-built place are told apart [ratio − 1].
const APART: f64 = 0.004;
/// Distance within which a dragged handle snaps to a landmark [points].
const SNAP: f32 = 4.0;
/// Room between the names of lanes and the plot, in which a handle beyond the axis has its mark [points].
const EDGE: f32 = 22.0;

/// Draws all lanes: the gain, then the zeros, then the poles.
pub(super) fn lanes_ui(ui: &mut Ui, stack: &Stack, desk: &mut Desk<'_>) {
    let session = desk.session;
    let kinds = [LaneKind::Gain, LaneKind::Zero, LaneKind::Pole];
    let mut active = None;
    let mut taken = Vec::with_capacity(session.lanes().len());
    let mut middle = stack.lanes.top() + 3.0 + theme::LANE_HEIGHT / 2.0;
    for kind in kinds {
        let first = middle;
        for lane in session.lanes().iter().filter(|lane| lane.kind == kind) {
            let row = Rect::from_x_y_ranges(
                stack.lanes.x_range(),
                (middle - theme::LANE_HEIGHT / 2.0)..=(middle + theme::LANE_HEIGHT / 2.0),
            );
            let shown = lane_ui(ui, stack, row, lane, desk);
            taken.push(shown.taken);
            if shown.active {
                active = Some((lane, shown));
            }
            middle += theme::LANE_HEIGHT;
        }
        if middle - first > 1.5 * theme::LANE_HEIGHT {
            ties::tie_ui(ui, kind, stack.lanes.left(), (first, middle - theme::LANE_HEIGHT), desk);
        }
    }
    // After all lanes, since it lies among the others.
    if let Some((lane, shown)) = &active {
        let held = Held { lane, handle: shown.handle, taken: &taken, in_hand: shown.in_hand };
        lane_card::card_ui(ui, stack, &held, desk);
    }
    desk.view.lane = active.map(|(lane, _)| lane.key);
}

/// How a lane was drawn.
struct Shown {
    /// Its handle is held, has the keyboard or is under the pointer.
    active: bool,
    /// Its handle is held or has the keyboard.
    in_hand: bool,
    /// Where its handle stands [points].
    handle: Pos2,
    /// Its handle and its number.
    taken: Rect,
}

/// Draws one lane.
fn lane_ui(ui: &mut Ui, stack: &Stack, row: Rect, lane: &Lane, desk: &mut Desk<'_>) -> Shown {
    let palette = palette(ui);
    let plot = stack.gain.rect;
    let y = row.center().y;
    let x = stack.gain.x.at(lane.frequency_hz);
    let handle = pos2(x.clamp(plot.left(), plot.right()), y);
    let painter = ui.painter().clone();
    painter.hline(plot.x_range(), y, Stroke::new(2.5, palette.rail));
    let word = kind_word(lane.kind);
    let at = pos2(plot.left() - EDGE, y);
    let name = painter.text(at, Align2::RIGHT_CENTER, word, theme::small(), palette.weak);
    name_ui(ui, name, lane);
    aim(&painter, stack, lane, y, desk, palette);

    let id = Id::unique(("lane", lane.key));
    let response = ui.interact(Rect::from_center_size(handle, vec2(22.0, row.height())), id, Sense::click_and_drag());
    describe(ui, &response, lane);
    let held = response.dragged() || response.is_pointer_button_down_on();
    let active = held || response.has_focus() || response.hovered();
    desk.view.point(Pointed::Lane(lane.key), &response);
    let lit = desk.lit_lane(lane);
    if lit && !active {
        painter.circle_filled(handle, theme::HANDLE + 5.0, palette.compensator.gamma_multiply(0.22));
    }
    paint_handle(&painter, handle, lane.kind, active || lit, palette);
    if response.has_focus() {
        let ring = Rect::from_center_size(handle, vec2(20.0, 20.0));
        painter.rect_stroke(ring, 5.0, Stroke::new(1.5, palette.accent), StrokeKind::Outside);
    }
    if x < plot.left() - 0.5 || x > plot.right() + 0.5 {
        chevron(&painter, handle, x > plot.right(), palette);
    }
    let response = response.on_hover_and_drag_cursor(CursorIcon::ResizeHorizontal);
    drag(ui, stack, lane, &response, desk);
    keys(ui, lane, &response, desk);
    if response.double_clicked() {
        desk.ask(Command::ReturnLane(lane.key));
    } else if response.clicked() {
        response.request_focus();
    }
    let number = value_ui(ui, stack, lane, handle, desk);
    let in_hand = held || response.has_focus();
    if !in_hand {
        response.on_hover_text(explain(lane));
    }
    let taken = number.union(Rect::from_center_size(handle, vec2(18.0, 18.0))).expand(1.0);
    Shown { active, in_hand, handle, taken }
}

/// Explains the word in the gutter.
fn name_ui(ui: &Ui, name: Rect, lane: &Lane) {
    let term = match lane.kind {
        LaneKind::Gain => "lane-gain",
        LaneKind::Zero => "compensator-zero",
        LaneKind::Pole => "compensator-pole",
    };
    let response = ui.interact(name.expand(3.0), Id::unique(("lane name", lane.key)), Sense::hover());
    response.widget_info(|| WidgetInfo::labeled(egui::Role::Label, true, format!("Name of the {}", lane.name)));
    super::explain::explained(ui, response, term, || format!("here {}", lane.formula));
}

/// The word in the gutter.
fn kind_word(kind: LaneKind) -> &'static str {
    match kind {
        LaneKind::Gain => "gain",
        LaneKind::Zero => "zero",
        LaneKind::Pole => "pole",
    }
}

fn explain(lane: &Lane) -> String {
    let at = quantity::print(lane.frequency_hz, Unit::Hertz);
    let rule = match lane.kind {
        LaneKind::Gain => "A double click lets the loop cross at the aim beside the parts.",
        LaneKind::Zero | LaneKind::Pole => "A double click puts it where the pole-zero rules do.",
    };
    format!("{}: {at}\n{}\n{}\n{rule}", lane.name, lane.formula, lane.help)
}

/// Tells screen readers what the handle is and where it stands.
fn describe(ui: &Ui, response: &Response, lane: &Lane) {
    response.widget_info(|| WidgetInfo::slider(true, lane.frequency_hz, lane.name));
    let text = quantity::print(lane.frequency_hz, Unit::Hertz);
    ui.ctx().accesskit_node_builder(response.id, |node| {
        node.set_value(text);
        node.add_action(egui::accesskit::Action::Increment);
        node.add_action(egui::accesskit::Action::Decrement);
    });
}

/// The mark of a lane's aim, where the parts miss it.
fn aim(painter: &Painter, stack: &Stack, lane: &Lane, y: f32, desk: &Desk<'_>, palette: &Palette) {
    let Some(aim_hz) = desk.session.design().aims.get(lane.key) else { return };
    if (aim_hz / lane.frequency_hz - 1.0).abs() < APART || !stack.gain.x.holds(aim_hz) {
        return;
    }
    let x = stack.gain.x.at(aim_hz);
    painter
        .line_segment([pos2(x, y - 7.0), pos2(x, y + 7.0)], Stroke::new(1.6, palette.compensator.gamma_multiply(0.7)));
    let handle = stack.gain.x.at(lane.frequency_hz);
    painter.hline(x.min(handle)..=x.max(handle), y, Stroke::new(2.5, palette.compensator.gamma_multiply(0.45)));
}

fn paint_handle(painter: &Painter, at: Pos2, kind: LaneKind, active: bool, palette: &Palette) {
    let size = if active { theme::HANDLE + 1.0 } else { theme::HANDLE };
    let stroke = Stroke::new(2.4, palette.compensator);
    let ground = palette.canvas;
    match kind {
        LaneKind::Zero => {
            painter.circle(at, size, ground, stroke);
        }
        LaneKind::Pole => {
            painter.circle_filled(at, size, ground);
            let arm = size * 0.82;
            painter.line_segment([at - vec2(arm, arm), at + vec2(arm, arm)], stroke);
            painter.line_segment([at - vec2(arm, -arm), at + vec2(arm, -arm)], stroke);
        }
        LaneKind::Gain => {
            let arm = size * 1.1;
            let corners = vec![at - vec2(0.0, arm), at + vec2(arm, 0.0), at + vec2(0.0, arm), at - vec2(arm, 0.0)];
            painter.add(egui::Shape::convex_polygon(corners, ground, stroke));
        }
    }
}

/// Points to where a lane stands that is beyond the axis.
fn chevron(painter: &Painter, at: Pos2, right: bool, palette: &Palette) {
    let way = if right { 1.0 } else { -1.0 };
    let tip = at + vec2(way * 14.0, 0.0);
    let stroke = Stroke::new(1.8, palette.compensator);
    painter.line_segment([tip - vec2(way * 4.0, 4.0), tip], stroke);
    painter.line_segment([tip - vec2(way * 4.0, -4.0), tip], stroke);
}

/// Follows the pointer while the handle is held.
fn drag(ui: &Ui, stack: &Stack, lane: &Lane, response: &Response, desk: &mut Desk<'_>) {
    if response.drag_started() {
        desk.view.gesture = desk.view.gesture.next();
        let handle_x = stack.gain.x.at(lane.frequency_hz);
        let press = ui.input(|input| input.pointer.press_origin());
        desk.view.drag =
            Some(Drag { handle_x, pointer_x: press.map_or(handle_x, |at| at.x), gesture: desk.view.gesture });
        response.request_focus();
    }
    if let (true, Some(drag), Some(pointer)) =
        (response.dragged(), &mut desk.view.drag, response.interact_pointer_pos())
        && drag.moved_to(pointer.x)
    {
        let modifiers = ui.input(|input| input.modifiers);
        let x = drag.follow(pointer.x, if modifiers.shift { FINE } else { 1.0 });
        let gesture = drag.gesture;
        let frequency_hz = snapped(stack, x, modifiers, lane, desk);
        desk.ask(Command::MoveLane { key: lane.key, frequency_hz, gesture });
    }
    if response.drag_stopped() {
        desk.view.drag = None;
    }
}

/// The frequency at a position, or that of a landmark or a lane of the same kind very near to it; not with Shift or Alt [Hz].
fn snapped(stack: &Stack, x: f32, modifiers: Modifiers, lane: &Lane, desk: &Desk<'_>) -> f64 {
    let axis = stack.gain.x;
    if modifiers.shift || modifiers.alt {
        return axis.value(x);
    }
    let detail = desk.session.analysis().and_then(|analysis| analysis.shown.as_ref().ok());
    let landmarks = detail.into_iter().flat_map(|detail| &detail.landmarks).map(|landmark| landmark.frequency_hz);
    let alike = |other: &&Lane| other.kind == lane.kind && other.key != lane.key && !desk.session.tied(lane.kind);
    let lanes = desk.session.lanes().iter().filter(alike).map(|other| other.frequency_hz);
    let apart = |hz: f64| (axis.at(hz) - x).abs();
    let near = landmarks.chain(lanes).filter(|hz| apart(*hz) < SNAP);
    near.min_by(|one, other| apart(*one).total_cmp(&apart(*other))).unwrap_or_else(|| axis.value(x))
}

/// Arrow keys move, Enter types. A run of keys on one handle is one step of undo.
fn keys(ui: &Ui, lane: &Lane, response: &Response, desk: &mut Desk<'_>) {
    if !response.has_focus() {
        return;
    }
    if response.gained_focus() && desk.view.drag.is_none() {
        desk.view.gesture = desk.view.gesture.next();
    }
    let filter = EventFilter { horizontal_arrows: true, ..EventFilter::default() };
    ui.memory_mut(|memory| memory.set_focus_lock_filter(response.id, filter));
    let mut steps = 0.0;
    let (mut typing, mut home) = (false, false);
    ui.input_mut(|input| {
        for (key, way) in [(Key::ArrowRight, 1.0), (Key::ArrowLeft, -1.0)] {
            steps += way * input.count_and_consume_key(Modifiers::NONE, key) as f64;
            steps += way * f64::from(FINE) * input.count_and_consume_key(Modifiers::SHIFT, key) as f64;
        }
        steps += input.num_accesskit_action_requests(response.id, egui::accesskit::Action::Increment) as f64;
        steps -= input.num_accesskit_action_requests(response.id, egui::accesskit::Action::Decrement) as f64;
        typing = input.consume_key(Modifiers::NONE, Key::Enter);
        home = input.consume_key(Modifiers::NONE, Key::Home);
    });
    if home {
        desk.ask(Command::ReturnLane(lane.key));
    }
    if steps != 0.0 {
        desk.ask(Command::MoveLane {
            key: lane.key,
            frequency_hz: lane.frequency_hz * 10f64.powf(steps * NUDGE),
            gesture: desk.view.gesture,
        });
    }
    if typing {
        begin_typing(lane, desk);
    }
}

fn begin_typing(lane: &Lane, desk: &mut Desk<'_>) {
    desk.view.typing =
        Some(Typing { lane: lane.key, text: quantity::print(lane.frequency_hz, Unit::Hertz), error: None });
}

/// The number beside the handle; pressed, it is typed. Gives back where it stands.
fn value_ui(ui: &mut Ui, stack: &Stack, lane: &Lane, at: Pos2, desk: &mut Desk<'_>) -> Rect {
    let palette = palette(ui);
    let on_left = at.x > stack.gain.rect.center().x;
    let way = if on_left { -1.0 } else { 1.0 };
    let align = if on_left { Align2::RIGHT_CENTER } else { Align2::LEFT_CENTER };
    let start = at + vec2(way * 15.0, 0.0);
    if desk.view.typing.as_ref().is_some_and(|typing| typing.lane == lane.key) {
        let rect = Rect::from_min_size(start - vec2(if on_left { 92.0 } else { 0.0 }, 10.5), vec2(92.0, 21.0));
        typing_ui(ui, rect, lane, desk);
        return rect;
    }
    let painter = ui.painter().clone();
    let text = quantity::print_digits(lane.frequency_hz, Unit::Hertz, 3);
    let galley = painter.layout_no_wrap(text, theme::strong(12.0), palette.ink);
    let rect = align.anchor_size(start, galley.size());
    let response = ui.interact(rect.expand2(vec2(4.0, 2.0)), Id::unique(("lane value", lane.key)), Sense::click());
    let name = format!("Type {}", lane.name);
    response.widget_info(|| WidgetInfo::labeled(egui::Role::Button, true, &name));
    let ink = if response.hovered() || response.has_focus() { palette.accent } else { palette.ink };
    painter.rect_filled(rect.expand2(vec2(3.0, 0.0)), 2.0, palette.canvas.gamma_multiply(0.9));
    painter.galley_with_override_text_color(rect.min, galley, ink);
    super::legend::focus_ring(ui, &response);
    if response.on_hover_text("Press to type a frequency.").clicked() {
        begin_typing(lane, desk);
    }
    rect
}

/// The field a lane's frequency is typed into.
fn typing_ui(ui: &mut Ui, rect: Rect, lane: &Lane, desk: &mut Desk<'_>) {
    let Some(typing) = &mut desk.view.typing else { return };
    let id = Id::unique(("lane typing", lane.key));
    let edit = egui::TextEdit::singleline(&mut typing.text).id(id).font(theme::body()).margin(vec2(4.0, 2.0));
    let response = ui.put(rect, edit).accessible_name(format!("{} frequency", lane.name));
    if !response.has_focus() && !response.lost_focus() {
        response.request_focus();
    }
    if let Some(error) = &typing.error {
        let colours = (palette(ui).problem, palette(ui).canvas);
        let at = rect.right_center() + vec2(8.0, 0.0);
        super::plot::tag(ui.painter(), at, Align2::LEFT_CENTER, error, theme::small(), colours);
    }
    if ui.input(|input| input.key_pressed(Key::Escape)) {
        desk.view.typing = None;
        return;
    }
    if !response.lost_focus() {
        return;
    }
    let entered = ui.input(|input| input.key_pressed(Key::Enter));
    match quantity::parse(&typing.text, Unit::Hertz) {
        Ok(frequency_hz) if frequency_hz > 0.0 => {
            desk.view.typing = None;
            desk.view.gesture = desk.view.gesture.next();
            let gesture = desk.view.gesture;
            desk.ask(Command::MoveLane { key: lane.key, frequency_hz, gesture });
        }
        Ok(_) => typing.error = Some("must be above 0 Hz".to_owned()),
        Err(error) if entered => typing.error = Some(error.reason),
        Err(_) => desk.view.typing = None,
    }
}
