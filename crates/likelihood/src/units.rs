//! Lengths in Mpc, converted to Mpc/h.

use std::str::FromStr;

use crate::error::{DataError, nearest};
use crate::rows::Axis;
use crate::table::{MeasuredRow, MultipoleTable};

/// The unit of length of a file. Everything past reading is in Mpc/h.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub enum LengthUnit {
    /// Mpc/h, h/Mpc, (Mpc/h)³.
    #[default]
    MegaparsecPerH,
    /// Mpc, 1/Mpc, Mpc³.
    Megaparsec,
}

impl FromStr for LengthUnit {
    type Err = DataError;

    fn from_str(text: &str) -> Result<Self, DataError> {
        match text {
            "Mpc/h" => Ok(Self::MegaparsecPerH),
            "Mpc" => Ok(Self::Megaparsec),
            _ => Err(DataError::UnknownUnit {
                text: text.to_owned(),
                nearest: nearest(text, ["Mpc/h", "Mpc"]),
            }),
        }
    }
}

/// What a measured value in Mpc-units is multiplied with: h³ for a power spectrum, 1 for a correlation function.
fn value_factor(axis: Axis, h: f64) -> f64 {
    match axis {
        Axis::Separation => 1.0,
        Axis::Wavenumber => h.powi(3),
    }
}

impl MultipoleTable {
    /// Converts a table whose lengths are in Mpc to Mpc/h with the Hubble constant h (in 100 km/s/Mpc).
    ///
    /// Separations × h, wavenumbers / h, with their shells; power spectra (value and error) × h³; correlation
    /// functions stay. A covariance from a file goes with [`value_factors`](Self::value_factors).
    ///
    /// # Errors
    /// [`DataError::BadHubble`] unless h is finite and above 0.
    pub fn from_megaparsec(mut self, h: f64) -> Result<Self, DataError> {
        if !(h.is_finite() && h > 0.0) {
            return Err(DataError::BadHubble { file: self.file, h });
        }
        for row in &mut self.rows {
            let MeasuredRow { axis, at, edges, value, error, .. } = row;
            let length = |x: f64| match axis {
                Axis::Separation => x * h,
                Axis::Wavenumber => x / h,
            };
            *at = length(*at);
            *edges = edges.map(|(low, high)| (length(low), length(high)));
            *value *= value_factor(*axis, h);
            *error = error.map(|error| error * value_factor(*axis, h));
        }
        Ok(self)
    }

    /// The factor by which [`from_megaparsec`](Self::from_megaparsec) multiplies each row's value; the covariance
    /// goes with the product of two of them ([`Covariance::scaled`](crate::Covariance::scaled)).
    pub fn value_factors(&self, h: f64) -> Vec<f64> {
        self.rows.iter().map(|row| value_factor(row.axis, h)).collect()
    }
}
