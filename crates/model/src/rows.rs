//! What one measured number is: which bin, which pair, which multipole, where.

use std::fmt;

/// Which two samples were correlated.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub enum Pair {
    /// The cross-correlation; separations run from the first tracer to the second.
    FirstSecond,
    /// The first tracer with itself.
    FirstFirst,
    /// The second tracer with itself.
    SecondSecond,
}

impl Pair {
    /// Every pair, in the order of the documentation.
    pub const ALL: [Pair; 3] = [Pair::FirstSecond, Pair::FirstFirst, Pair::SecondSecond];

    /// The pair's name in a table: `first-second`, `first-first` or `second-second`.
    #[must_use]
    pub fn name(self) -> &'static str {
        match self {
            Pair::FirstSecond => "first-second",
            Pair::FirstFirst => "first-first",
            Pair::SecondSecond => "second-second",
        }
    }

    /// The pair of that name, if there is one.
    #[must_use]
    pub fn parse(name: &str) -> Option<Pair> {
        Pair::ALL.into_iter().find(|pair| pair.name() == name)
    }
}

impl fmt::Display for Pair {
    fn fmt(&self, formatter: &mut fmt::Formatter<'_>) -> fmt::Result {
        formatter.write_str(self.name())
    }
}

/// Whether a multipole was measured against separation or against wavenumber.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub enum Space {
    /// ξₗ(s), s in Mpc/h, dimensionless.
    Separation,
    /// Pₗ(k), k in h/Mpc, in (Mpc/h)³; odd multipoles are the imaginary part.
    Fourier,
}

/// The direction that stands for "along the line of sight" of a pair.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub enum SightLine {
    /// Towards the first tracer of the pair.
    First,
    /// Towards the middle of the pair.
    Midpoint,
    /// Towards the second tracer of the pair.
    Second,
}

impl SightLine {
    /// Every sight-line, in the order of the documentation.
    pub const ALL: [SightLine; 3] = [SightLine::First, SightLine::Midpoint, SightLine::Second];

    /// How far along the way from tracer 1 to tracer 2 it passes: t = 0, ½ or 1.
    #[must_use]
    pub fn fraction(self) -> f64 {
        match self {
            SightLine::First => 0.0,
            SightLine::Midpoint => 0.5,
            SightLine::Second => 1.0,
        }
    }

    /// The name in a study file.
    #[must_use]
    pub fn name(self) -> &'static str {
        match self {
            SightLine::First => "first",
            SightLine::Midpoint => "midpoint",
            SightLine::Second => "second",
        }
    }

    /// The sight-line of that name, if there is one.
    #[must_use]
    pub fn parse(name: &str) -> Option<SightLine> {
        SightLine::ALL.into_iter().find(|sight_line| sight_line.name() == name)
    }
}

/// One number to predict.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Row {
    /// Index into [`crate::ModelSetup::bins`].
    pub bin: usize,
    /// Which samples.
    pub pair: Pair,
    /// ℓ, 0 to 4.
    pub multipole: u8,
    /// Separation or wavenumber.
    pub space: Space,
    /// Where: Mpc/h or h/Mpc, above 0.
    pub at: f64,
    /// The edges of the shell that the prediction is averaged over (weight s² ds, or k² dk); none: the value at `at`.
    pub edges: Option<(f64, f64)>,
}
