//! The frame of a plot: axes, ticks, labels, and what is drawn inside.

use super::colours::{AXIS, Colour, GRID, MUTED};
use super::scale::Scale;
use super::scene::{Anchor, Mark, Stroke};

/// Size of letters on axes.
const SMALL: f64 = 11.0;

/// What the axes say.
#[derive(Clone, Copy, Debug, Default)]
pub(crate) struct Labels<'a> {
    /// Below.
    pub(crate) x: &'a str,
    /// At the left.
    pub(crate) y: &'a str,
    /// Whether the horizontal axis has numbers; a plot above another leaves them to that.
    pub(crate) bare_x: bool,
    /// Whether the vertical axis has none.
    pub(crate) bare_y: bool,
}

/// A rectangle with a scale along each side.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Frame {
    pub(crate) x: Scale,
    pub(crate) y: Scale,
}

impl Frame {
    pub(crate) fn at(&self, (x, y): (f64, f64)) -> (f64, f64) {
        (self.x.at(x), self.y.at(y))
    }

    /// A line through points in the plot's own numbers; parts outside are moved to the frame.
    pub(crate) fn line(&self, points: impl IntoIterator<Item = (f64, f64)>, stroke: Stroke) -> Mark {
        Mark::line(points.into_iter().map(|(x, y)| (self.x.clamped(x), self.y.clamped(y))).collect(), stroke)
    }

    /// The area between two lines of equal length.
    pub(crate) fn band(&self, points: &[(f64, f64, f64)], fill: Colour, opacity: f64) -> Mark {
        let place = |x: f64, y: f64| (self.x.clamped(x), self.y.clamped(y));
        let above = points.iter().map(|&(x, _, high)| place(x, high));
        let below = points.iter().rev().map(|&(x, low, _)| place(x, low));
        Mark::Area { points: above.chain(below).collect(), fill, opacity }
    }

    /// A horizontal line through the whole frame.
    pub(crate) fn across(&self, y: f64, stroke: Stroke) -> Mark {
        let (left, right) = self.x.ends();
        Mark::line(vec![(left, self.y.clamped(y)), (right, self.y.clamped(y))], stroke)
    }

    /// A vertical line through the whole frame.
    pub(crate) fn up(&self, x: f64, stroke: Stroke) -> Mark {
        let (bottom, top) = self.y.ends();
        Mark::line(vec![(self.x.clamped(x), bottom), (self.x.clamped(x), top)], stroke)
    }

    /// A line between two values at one x: an error bar.
    pub(crate) fn bar(&self, x: f64, (low, high): (f64, f64), stroke: Stroke) -> Mark {
        self.line([(x, low), (x, high)], stroke)
    }

    /// Axes with about `counts` ticks and faint lines across at the ticks of the vertical axis.
    pub(crate) fn axes(&self, labels: Labels<'_>, counts: (usize, usize)) -> Vec<Mark> {
        let ((left, right), (bottom, top)) = (self.x.ends(), self.y.ends());
        let axis = Stroke::solid(AXIS, 1.0);
        let mut marks = Vec::new();
        if !labels.bare_y {
            for (value, label) in self.y.ticks(counts.1) {
                let y = self.y.at(value);
                marks.push(Mark::line(vec![(left, y), (right, y)], Stroke::solid(GRID, 1.0)));
                marks.push(Mark::words((left - 6.0, y + 3.8), label, SMALL, Anchor::End, MUTED));
            }
        }
        for (value, label) in self.x.ticks(counts.0) {
            let x = self.x.at(value);
            marks.push(Mark::line(vec![(x, bottom), (x, bottom + 4.0)], axis));
            if !labels.bare_x {
                marks.push(Mark::words((x, bottom + 16.0), label, SMALL, Anchor::Middle, MUTED));
            }
        }
        marks.push(Mark::line(vec![(left, bottom), (right, bottom)], axis));
        if !labels.x.is_empty() {
            let middle = (0.5 * (left + right), bottom + 32.0);
            marks.push(Mark::words(middle, labels.x, 12.0, Anchor::Middle, MUTED));
        }
        if !labels.y.is_empty() {
            // Above the axis, where it is read without turning the head.
            marks.push(Mark::words((left - 40.0, top - 8.0), labels.y, 12.0, Anchor::Start, MUTED));
        }
        marks
    }
}
