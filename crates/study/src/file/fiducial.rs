//! `fiducial` of a survey: the background that turned its redshifts into distances.

use oddwell_cosmology::{Background, CosmologyError};

use super::section::Section;
use super::source::{Located, Origin};

/// `fiducial = { omega_m = 0.30 }`: numbers only, since the measurements were made once.
#[derive(Clone, Debug, PartialEq)]
pub struct FiducialSection {
    /// Ωm.
    pub omega_m: Located<f64>,
    /// Ωk, default 0.
    pub omega_k: Located<f64>,
    /// Dark energy's w today, default −1.
    pub w0: Located<f64>,
    /// −dw/da, default 0.
    pub wa: Located<f64>,
    /// H0 in 100 km/s/Mpc; lengths given in Mpc are converted with it.
    pub h: Option<Located<f64>>,
    /// Where it stands.
    pub origin: Origin,
}

impl FiducialSection {
    /// Reads the key `fiducial` of a survey, which is there.
    pub(super) fn read(survey: &Section<'_>) -> Option<Self> {
        let example = "{ omega_m = 0.30 }";
        let (_, item) = survey.find("fiducial")?;
        let section = survey.table("fiducial", "fiducial", "`fiducial` of [[survey]]", example)?;
        if section.find("omega_m").is_none() {
            section.missing("omega_m", "omega_m = 0.30");
        }
        let omega_m = section.number("omega_m", "0.30");
        let or = |key: &str, default: f64, example| match section.find(key) {
            Some(_) => section.number(key, example),
            None => Some(Located::default_of(default)),
        };
        let omega_k = or("omega_k", 0.0, "0.0");
        let w0 = or("w0", -1.0, "-1.0");
        let wa = or("wa", 0.0, "0.0");
        let h = match section.find("h") {
            Some(_) => section.number("h", "0.68").map(Some),
            None => Some(None),
        };
        section.finish();
        let origin = survey.origin("fiducial", item);
        Some(Self { omega_m: omega_m?, omega_k: omega_k?, w0: w0?, wa: wa?, h: h?, origin })
    }

    /// The background.
    ///
    /// # Errors
    /// An Ωm that is not above 0.
    pub fn background(&self) -> Result<Background, CosmologyError> {
        Background::new(self.omega_m.value, self.omega_k.value, self.w0.value, self.wa.value)
    }
}
