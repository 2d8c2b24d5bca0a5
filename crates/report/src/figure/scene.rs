//! What a figure is made of, whatever it is written as.

use super::colours::Colour;

/// A figure: a canvas of `width` by `height` (units of a CSS pixel; y downwards) with marks on it.
#[derive(Clone, Debug, PartialEq)]
pub struct Figure {
    /// A word for file names: lower-case letters, digits and dashes.
    pub name: String,
    /// What it shows.
    pub title: String,
    /// What it says, with its numbers: for those who can't see it.
    pub description: String,
    pub(crate) width: f64,
    pub(crate) height: f64,
    pub(crate) marks: Vec<Mark>,
}

/// Something drawn.
#[derive(Clone, Debug, PartialEq)]
pub(crate) enum Mark {
    /// A line.
    Line { points: Vec<(f64, f64)>, stroke: Stroke },
    /// Many short lines of one kind.
    Segments { segments: Vec<[(f64, f64); 2]>, stroke: Stroke },
    /// A filled area.
    Area { points: Vec<(f64, f64)>, fill: Colour, opacity: f64 },
    /// A symbol about a point.
    Symbol { at: (f64, f64), radius: f64, shape: Shape, colour: Colour },
    /// Words.
    Words { at: (f64, f64), text: String, size: f64, anchor: Anchor, colour: Colour, upright: bool },
    /// Marks that belong together: the quantities that they are about, and what a reader who points at them is told.
    Group { keys: Vec<String>, tip: Option<String>, marks: Vec<Mark> },
}

/// How a line is drawn.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(crate) struct Stroke {
    pub(crate) colour: Colour,
    pub(crate) width: f64,
    pub(crate) dash: Dash,
}

/// Dashes: lines differ by them also where colours do not.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(crate) enum Dash {
    Solid,
    Long,
    Short,
    Mixed,
}

impl Dash {
    pub(crate) const ALL: [Dash; 4] = [Dash::Solid, Dash::Long, Dash::Short, Dash::Mixed];

    /// Lengths of strokes and gaps.
    pub(crate) fn lengths(self) -> &'static [f64] {
        match self {
            Dash::Solid => &[],
            Dash::Long => &[7.0, 4.0],
            Dash::Short => &[2.0, 3.0],
            Dash::Mixed => &[8.0, 3.0, 2.0, 3.0],
        }
    }
}

/// Symbols, distinct in outline.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(crate) enum Shape {
    Disc,
    Square,
    Triangle,
    Diamond,
}

impl Shape {
    pub(crate) const ALL: [Shape; 4] = [Shape::Disc, Shape::Square, Shape::Diamond, Shape::Triangle];

    /// Corners about the origin, of about the same area as a disc of that radius; none for the disc itself.
    pub(crate) fn corners(self, radius: f64) -> Option<Vec<(f64, f64)>> {
        let r = radius;
        match self {
            Shape::Disc => None,
            Shape::Square => Some(vec![
                (-0.89 * r, -0.89 * r),
                (0.89 * r, -0.89 * r),
                (0.89 * r, 0.89 * r),
                (-0.89 * r, 0.89 * r),
            ]),
            Shape::Triangle => Some(vec![(0.0, -1.3 * r), (1.2 * r, 0.85 * r), (-1.2 * r, 0.85 * r)]),
            Shape::Diamond => {
                Some(vec![(0.0, -1.25 * r), (1.25 * r, 0.0), (0.0, 1.25 * r), (-1.25 * r, 0.0)])
            }
        }
    }
}

/// Where a text stands about its point.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(crate) enum Anchor {
    Start,
    Middle,
    End,
}

impl Stroke {
    pub(crate) fn solid(colour: Colour, width: f64) -> Stroke {
        Stroke { colour, width, dash: Dash::Solid }
    }

    pub(crate) fn dashed(self, dash: Dash) -> Stroke {
        Stroke { dash, ..self }
    }
}

impl Mark {
    pub(crate) fn line(points: Vec<(f64, f64)>, stroke: Stroke) -> Mark {
        Mark::Line { points, stroke }
    }

    pub(crate) fn words(
        at: (f64, f64),
        text: impl Into<String>,
        size: f64,
        anchor: Anchor,
        colour: Colour,
    ) -> Mark {
        Mark::Words { at, text: text.into(), size, anchor, colour, upright: true }
    }

    /// Marks about some quantities, with what a reader who points at them is told.
    pub(crate) fn about(keys: &[&str], tip: impl Into<String>, marks: Vec<Mark>) -> Mark {
        Mark::Group { keys: keys.iter().map(|key| (*key).to_owned()).collect(), tip: Some(tip.into()), marks }
    }

    /// Marks that are highlighted with some quantities.
    pub(crate) fn keyed(keys: &[&str], marks: Vec<Mark>) -> Mark {
        Mark::Group { keys: keys.iter().map(|key| (*key).to_owned()).collect(), tip: None, marks }
    }
}
