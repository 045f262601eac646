//! What a lane in the hand does: its parts and the loop's margin, before and now, on a card beside it that covers no other lane.

use std::sync::Arc;

use eframe::egui::{Galley, Pos2, Rect, Stroke, StrokeKind, Ui, pos2, text::LayoutJob, text::TextFormat, vec2};

use super::bode::Stack;
use super::theme::{self, LANE_HEIGHT, Palette, palette};
use super::view::Desk;
use crate::compensator::{Lane, Part};
use crate::design::Design;
use crate::quantity::{self, Unit};

/// Parts on one line of the card.
const IN_A_LINE: usize = 3;
/// Greatest width of a remark [points].
const WIDTH: f32 = 380.0;
/// Change of a part below which it is not worth a word [ratio − 1].
const CHANGED: f64 = 5e-4;
/// Distance between the places that are tried [points].
const STRIDE: f32 = 16.0;
/// Room between the text of the card and its edge [points].
const MARGIN: f32 = 6.0;

/// A lane with where its handle stands and what must stay in sight.
#[derive(Debug)]
pub(super) struct Held<'a> {
    /// The lane.
    pub lane: &'a Lane,
    /// Its handle [points].
    pub handle: Pos2,
    /// Handles and numbers of all lanes.
    pub taken: &'a [Rect],
    /// Whether a hand or the keyboard is at it, not only the pointer over it.
    pub in_hand: bool,
}

/// Draws the card of a lane.
pub(super) fn card_ui(ui: &Ui, stack: &Stack, held: &Held<'_>, desk: &Desk<'_>) {
    let palette = palette(ui);
    let lines = lines(held, desk);
    let text = lay_out(ui, &lines, desk.session.lane_remark(held.lane.key), (stack.gain.rect.width(), palette));
    let Some(text) = text else { return };
    let size = text.size() + vec2(2.0 * MARGIN, 6.0);
    let plot = stack.gain.rect;
    let top = stack.lanes.top().min(stack.lanes.bottom() - size.y) - 2.0;
    let bounds = Rect::from_min_max(pos2(plot.left() + 2.0, top), pos2(plot.right() - 2.0, stack.lanes.bottom() + 2.0));
    let rect = place(bounds, size, held);
    ui.painter().rect(rect, 4.0, palette.field, Stroke::new(1.0, palette.field_edge), StrokeKind::Inside);
    ui.painter().galley(rect.min + vec2(MARGIN, 3.0), text, palette.ink);
}

/// The place nearest to the handle that covers no handle and no number; where there is none, the one that covers least.
fn place(bounds: Rect, size: eframe::egui::Vec2, held: &Held<'_>) -> Rect {
    let steps = |from: f32, to: f32, step: f32| {
        let count = ((to - from) / step).max(0.0).floor();
        (0..=200_u16)
            .map(f32::from)
            .take_while(move |k| *k <= count)
            .map(move |k| from + k * step)
            .chain([to.max(from)])
    };
    let mut best: Option<(f32, Rect)> = None;
    for y in steps(bounds.top(), bounds.bottom() - size.y, LANE_HEIGHT / 4.0) {
        for x in steps(bounds.left(), bounds.right() - size.x, STRIDE) {
            let rect = Rect::from_min_size(pos2(x, y), size);
            let covered: f32 =
                held.taken.iter().map(|taken| taken.intersect(rect)).filter(Rect::is_positive).map(|r| r.area()).sum();
            let across = (rect.left() - held.handle.x).max(held.handle.x - rect.right()).max(0.0);
            let up = (rect.center().y - held.handle.y).abs();
            let cost = 1e3 * covered + across + 2.0 * up;
            if best.is_none_or(|(least, _)| cost < least) {
                best = Some((cost, rect));
            }
        }
    }
    best.map_or(Rect::from_min_size(bounds.min, size), |(_, rect)| rect)
}

/// A quantity before and now.
#[derive(Clone, Debug, PartialEq)]
struct Change {
    name: &'static str,
    before: Option<String>,
    now: String,
}

/// What the parts become, and what the loop does.
fn lines(held: &Held<'_>, desk: &Desk<'_>) -> Vec<Vec<Change>> {
    let before = desk.session.headline_before(desk.view.gesture).filter(|_| held.in_hand);
    let start = before.map(|_| desk.session.design_before(desk.view.gesture));
    let parts = parts(held.lane, start, desk.session.design());
    let mut lines: Vec<_> = parts.chunks(IN_A_LINE).map(<[Change]>::to_vec).collect();
    let Some(before) = before else { return lines };
    let now = desk.session.headline();
    let said = |value: Option<f64>, unit, stable: bool| match value {
        _ if !stable => "unstable".to_owned(),
        Some(value) => quantity::print_digits(value, unit, 3),
        None => "none".to_owned(),
    };
    let change = |name, pick: fn((f64, f64)) -> f64, unit| {
        let before = said(before.crossover.map(pick), unit, before.stable);
        let now = said(now.crossover.map(pick), unit, now.stable);
        Change { name, before: (before != now).then_some(before), now }
    };
    let tenth = |pair: (f64, f64)| (pair.1 * 10.0).round() / 10.0;
    lines.push(vec![change("phase margin", tenth, Unit::Degree), change("crossover", |pair| pair.0, Unit::Hertz)]);
    lines
}

/// Parts that the move changed, or those of the lane where it changed none.
fn parts(lane: &Lane, start: Option<&Design>, now: &Design) -> Vec<Change> {
    let value = |design: &Design, part: Part| design.values.get_or_default(part.entry());
    let moved = |part: Part| {
        let (before, now) = (start.and_then(|start| value(start, part))?, value(now, part)?);
        ((now / before - 1.0).abs() > CHANGED).then_some(before)
    };
    let any = Part::ALL.iter().any(|part| moved(*part).is_some());
    let of_lane = |part: &Part| if any { moved(*part).is_some() } else { lane.parts.contains(&part.path()) };
    let change = |part: Part| {
        let unit = part.entry().unit;
        let print = |value| quantity::print_digits(value, unit, 3);
        Some(Change { name: part.label(), before: moved(part).map(print), now: print(value(now, part)?) })
    };
    Part::ALL.into_iter().filter(of_lane).filter_map(change).collect()
}

/// The card's text: names weak, numbers in ink; the remark under it. Nothing when there is nothing to say.
fn lay_out(ui: &Ui, lines: &[Vec<Change>], remark: Option<&str>, room: (f32, &Palette)) -> Option<Arc<Galley>> {
    let (width, palette) = room;
    let weak = TextFormat::simple(theme::small(), palette.weak);
    let ink = TextFormat::simple(theme::strong(11.5), palette.ink);
    let mut job = LayoutJob::default();
    for (row, line) in lines.iter().enumerate() {
        for (column, change) in line.iter().enumerate() {
            let gap = if column > 0 { "    " } else { "" };
            job.append(&format!("{gap}{} ", change.name), 0.0, weak.clone());
            if let Some(before) = &change.before {
                job.append(&format!("{before} → "), 0.0, weak.clone());
            }
            job.append(&change.now, 0.0, ink.clone());
        }
        if row + 1 < lines.len() || remark.is_some() {
            job.append("\n", 0.0, weak.clone());
        }
    }
    if let Some(remark) = remark {
        job.append(remark, 0.0, TextFormat::simple(theme::small(), palette.ink));
    }
    job.wrap.max_width = (width - 24.0).min(WIDTH);
    (!job.text.is_empty()).then(|| ui.painter().layout_job(job))
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::compensator::Compensator;
    use crate::design::sample;

    fn lane() -> Lane {
        let design = sample::built_in();
        Compensator::from_values(&design.values, &design.choices).unwrap().lanes().remove(0)
    }

    /// Wherever the handles stand, the card covers none of them and stays within its bounds.
    #[test]
    fn the_card_covers_no_lane() {
        let lane = lane();
        let bounds = Rect::from_min_max(pos2(60.0, 400.0), pos2(560.0, 520.0));
        for shift in 0..40_u8 {
            let rows: Vec<Rect> = (0..5_u8)
                .map(|row| {
                    let x = 60.0 + f32::from(shift) * 10.0 * (1.0 + 0.3 * f32::from(row)) % 400.0;
                    Rect::from_min_size(pos2(x, 402.0 + 23.0 * f32::from(row)), vec2(95.0, 16.0))
                })
                .collect();
            for row in &rows {
                let held = Held { lane: &lane, handle: row.left_center(), taken: &rows, in_hand: true };
                let rect = place(bounds, vec2(260.0, 34.0), &held);
                assert!(bounds.contains_rect(rect));
                let free = |rect: Rect| !rows.iter().any(|row| row.shrink(0.1).intersects(rect));
                // A place somewhat larger than the card is hit by the stride of the search.
                let roomy = vec2(260.0 + STRIDE, 34.0 + LANE_HEIGHT / 4.0);
                let somewhere = (0..120_u8).any(|x| {
                    (0..40_u8).any(|y| {
                        let at = bounds.min + vec2(2.0 * f32::from(x), 2.0 * f32::from(y));
                        let rect = Rect::from_min_size(at, roomy);
                        bounds.contains_rect(rect) && free(rect)
                    })
                });
                assert!(free(rect) || !somewhere, "{rect:?} over {rows:?}");
            }
        }
    }
}
