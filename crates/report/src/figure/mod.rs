//! Figures: marks on a canvas, written as SVG for the page and as SVG or PDF for a paper.

mod colours;
mod contour;
mod frame;
mod pdf;
mod scale;
mod scene;
mod svg;

pub(crate) use colours::{ALARM, AXIS, BAND, CATEGORIES, Colour, FIELD, GRID, INK, MUTED, PAPER, RELATIVITY};
pub(crate) use contour::contours;
pub(crate) use frame::{Frame, Labels};
pub(crate) use scale::{Scale, range};
pub use scene::Figure;
pub(crate) use scene::{Anchor, Dash, Mark, Shape, Stroke};
