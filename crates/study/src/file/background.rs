//! `[background]` and `[prediction]`.

use super::quantity::Quantity;
use super::section::Section;
use super::source::Located;
use crate::fault::Fault;
use crate::nearest::Nearest;

/// `[background]`: the homogeneous universe and the matter in it today.
#[derive(Clone, Debug, PartialEq)]
pub struct BackgroundSection {
    /// Ωm, matter.
    pub omega_m: Located<Quantity>,
    /// Ωb, baryons.
    pub omega_b: Located<Quantity>,
    /// H0 in 100 km/s/Mpc.
    pub h: Located<Quantity>,
    /// Spectral index.
    pub n_s: Located<Quantity>,
    /// Linear rms of matter in 8 Mpc/h today, in general relativity.
    pub sigma8: Located<Quantity>,
    /// Ωk, default 0.
    pub omega_k: Located<Quantity>,
    /// Dark energy's w today, default −1.
    pub w0: Located<Quantity>,
    /// −dw/da, default 0.
    pub wa: Located<Quantity>,
    /// Shape of the linear matter power, default Eisenstein & Hu with wiggles.
    pub power: Located<PowerChoice>,
}

/// Shape of the linear matter power spectrum as given.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum PowerChoice {
    /// `eisenstein-hu`.
    EisensteinHu,
    /// `eisenstein-hu-smooth`.
    EisensteinHuSmooth,
    /// The path of a table `wavenumber,power`, as written.
    Table(String),
}

const POWER_SHAPES: [(&str, PowerChoice); 2] =
    [("eisenstein-hu", PowerChoice::EisensteinHu), ("eisenstein-hu-smooth", PowerChoice::EisensteinHuSmooth)];

impl BackgroundSection {
    pub(super) fn read(section: Section<'_>) -> Option<Self> {
        let omega_m = section.required_quantity("omega_m", "0.31");
        let omega_b = section.required_quantity("omega_b", "0.049");
        let h = section.required_quantity("h", "0.68");
        let n_s = section.required_quantity("n_s", "0.965");
        let sigma8 = section.required_quantity("sigma8", "0.81");
        let omega_k = section.quantity_or("omega_k", 0.0);
        let w0 = section.quantity_or("w0", -1.0);
        let wa = section.quantity_or("wa", 0.0);
        let power = read_power(&section);
        section.finish();
        Some(Self {
            omega_m: omega_m?,
            omega_b: omega_b?,
            h: h?,
            n_s: n_s?,
            sigma8: sigma8?,
            omega_k: omega_k?,
            w0: w0?,
            wa: wa?,
            power: power?,
        })
    }
}

/// A word is a shape; what has a dot or a slash is a path.
fn read_power(section: &Section<'_>) -> Option<Located<PowerChoice>> {
    if section.find("power").is_none() {
        return Some(Located::default_of(PowerChoice::EisensteinHu));
    }
    let text = section.text("power", "\"eisenstein-hu\"")?;
    if let Some((_, choice)) = POWER_SHAPES.iter().find(|(name, _)| *name == text.value) {
        return Some(text.map(|_| choice.clone()));
    }
    if text.value.contains(['.', '/', '\\']) {
        return Some(text.map(PowerChoice::Table));
    }
    let names = POWER_SHAPES.iter().map(|(name, _)| *name).chain(["PATH/TABLE.csv"]);
    let nearest = Nearest::find(&text.value, names);
    section.fault_at("power", Fault::UnknownChoice { what: "power spectrum", value: text.value, nearest });
    None
}

/// `[prediction]`: which effects are predicted, and how.
#[derive(Clone, Debug, PartialEq)]
pub struct PredictionSection {
    /// Wide-angle terms, default true.
    pub wide_angle: Located<bool>,
    /// Light-cone evolution, default true.
    pub light_cone: Located<bool>,
    /// Lensing, default true.
    pub lensing: Located<bool>,
    /// Damping length, Mpc/h, default 0.5.
    pub damping: Located<Quantity>,
    /// Σ, the length over which the acoustic peak is smeared, Mpc/h, default 0.
    pub smearing: Located<Quantity>,
    /// γ of f = Ωm(a)^γ, in place of the growth equation.
    pub growth_index: Option<Located<Quantity>>,
    /// How far apart the clocks of the derived clock contrast stand, Mpc/h, default 50.
    pub clock_distance: Located<Quantity>,
}

impl PredictionSection {
    /// Everything as it is without the section.
    pub(super) fn defaults() -> Self {
        Self {
            wide_angle: Located::default_of(true),
            light_cone: Located::default_of(true),
            lensing: Located::default_of(true),
            damping: Located::default_of(Quantity::Held(0.5)),
            smearing: Located::default_of(Quantity::Held(0.0)),
            growth_index: None,
            clock_distance: Located::default_of(Quantity::Held(50.0)),
        }
    }

    pub(super) fn read(section: Section<'_>) -> Option<Self> {
        let wide_angle = section.flag("wide_angle", true);
        let light_cone = section.flag("light_cone", true);
        let lensing = section.flag("lensing", true);
        let damping = section.quantity_or("damping", 0.5);
        let smearing = section.quantity_or("smearing", 0.0);
        let growth_index = section.quantity("growth_index");
        let clock_distance = section.quantity_or("clock_distance", 50.0);
        section.finish();
        Some(Self {
            wide_angle: wide_angle?,
            light_cone: light_cone?,
            lensing: lensing?,
            damping: damping?,
            smearing: smearing?,
            growth_index,
            clock_distance: clock_distance?,
        })
    }
}
