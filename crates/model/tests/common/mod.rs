//! One bin with two tracers, as the tests of a prediction need it.

#![allow(dead_code, reason = "each test program uses a part")]
#![allow(clippy::unwrap_used, clippy::panic, reason = "a test stops at the first surprise")]

use oddwell_cosmology::{Background, PowerShape};
use oddwell_model::{
    BinSetup, Effects, FeltBy, Model, ModelSetup, Pair, Row, SightLine, Space, Workspace, departures,
};

/// A setup of one bin `s.q` with those rows; everything else is a default to be overwritten.
pub(crate) fn setup(redshift: f64, rows: Vec<Row>) -> ModelSetup {
    ModelSetup {
        bins: vec![BinSetup {
            survey: "s".into(),
            name: "q".into(),
            nodes: vec![(redshift, 1.0)],
            sight_line: SightLine::Midpoint,
            growth_given: false,
            observed_slopes: [false; 2],
            fiducial: None,
        }],
        rows,
        power: PowerShape::EisensteinHu,
        effects: Effects::default(),
        growth_index: false,
        smallest_damping: 0.5,
        departure: departures::find("none").unwrap(),
        felt_by: FeltBy::Light,
    }
}

/// The background of [`values`].
pub(crate) fn background() -> Background {
    Background::new(0.31, 0.0, -1.0, 0.0).unwrap()
}

/// Two different tracers with every effect, damping 0.5 Mpc/h; the departure's own values are for the caller to set.
pub(crate) fn values(model: &Model) -> Vec<f64> {
    let mut values = model.layout().zeros();
    for (name, value) in [
        ("background.omega_m", 0.31),
        ("background.omega_b", 0.049),
        ("background.h", 0.68),
        ("background.n_s", 0.965),
        ("background.sigma8", 0.81),
        ("background.w0", -1.0),
        ("prediction.damping", 0.5),
        ("s.q.offset", 6.0),
        ("s.q.first.bias", 2.1),
        ("s.q.first.magnification", 0.7),
        ("s.q.first.evolution", -1.3),
        ("s.q.first.bias_slope", -0.4),
        ("s.q.second.bias", 1.2),
        ("s.q.second.magnification", 0.2),
        ("s.q.second.evolution", 0.8),
        ("s.q.second.bias_slope", 0.3),
    ] {
        set(model, &mut values, name, value);
    }
    values
}

pub(crate) fn set(model: &Model, values: &mut [f64], name: &str, value: f64) {
    values[model.layout().index(name).unwrap_or_else(|| panic!("no slot {name}"))] = value;
}

pub(crate) fn predict(model: &Model, values: &[f64]) -> Vec<f64> {
    let mut out = vec![0.0; model.setup().rows.len()];
    model.predict(values, &mut Workspace::new(), &mut out).unwrap();
    out
}

pub(crate) fn row(pair: Pair, multipole: u8, space: Space, at: f64) -> Row {
    Row { bin: 0, pair, multipole, space, at, edges: None }
}

/// Rows of the cross pair at each of `places`.
pub(crate) fn rows(space: Space, multipoles: &[u8], places: &[f64]) -> Vec<Row> {
    let at = |&multipole| places.iter().map(move |&at| row(Pair::FirstSecond, multipole, space, at));
    multipoles.iter().flat_map(at).collect()
}

/// Worst difference, in units of the largest value of the pair's multipole in its space.
pub(crate) fn worst(got: &[f64], expected: &[f64], rows: &[Row]) -> f64 {
    let scale = |like: &Row| {
        let same = rows.iter().zip(expected).filter(|(row, _)| {
            (row.space, row.pair, row.multipole) == (like.space, like.pair, like.multipole)
        });
        same.fold(0.0, |scale: f64, (_, value)| scale.max(value.abs()))
    };
    let off = |((got, expected), row): ((&f64, &f64), &Row)| (got - expected).abs() / scale(row);
    got.iter().zip(expected).zip(rows).map(off).fold(0.0, |worst, off| if off <= worst { worst } else { off })
}
