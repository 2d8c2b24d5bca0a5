//! Which rows of a table enter the likelihood.

use crate::error::{DataError, listed, nearest};
use crate::rows::{Axis, PAIRS};
use crate::table::{MeasuredRow, MultipoleTable};

/// Slack of an end, relative to it: a shell that ends at 144 Mpc/h still lies inside [24, 144] after its ends went
/// through a change of unit (a few roundings of 10⁻¹⁶ each).
const SLACK: f64 = 1e-9;

/// One entry of `keep`: a row passes if it meets every criterion that is given.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Keep {
    /// Separations in Mpc/h, ends included. Alone, it leaves no row that is measured at a wavenumber.
    pub separation: Option<(f64, f64)>,
    /// Wavenumbers in h/Mpc, ends included. Alone, it leaves no row that is measured at a separation.
    pub wavenumber: Option<(f64, f64)>,
    /// Multipoles.
    pub multipoles: Option<Vec<u8>>,
    /// Names of bins.
    pub bins: Option<Vec<String>>,
    /// Pairs.
    pub pairs: Option<Vec<String>>,
}

impl Keep {
    /// Whether a row meets every criterion. A row with a shell lies inside an interval if the shell does.
    pub fn passes(&self, row: &MeasuredRow) -> bool {
        let (interval, other) = match row.axis {
            Axis::Separation => (self.separation, self.wavenumber),
            Axis::Wavenumber => (self.wavenumber, self.separation),
        };
        let in_interval = match interval {
            Some((low, high)) => {
                let (from, to) = row.edges.unwrap_or((row.at, row.at));
                from >= low - SLACK * low.abs() && to <= high + SLACK * high.abs()
            }
            None => other.is_none(),
        };
        in_interval
            && self.multipoles.as_ref().is_none_or(|list| list.contains(&row.multipole))
            && self.bins.as_ref().is_none_or(|list| list.contains(&row.bin))
            && self.pairs.as_ref().is_none_or(|list| list.contains(&row.pair))
    }

    /// Names must exist: a slip of the pen would otherwise cut data without a word. A pair or multipole that exists
    /// and that the table lacks is no mistake.
    fn check(&self, entry: usize, table: &MultipoleTable) -> Result<(), DataError> {
        for (what, interval) in [("separation", self.separation), ("wavenumber", self.wavenumber)] {
            if let Some((low, high)) =
                interval.filter(|(low, high)| low > high || low.is_nan() || high.is_nan())
            {
                return Err(DataError::KeepInverted { entry, what, low, high });
            }
        }
        if let Some(order) = self.multipoles.iter().flatten().find(|order| **order > 4) {
            return Err(DataError::KeepUnknown {
                entry,
                what: "multipole",
                name: order.to_string(),
                nearest: None,
                known: listed(["0", "1", "2", "3", "4"]),
            });
        }
        let bins = table.bins();
        for (what, wanted, known) in [("bin", &self.bins, bins.as_slice()), ("pair", &self.pairs, &PAIRS)] {
            if let Some(name) = wanted.iter().flatten().find(|name| !known.contains(&name.as_str())) {
                return Err(DataError::KeepUnknown {
                    entry,
                    what,
                    name: name.clone(),
                    nearest: nearest(name, known.iter().copied()),
                    known: listed(known.iter().copied()),
                });
            }
        }
        Ok(())
    }
}

/// Positions of the rows of a table that `keep` leaves, and of those that it cuts; each in the table's order.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Kept {
    /// Rows that stay.
    pub rows: Vec<usize>,
    /// Rows that go.
    pub cut: Vec<usize>,
}

/// Applies a list of `keep` entries: a row stays if it passes any of them. An empty list keeps everything.
///
/// # Errors
/// An interval inside out, a bin that no row has, an unknown pair or multipole, nothing left.
pub fn keep_rows(table: &MultipoleTable, keep: &[Keep]) -> Result<Kept, DataError> {
    for (entry, criteria) in keep.iter().enumerate() {
        criteria.check(entry + 1, table)?;
    }
    let stays = |row: &MeasuredRow| keep.is_empty() || keep.iter().any(|entry| entry.passes(row));
    let (rows, cut): (Vec<usize>, Vec<usize>) = (0..table.len()).partition(|row| stays(&table.rows[*row]));
    if rows.is_empty() {
        return Err(DataError::NothingKept {
            file: table.file.clone(),
            rows: table.len(),
            reach: reach(table),
        });
    }
    Ok(Kept { rows, cut })
}

/// The separations and wavenumbers that a table covers, shells included, in words.
fn reach(table: &MultipoleTable) -> String {
    let over = |axis: Axis| {
        let ends =
            table.rows.iter().filter(|row| row.axis == axis).map(|row| row.edges.unwrap_or((row.at, row.at)));
        ends.reduce(|all, next| (all.0.min(next.0), all.1.max(next.1)))
            .map(|(low, high)| format!("{}s from {low} to {high}", axis.name()))
    };
    [Axis::Separation, Axis::Wavenumber].into_iter().filter_map(over).collect::<Vec<_>>().join(" and ")
}
