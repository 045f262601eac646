//! What a figure is made of: lines, areas and words, each with a role in place of a colour, and places that stand for
//! entries of the design.
//!
//! *Conventions*: lengths in points, x to the right, y downward, the origin at the figure's upper left corner.

/// A point of a figure [points]: x to the right, y downward.
pub type Point = [f64; 2];

/// What a mark stands for; colour and, for curves, line style follow from it.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub enum Role {
    /// What is read first: symbols, values, frames of text.
    Ink,
    /// What explains: names of axes, part designators.
    Quiet,
    /// Lines of a grid.
    Grid,
    /// Frame of a plot, decades, zero line.
    GridStrong,
    /// The ground a figure stands on.
    Ground,
    /// A margin, or a requirement that is met.
    Good,
    /// A requirement that is missed.
    Missed,
    /// The plant.
    Plant,
    /// The compensator.
    Compensator,
    /// The loop gain, and closed-loop responses.
    LoopGain,
    /// The exact plant, broad under the averaged one.
    ExactPlant,
    /// The exact loop gain or closed-loop response, broad under the averaged one; the ripple about a mean.
    ExactLoop,
    /// A held curve, and the open loop beside the closed one.
    Held,
    /// A measured curve.
    Measured,
    /// Band over the conditions.
    Band,
    /// Band a response has to settle into.
    Settle,
    /// A landmark of the plant.
    Landmark,
}

/// Style of a line.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub enum Dash {
    /// Unbroken.
    #[default]
    Solid,
    /// Dashes.
    Dashed,
    /// Dashes and dots in turn.
    DashDot,
    /// Dots.
    Dotted,
}

/// Where a text stands against its point, along one direction.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub enum Align {
    /// It begins there: left end, or upper edge.
    #[default]
    Start,
    /// Its middle is there.
    Middle,
    /// It ends there: right end, or lower edge.
    End,
}

/// Weight of letters.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub enum Weight {
    /// Usual.
    #[default]
    Regular,
    /// Heavy.
    Bold,
}

/// One mark of a figure. Marks are painted in their order.
#[derive(Clone, Debug, PartialEq)]
pub enum Mark {
    /// A line through points.
    Line {
        /// Its points.
        points: Vec<Point>,
        /// What it stands for.
        role: Role,
        /// Its width [points].
        width: f64,
        /// Its style.
        dash: Dash,
    },
    /// A filled polygon, convex or a band between two curves.
    Area {
        /// Its corners in turn.
        points: Vec<Point>,
        /// What it stands for.
        role: Role,
    },
    /// A circle.
    Circle {
        /// Its centre.
        centre: Point,
        /// Its radius [points].
        radius: f64,
        /// What it stands for.
        role: Role,
        /// Width of its line [points]; none fills it.
        width: Option<f64>,
    },
    /// One line of text.
    Text {
        /// Where it stands.
        at: Point,
        /// The words.
        text: String,
        /// What it stands for.
        role: Role,
        /// Height of its letters [points].
        size: f64,
        /// Their weight.
        weight: Weight,
        /// Where it stands against its point, across and down.
        align: (Align, Align),
    },
}

/// A place of a figure that stands for entries of the design: to press, to point at, to light up.
#[derive(Clone, Debug, PartialEq)]
pub struct Place {
    /// Accessible name: "Inductor 10 µH".
    pub name: String,
    /// Upper left and lower right corner.
    pub corners: [Point; 2],
    /// Paths of the entries and choices it stands for, the most important first.
    pub paths: Vec<String>,
    /// Marks of the figure that draw it, as a range of indices.
    pub marks: std::ops::Range<usize>,
}

/// A picture in neutral terms.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Figure {
    /// Width and height [points].
    pub size: [f64; 2],
    /// What is painted, in order.
    pub marks: Vec<Mark>,
    /// What can be pointed at.
    pub places: Vec<Place>,
}
