//! A figure as SVG on white ground, for documents: plain shapes and text, nothing a viewer has to fetch.
//!
//! *Conventions*: one unit of the picture is one point of the figure. Letters ask for Inter and fall back to the viewer's own
//! sans-serif.

use crate::figure::{Align, Dash, Figure, Mark, Point, Role, Weight};
use std::fmt::Write as _;

/// Colour of a role on white paper, in the colour-blind-safe set of the light theme.
fn colour(role: Role) -> &'static str {
    match role {
        Role::Ink | Role::LoopGain => "#161719",
        Role::Quiet => "#5c5e62",
        Role::Grid => "#e8e8e2",
        Role::GridStrong => "#bdbdb5",
        Role::Ground => "#ffffff",
        Role::Good => "#127a56",
        Role::Missed => "#b45a00",
        Role::Plant => "#0086a8",
        Role::ExactPlant => "#9fd6e4",
        Role::ExactLoop => "#bcbec4",
        Role::Compensator => "#9c3f8a",
        Role::Held => "#7c7e82",
        Role::Measured => "#8a6a00",
        Role::Band => "#e3e7ee",
        Role::Settle => "#e4f0ea",
        Role::Landmark => "#6b6d71",
    }
}

/// Strokes and gaps of a line's style [points].
fn dashes(dash: Dash) -> Option<&'static str> {
    match dash {
        Dash::Solid => None,
        Dash::Dashed => Some("7 4"),
        Dash::DashDot => Some("9 3.4 1.8 3.4"),
        Dash::Dotted => Some("1.6 3.2"),
    }
}

/// Writes a figure as an SVG document.
pub fn svg(figure: &Figure) -> String {
    let [width, height] = figure.size.map(short);
    let mut out = String::with_capacity(4096);
    // Writing to a string cannot fail.
    let _ = write!(
        out,
        "<svg xmlns=\"http://www.w3.org/2000/svg\" width=\"{width}\" height=\"{height}\" viewBox=\"0 0 {width} {height}\" \
         font-family=\"Inter, sans-serif\">\n<rect width=\"100%\" height=\"100%\" fill=\"#ffffff\"/>\n"
    );
    for mark in &figure.marks {
        draw(&mut out, mark);
    }
    out.push_str("</svg>\n");
    out
}

fn draw(out: &mut String, mark: &Mark) {
    let _ = match mark {
        Mark::Line { points, role, width, dash } => {
            let style = dashes(*dash).map_or(String::new(), |dashes| format!(" stroke-dasharray=\"{dashes}\""));
            writeln!(
                out,
                "<polyline points=\"{}\" fill=\"none\" stroke=\"{}\" stroke-width=\"{}\" stroke-linejoin=\"round\"{style}/>",
                corners(points),
                colour(*role),
                short(*width)
            )
        }
        Mark::Area { points, role } => {
            writeln!(out, "<polygon points=\"{}\" fill=\"{}\"/>", corners(points), colour(*role))
        }
        Mark::Circle { centre, radius, role, width } => {
            let paint = match width {
                Some(width) => format!("fill=\"none\" stroke=\"{}\" stroke-width=\"{}\"", colour(*role), short(*width)),
                None => format!("fill=\"{}\"", colour(*role)),
            };
            writeln!(
                out,
                "<circle cx=\"{}\" cy=\"{}\" r=\"{}\" {paint}/>",
                short(centre[0]),
                short(centre[1]),
                short(*radius)
            )
        }
        Mark::Text { at, text, role, size, weight, align } => {
            let anchor = match align.0 {
                Align::Start => "start",
                Align::Middle => "middle",
                Align::End => "end",
            };
            // Not every viewer knows other baselines than the alphabetic one, so the text is moved: capitals are 0.73 high.
            let down: f64 = match align.1 {
                Align::Start => 0.86,
                Align::Middle => 0.36,
                Align::End => -0.14,
            };
            // What marks a curve stands over curves: paper around its letters keeps it readable.
            let halo = " stroke=\"#ffffff\" stroke-width=\"3\" stroke-linejoin=\"round\" paint-order=\"stroke\"";
            let halo = if matches!(role, Role::Good | Role::Missed) { halo } else { "" };
            let heavy = if *weight == Weight::Bold {
                " font-family=\"Inter Semi Bold, Inter, sans-serif\" font-weight=\"600\""
            } else {
                ""
            };
            writeln!(
                out,
                "<text x=\"{}\" y=\"{}\" font-size=\"{}\" fill=\"{}\" text-anchor=\"{anchor}\"{heavy}{halo}>{}</text>",
                short(at[0]),
                short(down.mul_add(*size, at[1])),
                short(*size),
                colour(*role),
                escaped(text)
            )
        }
    };
}

fn corners(points: &[Point]) -> String {
    let mut text = String::with_capacity(points.len() * 14);
    for [x, y] in points {
        let _ = write!(text, "{},{} ", short(*x), short(*y));
    }
    text.truncate(text.trim_end().len());
    text
}

/// A coordinate to a hundredth of a point, without needless zeros.
fn short(value: f64) -> String {
    let text = format!("{value:.2}");
    let text = text.trim_end_matches('0').trim_end_matches('.');
    if text == "-0" { "0".to_owned() } else { text.to_owned() }
}

/// Text without what XML reads as its own, and without control characters, which XML has no form for.
fn escaped(text: &str) -> String {
    let mut safe = String::with_capacity(text.len());
    for letter in text.chars() {
        match letter {
            '&' => safe.push_str("&amp;"),
            '<' => safe.push_str("&lt;"),
            '>' => safe.push_str("&gt;"),
            '"' => safe.push_str("&quot;"),
            letter if letter.is_control() => safe.push(' '),
            letter => safe.push(letter),
        }
    }
    safe
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn titles_cannot_break_the_document() {
        let mark = Mark::Text {
            at: [1.0, 2.0],
            text: "a<b & \"c\"\u{0}".to_owned(),
            role: Role::Ink,
            size: 10.0,
            weight: Weight::Regular,
            align: (Align::Start, Align::Start),
        };
        let text = svg(&Figure { size: [10.0, 10.0], marks: vec![mark], places: Vec::new() });
        assert!(text.contains(">a&lt;b &amp; &quot;c&quot; </text>"), "{text}");
    }

    #[test]
    fn coordinates_are_short() {
        assert_eq!([1.0, 0.333_333, -0.001, 12.5].map(short), ["1", "0.33", "0", "12.5"]);
    }
}
