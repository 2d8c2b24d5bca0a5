//! The keys of a study file: what each section has, of which form, and what it means.

use oddwell_likelihood::{TABLE_COLUMNS, noise_families};
use oddwell_model::{FeltBy, departures};
use oddwell_sampler::prior_families;

/// The form of a value.
#[derive(Clone, Debug, PartialEq)]
pub(crate) enum Form {
    Text,
    Number,
    Count,
    Flag,
    /// A number, a prior, or `same_as`.
    Quantity,
    OneOf(Vec<&'static str>),
    Texts,
    Counts,
    Numbers,
    Rows,
    TextRows,
    /// Two numbers.
    Range,
    /// Redshifts with weights.
    Nodes,
    /// Edges, or low, high and width.
    Shells,
    /// A section.
    One(&'static str),
    /// Several of them.
    Many(&'static str),
}

/// A key of a section.
#[derive(Clone, Debug, PartialEq)]
pub(crate) struct Key {
    pub(crate) name: &'static str,
    pub(crate) form: Form,
    pub(crate) required: bool,
    pub(crate) meaning: &'static str,
}

/// A section, under the name by which the reader knows it.
#[derive(Clone, Debug, PartialEq)]
pub(crate) struct Keys {
    pub(crate) section: &'static str,
    pub(crate) keys: Vec<Key>,
}

fn must(name: &'static str, form: Form, meaning: &'static str) -> Key {
    Key { name, form, required: true, meaning }
}

fn may(name: &'static str, form: Form, meaning: &'static str) -> Key {
    Key { name, form, required: false, meaning }
}

fn noises() -> Form {
    Form::OneOf(noise_families().iter().map(|family| family.name).collect())
}

/// Keys that a survey and a joint covariance share.
fn covariance_keys() -> Vec<Key> {
    vec![
        may("mock_count", Form::Count, "mocks that the covariance was estimated from"),
        may("noise", noises(), "noise model"),
        may(
            "determined",
            Form::Count,
            "quantities that the data determine, for noise percival; by default counted",
        ),
        may("extra_covariance", Form::Text, "path of a covariance to be added, as an error of the theory"),
        may(
            "shrink_towards",
            Form::Text,
            "path of a model covariance towards which an estimate from mocks is shrunk",
        ),
        may(
            "empty_blocks",
            Form::TextRows,
            "pairs of bins or surveys between which the covariance is declared empty",
        ),
    ]
}

/// Every section with its keys.
pub(crate) fn study_keys() -> Vec<Keys> {
    let keys = |section, keys| Keys { section, keys };
    let mut survey = vec![
        must("name", Form::Text, "first part of the names of its parameters"),
        may("multipoles", Form::Text, "path of the table of measured multipoles"),
        may("covariance", Form::Text, "path of the covariance: .csv, .npy or .fits"),
        may("covariance_rows", Form::Text, "path of the table that names the covariance's rows"),
        may("mocks", Form::Text, "path of mock measurements, or a pattern of paths"),
        may("sight_line", Form::OneOf(vec!["midpoint", "first", "second"]), "what odd is odd about"),
        may("unit", Form::OneOf(vec!["Mpc/h", "Mpc"]), "unit of lengths"),
        may("fiducial", Form::One("fiducial"), "background that turned redshifts into distances"),
        may("window", Form::Text, "path of the window matrix"),
        may("window_rows", Form::Text, "path of the table that names the window's columns"),
        may("keep", Form::Many("keep"), "rows that pass any entry are used"),
        may("columns", Form::One("columns"), "our name of a column = the table's header"),
        may("template", Form::Many("template"), "shapes with amplitudes of their own"),
        may("design", Form::One("design"), "how the survey is made, for oddwell simulate"),
        must("bin", Form::Many("bin"), "redshift bins"),
    ];
    survey.extend(covariance_keys());
    let mut joint = vec![
        must("surveys", Form::Texts, "surveys that share volume, in the order of the covariance"),
        may("file", Form::Text, "path of their covariance"),
    ];
    joint.extend(covariance_keys());
    let mut hypothesis = vec![
        must("name", Form::Text, "what --hypothesis calls it"),
        must(
            "departure",
            Form::OneOf(departures::registry().iter().map(|shape| shape.name()).collect()),
            "shape of the departure",
        ),
        may(
            "weight",
            Form::Number,
            "how probable it is held to be before the data, relative to the others; default 1",
        ),
        may("felt_by", Form::OneOf(FeltBy::ALL.map(FeltBy::name).to_vec()), "who feels it"),
    ];
    for parameter in departures::registry().iter().flat_map(|shape| shape.parameters()) {
        if hypothesis.iter().all(|key| key.name != parameter.name) {
            hypothesis.push(may(parameter.name, Form::Quantity, parameter.meaning));
        }
    }
    let mut prior = vec![
        may("same_as", Form::Text, "dotted name of the quantity that this one follows"),
        may("within", Form::Range, "the prior is cut off outside of [low, high]"),
    ];
    for family in prior_families() {
        let form = if family.arguments.len() == 1 { Form::Number } else { Form::Numbers };
        prior.push(may(family.key, form, family.summary));
    }
    vec![
        keys(
            "study",
            vec![
                may("title", Form::Text, "names the run directory"),
                must("background", Form::One("background"), "the homogeneous universe, and matter today"),
                may("prediction", Form::One("prediction"), "what the prediction takes into account"),
                must("survey", Form::Many("survey"), "one for each table of measurements"),
                may("joint_covariance", Form::Many("joint_covariance"), "surveys that share volume"),
                may("systematic", Form::Many("systematic"), "errors that move several quantities together"),
                may("joint_prior", Form::Many("joint_prior"), "correlated normal priors"),
                must("hypothesis", Form::Many("hypothesis"), "what is compared"),
                may("sampling", Form::One("sampling"), "how to sample"),
                may("blinding", Form::One("blinding"), "written by oddwell blind"),
            ],
        ),
        keys(
            "background",
            vec![
                must("omega_m", Form::Quantity, "matter"),
                must("omega_b", Form::Quantity, "baryons"),
                must("h", Form::Quantity, "H0 in 100 km/s/Mpc"),
                must("n_s", Form::Quantity, "spectral index"),
                must("sigma8", Form::Quantity, "linear rms in 8 Mpc/h today"),
                may("omega_k", Form::Quantity, "curvature; default 0"),
                may("w0", Form::Quantity, "dark energy today; default -1"),
                may("wa", Form::Quantity, "and its change; default 0"),
                may(
                    "power",
                    Form::Text,
                    "eisenstein-hu (default), eisenstein-hu-smooth, or the path of a table",
                ),
            ],
        ),
        keys(
            "prediction",
            vec![
                may("wide_angle", Form::Flag, "first order in separation over distance; default true"),
                may("light_cone", Form::Flag, "evolution between the galaxies of a pair; default true"),
                may("lensing", Form::Flag, "of the farther galaxy; default true"),
                may("damping", Form::Quantity, "Mpc/h; default 0.5"),
                may("smearing", Form::Quantity, "of the acoustic peak, Mpc/h; default 0"),
                may("growth_index", Form::Quantity, "growth index, in place of the growth equation"),
                may("clock_distance", Form::Number, "Mpc/h; how far apart the clocks stand; default 50"),
            ],
        ),
        keys("survey", survey),
        keys("joint_covariance", joint),
        keys(
            "template",
            vec![
                must("name", Form::Text, "last part of its amplitude's name"),
                must("file", Form::Text, "path of its shape, a number a row of the table"),
                must("amplitude", Form::Quantity, "what the shape is multiplied by"),
            ],
        ),
        keys(
            "design",
            vec![
                may("multipoles", Form::Counts, "multipoles of the cross-correlation; default [1, 3]"),
                may("separation", Form::Shells, "shells, Mpc/h"),
                may("wavenumber", Form::Shells, "bins of wavenumber, h/Mpc"),
                may("area", Form::Number, "square degrees"),
            ],
        ),
        keys(
            "bin-design",
            vec![
                may("volume", Form::Number, "(Mpc/h)^3"),
                may("redshifts", Form::Range, "lowest and highest redshift, with the survey's area"),
                must("first_density", Form::Number, "(h/Mpc)^3"),
                must("second_density", Form::Number, "(h/Mpc)^3"),
            ],
        ),
        keys(
            "shells",
            vec![
                must("low", Form::Number, "lower edge of the first"),
                must("high", Form::Number, "upper edge of the last"),
                must("width", Form::Number, "of each"),
            ],
        ),
        keys(
            "fiducial",
            vec![
                must("omega_m", Form::Number, "matter"),
                may("omega_k", Form::Number, "curvature; default 0"),
                may("w0", Form::Number, "dark energy today; default -1"),
                may("wa", Form::Number, "and its change; default 0"),
                may("h", Form::Number, "converts lengths given in Mpc"),
            ],
        ),
        keys(
            "keep",
            vec![
                may("separation", Form::Range, "Mpc/h, ends included"),
                may("wavenumber", Form::Range, "h/Mpc, ends included"),
                may("multipoles", Form::Counts, "0 to 4"),
                may("bins", Form::Texts, "names of bins"),
                may("pairs", Form::Texts, "first-second, first-first, second-second"),
            ],
        ),
        keys(
            "columns",
            TABLE_COLUMNS.iter().map(|column| may(column, Form::Text, "the table's header")).collect(),
        ),
        keys(
            "bin",
            vec![
                must("name", Form::Text, "second part of the names of its parameters"),
                may("redshift", Form::Number, "pair-weighted mean"),
                may("nodes", Form::Nodes, "redshifts with weights, in place of redshift"),
                may(
                    "offset",
                    Form::Quantity,
                    "km/s by which the second tracer's redshifts lie higher; default 0",
                ),
                may("growth_rate", Form::Quantity, "f of this bin, in place of the growth equation"),
                may("growth_slope", Form::Quantity, "df/dln a of this bin"),
                may("design", Form::One("bin-design"), "how the bin is made, for oddwell simulate"),
                must("first", Form::One("tracer"), "the first tracer"),
                must("second", Form::One("tracer"), "the second tracer"),
            ],
        ),
        keys(
            "tracer",
            vec![
                may("label", Form::Text, "what to call it"),
                must("bias", Form::Quantity, "linear bias"),
                must("magnification", Form::Quantity, "dlog10 N/dmagnitude at the flux limit"),
                may("evolution", Form::Quantity, "dln n/dln a at fixed luminosity threshold"),
                may(
                    "observed_density_slope",
                    Form::Quantity,
                    "the slope that the catalogue shows, in place of evolution",
                ),
                may("bias_slope", Form::Quantity, "dln b/dln a; default 0"),
            ],
        ),
        keys(
            "systematic",
            vec![
                must("name", Form::Text, "its amplitude is systematic.NAME"),
                must("amplitude", Form::Quantity, "what all moves are multiplied by"),
                must("moves", Form::Many("move"), "quantities that it moves"),
            ],
        ),
        keys(
            "move",
            vec![
                must("quantity", Form::Text, "dotted name; * stands for any one part"),
                must("by", Form::Number, "quantity += by * amplitude"),
            ],
        ),
        keys(
            "joint_prior",
            vec![
                must("of", Form::Texts, "dotted names"),
                must("mean", Form::Numbers, "their means"),
                must("covariance", Form::Rows, "their covariance"),
            ],
        ),
        keys("hypothesis", hypothesis),
        keys(
            "sampling",
            vec![
                may("effective_samples", Form::Count, "of the departure; default 4000"),
                may("seed", Form::Count, "of every random number; default 1"),
                may("ensembles", Form::Count, "run side by side and compared; default 4"),
                may("walkers", Form::Count, "of each ensemble; by default chosen"),
                may("maximum_evaluations", Form::Count, "stop there even if not converged"),
            ],
        ),
        keys(
            "blinding",
            vec![
                must("commitment", Form::Text, "salted hash of the phrase"),
                must("salt", Form::Text, "of the hash"),
                must("width", Form::Number, "of the secret departure"),
                must("frozen", Form::Text, "path of what the shift was computed from"),
            ],
        ),
        keys("prior", prior),
    ]
}
