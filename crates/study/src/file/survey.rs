//! `[[survey]]` and its `[[survey.bin]]`.

use std::collections::BTreeMap;

use oddwell_likelihood::{LengthUnit, TABLE_COLUMNS};
use oddwell_model::SightLine;

use toml_edit::{Item, Value};

use super::covariance::{EmptyBlock, read_determined, read_empty_blocks, read_mock_count, read_noise};
use super::design::{BinDesignSection, DesignSection};
use super::fiducial::FiducialSection;
use super::keep::KeepSection;
use super::quantity::Quantity;
use super::section::{Section, numbers_of};
use super::source::Located;
use super::template::TemplateSection;
use crate::fault::Fault;

/// `[[survey]]`: one table of measured multipoles with its covariance.
#[derive(Clone, Debug, PartialEq)]
pub struct SurveySection {
    /// The first part of its parameters' names.
    pub name: Located<String>,
    /// Path of the table of multipoles, as written; where only a design is given, the name that `simulate` gives it.
    pub multipoles: Located<String>,
    /// Path of the covariance, as written; none: from `mocks`, else from the table's `error` column.
    pub covariance: Option<Located<String>>,
    /// Path of a table that names the covariance's rows, as written; none: they follow the table of multipoles.
    pub covariance_rows: Option<Located<String>>,
    /// Path of an array of mock measurements, or a pattern of tables, one a realisation, as written.
    pub mocks: Option<Located<String>>,
    /// How many mocks the covariance was estimated from.
    pub mock_count: Option<Located<u64>>,
    /// Name of the noise model, one of [`noise_families`](oddwell_likelihood::noise_families); default `gaussian`.
    pub noise: Located<&'static str>,
    /// n_θ of noise `percival`; none: counted.
    pub determined: Option<Located<u64>>,
    /// Path of a covariance to be added, as written.
    pub extra_covariance: Option<Located<String>>,
    /// Path of a model covariance that an estimate from mocks is shrunk towards, as written.
    pub shrink_towards: Option<Located<String>>,
    /// Bins between which the covariance is declared empty.
    pub empty_blocks: Option<Located<Vec<EmptyBlock>>>,
    /// Shapes with amplitudes of their own.
    pub templates: Vec<TemplateSection>,
    /// The direction that separates odd from even, default through the midpoint.
    pub sight_line: Located<SightLine>,
    /// Unit of the table's lengths, default Mpc/h.
    pub unit: Located<LengthUnit>,
    /// The background that turned redshifts into distances; none: the one that is inferred, so no remapping.
    pub fiducial: Option<FiducialSection>,
    /// Path of the window matrix, as written; given exactly where `window_rows` is.
    pub window: Option<Located<String>>,
    /// Path of the table that names the window's columns, as written.
    pub window_rows: Option<Located<String>>,
    /// Rows that pass any entry are kept; empty: all of them.
    pub keep: Vec<KeepSection>,
    /// `[survey.design]`: how the survey is made, for `simulate` to draw from.
    pub design: Option<DesignSection>,
    /// `[survey.columns]`: our column name → the table's header.
    pub columns: BTreeMap<String, Located<String>>,
    /// The redshift bins.
    pub bins: Vec<BinSection>,
    /// Names of bins of the file that a restriction leaves out.
    pub left_out: Vec<String>,
}

/// `[[survey.bin]]`: one redshift bin with its two tracers.
#[derive(Clone, Debug, PartialEq)]
pub struct BinSection {
    /// The second part of its parameters' names, and the value of the table's `bin` column.
    pub name: Located<String>,
    /// The redshifts that the prediction is averaged over, above 0, with their weights, which sum to 1: one alone where
    /// `redshift` is given, the pair-weighted mean.
    pub nodes: Located<Vec<(f64, f64)>>,
    /// By how much the second tracer's redshifts lie above the first's, km/s, default 0.
    pub offset: Located<Quantity>,
    /// f of this bin, in place of the growth equation.
    pub growth_rate: Option<Located<Quantity>>,
    /// df/dln a of this bin; given exactly where `growth_rate` is.
    pub growth_slope: Option<Located<Quantity>>,
    /// How much of the bin is seen, and how densely; given where the survey has a design.
    pub design: Option<BinDesignSection>,
    /// The first tracer.
    pub first: TracerSection,
    /// The second tracer.
    pub second: TracerSection,
}

/// One of the two tracers of a bin.
#[derive(Clone, Debug, PartialEq)]
pub struct TracerSection {
    /// What to call it in figures, default `first` or `second`.
    pub label: Located<String>,
    /// b.
    pub bias: Located<Quantity>,
    /// s, ∂log10 N/∂magnitude at the flux limit.
    pub magnification: Located<Quantity>,
    /// e, ∂ln n_comoving/∂ln a at fixed luminosity threshold; given exactly where `observed_density_slope` is not.
    pub evolution: Option<Located<Quantity>>,
    /// The slope ∂ln n_comoving/∂ln a that the catalogue shows, in place of e: e = slope − 5 s (1 + 1/(r̃ H)).
    pub observed_density_slope: Option<Located<Quantity>>,
    /// dln b/dln a, default 0.
    pub bias_slope: Located<Quantity>,
}

const UNITS: [(&str, LengthUnit); 2] =
    [("Mpc/h", LengthUnit::MegaparsecPerH), ("Mpc", LengthUnit::Megaparsec)];

impl SurveySection {
    pub(super) fn read(section: Section<'_>) -> Option<Self> {
        let name = section.required_text("name", "\"my-survey\"");
        let design = DesignSection::read(&section);
        let multipoles = match (&name, &design, section.find("multipoles")) {
            (Some(name), Some(Some(_)), None) => {
                Some(Located::default_of(format!("{}-multipoles.csv", name.value)))
            }
            _ => section.required_text("multipoles", "\"multipoles.csv\""),
        };
        let covariance = section.text("covariance", "\"covariance.csv\"");
        let covariance_rows = section.text("covariance_rows", "\"rows.csv\"");
        let mocks = section.text("mocks", "\"mocks.npy\"");
        let mock_count = read_mock_count(&section);
        let noise = read_noise(&section);
        let determined = read_determined(&section);
        let extra_covariance = section.text("extra_covariance", "\"theory-covariance.csv\"");
        let shrink_towards = section.text("shrink_towards", "\"model-covariance.csv\"");
        let empty_blocks = read_empty_blocks(&section);
        let sight_lines = SightLine::ALL.map(|line| (line.name(), line));
        let sight_line = match section.find("sight_line") {
            Some(_) => section.choice("sight_line", "sight line", &sight_lines, "\"midpoint\""),
            None => Some(Located::default_of(SightLine::Midpoint)),
        };
        let unit = match section.find("unit") {
            Some(_) => section.choice("unit", "unit", &UNITS, "\"Mpc/h\""),
            None => Some(Located::default_of(LengthUnit::MegaparsecPerH)),
        };
        let fiducial = match section.find("fiducial") {
            Some(_) => FiducialSection::read(&section).map(Some),
            None => Some(None),
        };
        let window = section.text("window", "\"window.csv\"");
        let window_rows = section.text("window_rows", "\"window-rows.csv\"");
        let keep_example = "[{ separation = [24.0, 144.0], multipoles = [1, 3] }]";
        let keep: Vec<_> = section
            .tables("keep", "keep", "an entry of `keep`", keep_example)
            .into_iter()
            .map(KeepSection::read)
            .collect();
        let columns = section
            .table("columns", "columns", "[survey.columns]", "{ separation = \"s\" }")
            .map(read_columns)
            .unwrap_or_default();
        let template_example = "[{ name = \"stray-light\", file = \"stray-light.csv\", amplitude = 1.0 }]";
        let templates: Vec<_> = section
            .tables("template", "template", "[[survey.template]]", template_example)
            .into_iter()
            .map(TemplateSection::read)
            .collect();
        let bins: Vec<_> = section
            .tables("bin", "bin", "[[survey.bin]]", "[{ name = \"near\", redshift = 0.35 }]")
            .into_iter()
            .map(BinSection::read)
            .collect();
        section.finish();
        Some(Self {
            name: name?,
            multipoles: multipoles?,
            covariance,
            covariance_rows,
            mocks,
            mock_count,
            noise: noise?,
            determined,
            extra_covariance,
            shrink_towards,
            empty_blocks: empty_blocks?,
            templates: templates.into_iter().collect::<Option<_>>()?,
            sight_line: sight_line?,
            unit: unit?,
            fiducial: fiducial?,
            window,
            window_rows,
            keep: keep.into_iter().collect::<Option<_>>()?,
            design: design?,
            columns,
            bins: bins.into_iter().collect::<Option<_>>()?,
            left_out: Vec::new(),
        })
    }
}

impl SurveySection {
    /// The paths of covariances and of what names their rows.
    pub(crate) fn covariance_keys(&self) -> impl Iterator<Item = &Located<String>> {
        let paths = [&self.covariance, &self.covariance_rows, &self.extra_covariance, &self.shrink_towards];
        paths.into_iter().flatten()
    }
}

fn read_columns(section: Section<'_>) -> BTreeMap<String, Located<String>> {
    let columns = TABLE_COLUMNS
        .iter()
        .filter_map(|column| Some(((*column).to_owned(), section.text(column, "\"header\"")?)))
        .collect();
    section.finish();
    columns
}

impl BinSection {
    fn read(section: Section<'_>) -> Option<Self> {
        let name = section.required_text("name", "\"near\"");
        let nodes = read_nodes(&section);
        let offset = section.quantity_or("offset", 0.0);
        let growth_rate = section.quantity("growth_rate");
        let growth_slope = section.quantity("growth_slope");
        let design = BinDesignSection::read(&section);
        let first = TracerSection::read(&section, "first");
        let second = TracerSection::read(&section, "second");
        section.finish();
        Some(Self {
            name: name?,
            nodes: nodes?,
            offset: offset?,
            growth_rate,
            growth_slope,
            design: design?,
            first: first?,
            second: second?,
        })
    }
}

impl BinSection {
    /// The weighted mean redshift.
    pub fn redshift(&self) -> f64 {
        self.weighted_nodes().iter().map(|(redshift, weight)| redshift * weight).sum()
    }

    /// The nodes with what their weights miss of a sum of 1, by rounding, divided out.
    pub fn weighted_nodes(&self) -> Vec<(f64, f64)> {
        let sum: f64 = self.nodes.value.iter().map(|(_, weight)| weight).sum();
        self.nodes.value.iter().map(|&(redshift, weight)| (redshift, weight / sum)).collect()
    }
}

/// `redshift`, or `nodes` in its place.
fn read_nodes(section: &Section<'_>) -> Option<Located<Vec<(f64, f64)>>> {
    let Some((_, item)) = section.find("nodes") else {
        if section.find("redshift").is_none() {
            section.missing("redshift", "redshift = 0.35");
        }
        return section.number("redshift", "0.35").map(|given| given.map(|redshift| vec![(redshift, 1.0)]));
    };
    if section.find("redshift").is_some() {
        let (one, other) = ("redshift", "nodes");
        let way_out = "give the mean redshift of a thin bin, or the nodes of a wide one";
        section.fault_at("nodes", Fault::EitherOr { one, other, way_out });
        return None;
    }
    let pair = |value: &Value| match numbers_of(&Item::Value(value.clone())).as_deref() {
        Some(&[redshift, weight]) => Some((redshift, weight)),
        _ => None,
    };
    let nodes: Option<Vec<(f64, f64)>> =
        item.as_array().filter(|list| !list.is_empty()).and_then(|list| list.iter().map(pair).collect());
    let Some(value) = nodes else {
        let expected = "a list of [redshift, weight]";
        section.wrong_type("nodes", expected, item, "[[0.30, 0.4], [0.38, 0.6]]");
        return None;
    };
    if let Some(value) = value.iter().flat_map(|&(z, weight)| [z, weight]).find(|number| !number.is_finite())
    {
        section.fault_at("nodes", Fault::NotFinite { name: "nodes".to_owned(), value });
        return None;
    }
    Some(Located { value, origin: section.origin("nodes", item) })
}

impl TracerSection {
    fn read(bin: &Section<'_>, which: &'static str) -> Option<Self> {
        let example = "{ bias = 2.0, magnification = 0.5, evolution = 0.0 }";
        if bin.find(which).is_none() {
            bin.missing(which, &format!("{which} = {example}"));
            return None;
        }
        let section = bin.table(which, "tracer", format!("`{which}` of [[survey.bin]]"), example)?;
        let label = match section.find("label") {
            Some(_) => section.text("label", "\"bright\""),
            None => Some(Located::default_of(which.to_owned())),
        };
        let bias = section.required_quantity("bias", "2.0");
        let magnification = section.required_quantity("magnification", "0.5");
        let slope = section.quantity("observed_density_slope");
        let evolution = if section.find("observed_density_slope").is_none() {
            section.required_quantity("evolution", "0.0")
        } else if section.find("evolution").is_some() {
            let (one, other) = ("evolution", "observed_density_slope");
            let way_out = "give the slope that the catalogue shows, or e at fixed luminosity";
            section.fault_at(other, Fault::EitherOr { one, other, way_out });
            return None;
        } else {
            None
        };
        let bias_slope = section.quantity_or("bias_slope", 0.0);
        section.finish();
        if evolution.is_none() && slope.is_none() {
            return None;
        }
        Some(Self {
            label: label?,
            bias: bias?,
            magnification: magnification?,
            evolution,
            observed_density_slope: slope,
            bias_slope: bias_slope?,
        })
    }
}
