//! Where the items of a plan stand: heights first, then places from left to right so that nothing touches anything else.
//!
//! Every item claims frames for its wires, symbols and words. Items are put down in order, each as far left as its claims
//! allow; columns then move apart evenly as far as the width given allows, and what stands along the rail goes to the middle.

use super::pen::{Frame, Label, Line};
use super::plan::{Item, Seat};
use super::stroke::Align;
use super::symbol::{self, HALF, Way};
use super::values::Words;
use crate::circuit::{Sketch, Symbol};

/// Least room between the claims of two items [points].
const PAD: f64 = 4.0;
/// Height of one seat of a column [points].
const SEAT: f64 = 40.0;
/// Least height between the rails [points].
const RAILS: f64 = 72.0;
/// Distance of the second winding from the first [points].
pub(super) const WINDINGS: f64 = 21.0;
/// Greatest distance between columns that a wide drawing is stretched to [points].
const WIDEST: f64 = 86.0;
/// Room between symbol and words [points].
pub(super) const BESIDE: f64 = 3.0;
/// Room between the rail and the words under the drawing [points].
const UNDER: f64 = 4.0;

/// Where the words of parts in columns stand.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Manner {
    /// Right of their symbol.
    Beside,
    /// Under the ground rail.
    Under,
    /// Under the ground rail, in two rows by turns.
    InTurn,
    /// The same, values alone.
    Tight,
}

impl Manner {
    pub(super) const ALL: [Manner; 4] = [Manner::Beside, Manner::Under, Manner::InTurn, Manner::Tight];

    fn in_turn(self) -> bool {
        matches!(self, Manner::InTurn | Manner::Tight)
    }
}

/// A part in its place.
#[derive(Clone, Debug)]
pub(super) struct Spot {
    pub(super) seat: Seat,
    /// Centre of the symbol.
    pub(super) centre: [f64; 2],
    pub(super) way: Way,
    /// Labels with where they are anchored and how.
    pub(super) labels: Vec<(Label, [f64; 2], (Align, Align))>,
    /// A line from the part to its words.
    pub(super) leader: Option<[[f64; 2]; 2]>,
    /// What stands for the part: its symbol, and its words where they are close by.
    pub(super) place: Frame,
}

/// An item about its own axis at x = 0.
#[derive(Clone, Debug)]
pub(super) struct Block {
    pub(super) spots: Vec<Spot>,
    /// Half of the width between the terminals of the parts on the rail; zero for a column.
    pub(super) half: f64,
    pub(super) over_from: usize,
    column: bool,
    claims: Vec<Frame>,
}

/// Heights of rails.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Heights {
    pub(super) over: f64,
    pub(super) rail: f64,
    pub(super) ground: f64,
}

/// Items in their places.
#[derive(Clone, Debug)]
pub(super) struct Ladder {
    pub(super) heights: Heights,
    pub(super) blocks: Vec<Block>,
    pub(super) places: Vec<f64>,
    /// Frame of everything.
    pub(super) frame: Frame,
}

/// What the blocks are made from.
struct Maker<'a> {
    sketch: &'a Sketch,
    words: &'a [Words],
    manner: Manner,
    heights: Heights,
    /// Height of the first row of words under the drawing.
    row: f64,
}

/// Puts the items down for a wished width.
pub(super) fn ladder(items: &[Item], sketch: &Sketch, words: &[Words], manner: Manner, width: f64) -> Ladder {
    let heights = heights(items, words);
    let row = row_height(items, words);
    let maker = Maker { sketch, words, manner, heights, row };
    let mut columns = 0;
    let blocks: Vec<Block> = items
        .iter()
        .map(|item| match item {
            Item::Along { main, over } => maker.along(main, over),
            Item::Column { chain, second } => {
                columns += 1;
                maker.column(chain, second.is_some(), columns - 1)
            }
        })
        .collect();
    let (mut least, mut most) = (0.0, WIDEST);
    let fits = |gap: f64| {
        let frame = frame(&blocks, &places(&blocks, gap));
        frame.right - frame.left <= width
    };
    if fits(most) {
        least = most;
    }
    for _ in 0..24 {
        let middle = f64::midpoint(least, most);
        if fits(middle) { least = middle } else { most = middle }
    }
    let places = places(&blocks, least);
    let frame = frame(&blocks, &places);
    Ladder { heights, blocks, places, frame }
}

/// Heights of the rails for what stands on, over and between them.
fn heights(items: &[Item], words: &[Words]) -> Heights {
    let mut seats = RAILS;
    let mut over = false;
    for item in items {
        match item {
            Item::Along { over: parts, .. } => over |= !parts.is_empty(),
            Item::Column { chain, .. } => {
                let tallest = chain.iter().map(|seat| Label::new(words[seat.part].lines()).height() + 4.0);
                seats = seats.max(tallest.fold(SEAT, f64::max) * chain.len() as f64);
            }
        }
    }
    let rail = if over { 62.0 } else { 24.0 };
    Heights { over: 24.0, rail, ground: rail + seats }
}

/// Height of the tallest label of a column.
fn row_height(items: &[Item], words: &[Words]) -> f64 {
    let height = |item: &Item| match item {
        Item::Along { .. } => 0.0,
        Item::Column { chain, .. } => chain.iter().map(|seat| Label::new(words[seat.part].lines()).height()).sum(),
    };
    items.iter().map(height).fold(0.0, f64::max)
}

impl Maker<'_> {
    fn symbol(&self, seat: &Seat) -> Symbol {
        self.sketch.parts[seat.part].drawn.symbol
    }

    fn along(&self, main: &[Seat], over: &[Seat]) -> Block {
        let pitch = |seats: &[Seat]| seats.iter().map(|seat| self.along_width(seat)).fold(0.0, f64::max);
        let (main_pitch, over_pitch) = (pitch(main), pitch(over));
        let drop = if over.is_empty() { 0.0 } else { 5.0 };
        let half = (main_pitch * (main.len() - 1) as f64 / 2.0 + HALF).max(over_pitch * over.len() as f64 / 2.0) + drop;
        let mut spots: Vec<Spot> = Vec::new();
        for (seats, pitch, y) in [(main, main_pitch, self.heights.rail), (over, over_pitch, self.heights.over)] {
            let middle = (seats.len().max(1) - 1) as f64 / 2.0;
            spots.extend(
                seats.iter().enumerate().map(|(k, seat)| self.along_spot(seat, [(k as f64 - middle) * pitch, y])),
            );
        }
        let mut claims: Vec<Frame> = spots.iter().map(|spot| spot.place).collect();
        if !over.is_empty() {
            claims.push(Frame::new(-half, self.heights.over, half, self.heights.rail));
        }
        Block { spots, half, over_from: main.len(), column: false, claims }
    }

    /// Room a part on the rail takes beside others on the same line.
    fn along_width(&self, seat: &Seat) -> f64 {
        let words = &self.words[seat.part];
        let quiet = Label::new(words.quiet.iter().map(|text| Line::quiet(text)).collect());
        (2.0 * HALF).max(Line::both(&words.designator, &words.value).width()).max(quiet.width()) + 2.0 * PAD
    }

    fn along_spot(&self, seat: &Seat, centre: [f64; 2]) -> Spot {
        let words = &self.words[seat.part];
        let way = if seat.flipped { Way::Left } else { Way::Right };
        let symbol = symbol::frame(self.symbol(seat), way).moved(centre[0], centre[1]);
        let value = Label::new(vec![Line::both(&words.designator, &words.value)]);
        let quiet = Label::new(words.quiet.iter().map(|text| Line::quiet(text)).collect());
        let labels = vec![
            (value, [centre[0], symbol.top - 1.0], (Align::Middle, Align::End)),
            (quiet, [centre[0], symbol.bottom + 1.5], (Align::Middle, Align::Start)),
        ];
        spot(*seat, centre, way, labels, symbol, true)
    }

    fn column(&self, chain: &[Seat], second: bool, number: usize) -> Block {
        let mut words_top = self.heights.ground + UNDER;
        if self.manner.in_turn() && number % 2 == 1 {
            words_top += self.row + 2.0;
        }
        let first_top = words_top;
        let mut spots = Vec::new();
        for (k, seat) in chain.iter().enumerate() {
            let spot = self.column_spot(seat, (k, chain.len()), second, words_top, number == 0);
            if self.manner != Manner::Beside && number > 0 {
                words_top += spot.labels.iter().map(|(label, ..)| label.height()).sum::<f64>();
            }
            spots.push(spot);
        }
        let words =
            spots.iter().flat_map(|spot: &Spot| &spot.labels).map(|(label, at, align)| label.frame(*at, *align));
        let mut claims: Vec<Frame> = words.chain(spots.iter().map(|spot| spot.place)).collect();
        claims.push(Frame::new(-1.0, self.heights.rail, 1.0, first_top));
        if number == 0 {
            claims.push(Frame::new(-7.0, self.heights.ground, 7.0, self.heights.ground + 11.0));
        }
        if second {
            claims.push(Frame::new(WINDINGS - 6.0, self.heights.rail, WINDINGS + 2.0, self.heights.ground));
        }
        Block { spots, half: 0.0, over_from: 0, column: true, claims }
    }

    /// A part in a column of which it is number `k` of `count`.
    fn column_spot(&self, seat: &Seat, (k, count): (usize, usize), second: bool, words_top: f64, corner: bool) -> Spot {
        let (rail, ground) = (self.heights.rail, self.heights.ground);
        let centre = [0.0, rail + (ground - rail) * (k as f64 + 0.5) / count as f64];
        let way = if seat.flipped { Way::Up } else { Way::Down };
        let mut symbol = symbol::frame(self.symbol(seat), way).moved(0.0, centre[1]);
        let winding = second && k == 0;
        if winding {
            symbol = symbol.union(Frame::new(-6.5, symbol.top, WINDINGS + 6.5, symbol.bottom));
        }
        let words = &self.words[seat.part];
        // Under the rail the words of a chain stand one below the other, so each takes a line less.
        let under = count > 1 && self.manner != Manner::Beside;
        let label = Label::new(if under { words.short_lines() } else { words.lines() });
        let (at, align, near) = match self.manner {
            Manner::Beside if second && !winding => {
                ([symbol.left - BESIDE, centre[1]], (Align::End, Align::Middle), true)
            }
            // Right of the source there is room, and its ground symbol hangs below.
            Manner::Beside => ([symbol.right + BESIDE, centre[1]], (Align::Start, Align::Middle), true),
            _ if corner => ([symbol.right + BESIDE, centre[1]], (Align::Start, Align::Middle), true),
            Manner::Under => ([0.0, words_top], (Align::Middle, Align::Start), count == 1),
            Manner::InTurn | Manner::Tight => ([0.0, words_top], (Align::Middle, Align::Start), false),
        };
        let mut spot = spot(*seat, centre, way, vec![(label, at, align)], symbol, near);
        if words_top > ground + UNDER && self.manner.in_turn() && k == 0 && !corner {
            spot.leader = Some([[0.0, ground + 2.0], [0.0, words_top - 1.0]]);
        }
        spot
    }
}

fn spot(
    seat: Seat,
    centre: [f64; 2],
    way: Way,
    labels: Vec<(Label, [f64; 2], (Align, Align))>,
    symbol: Frame,
    near: bool,
) -> Spot {
    let labels: Vec<_> = labels.into_iter().filter(|(label, ..)| !label.lines.is_empty()).collect();
    let mut place = symbol;
    if near {
        place = labels.iter().map(|(label, at, align)| label.frame(*at, *align)).fold(place, Frame::union);
    }
    Spot { seat, centre, way, labels, leader: None, place }
}

/// Places of the blocks' axes from left to right, columns no nearer to one another than `gap`.
fn places(blocks: &[Block], gap: f64) -> Vec<f64> {
    let mut places: Vec<f64> = Vec::with_capacity(blocks.len());
    let mut last_column: Option<usize> = None;
    for (k, block) in blocks.iter().enumerate() {
        let mut x = least_place(blocks, &places, block);
        if block.column {
            if let Some(before) = last_column {
                let free = x;
                x = x.max(places[before] + gap);
                spread(&mut places[before + 1..], x - free);
            }
            last_column = Some(k);
        }
        places.push(x);
    }
    places
}

/// Shares room that came free to the right of a run among its gaps.
fn spread(run: &mut [f64], room: f64) {
    let gaps = (run.len() + 1) as f64;
    for (k, place) in run.iter_mut().enumerate() {
        *place += room * (k + 1) as f64 / gaps;
    }
}

/// The least place at which a block's claims keep off those of all before it.
fn least_place(blocks: &[Block], places: &[f64], block: &Block) -> f64 {
    let mut least = places.last().map_or(0.0, |last| last + PAD);
    for (before, x) in blocks.iter().zip(places) {
        for theirs in &before.claims {
            for ours in &block.claims {
                if theirs.top < ours.bottom + PAD / 2.0 && ours.top < theirs.bottom + PAD / 2.0 {
                    least = least.max(x + theirs.right + PAD - ours.left);
                }
            }
        }
    }
    least
}

fn frame(blocks: &[Block], places: &[f64]) -> Frame {
    let all = blocks.iter().zip(places).flat_map(|(block, x)| block.claims.iter().map(|claim| claim.moved(*x, 0.0)));
    all.reduce(Frame::union).unwrap_or(Frame::new(0.0, 0.0, 0.0, 0.0)).grown(2.0)
}
