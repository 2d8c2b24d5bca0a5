//! What is suspicious but no error: each with the next thing to try.

use serde::ser::{Serialize, SerializeStruct, Serializer};

/// A warning. Serialised as `code`, `text`, `where`.
#[derive(Clone, Debug, PartialEq)]
#[non_exhaustive]
pub enum Warning {
    /// The posterior of a parameter piles up at an end of its prior.
    PriorEdge {
        /// The parameter.
        parameter: String,
        /// The end that is touched.
        edge: f64,
    },
    /// The data move a nuisance by more than two of its prior's standard deviations.
    NuisanceMoved {
        /// The parameter.
        parameter: String,
        /// Posterior mean minus prior mean, in prior standard deviations.
        shift: f64,
    },
    /// Several bins have the same prior on one kind of nuisance, and nothing moves them together.
    UnsharedError {
        /// `evolution` or `magnification`.
        quantity: String,
        /// The parameters with equal priors.
        parameters: Vec<String>,
        /// The departure's parameter.
        departure: String,
        /// Its standard deviation with independent errors.
        independent: f64,
        /// Its standard deviation were the error one and the same in all of them.
        shared: f64,
    },
    /// At the smallest separation of some bins the redshift offset outweighs the departure.
    SmallSeparation {
        /// `SURVEY.BIN`, the smallest separation kept in Mpc/h, and what 1 km/s of offset is worth there, in τ.
        bins: Vec<(String, f64, f64)>,
        /// Those of them whose offset is held.
        held: Vec<String>,
    },
    /// A departure that only light feels is quoted on the assumption that matter grows as in general relativity.
    GrowthAssumed {
        /// The hypothesis.
        hypothesis: String,
    },
    /// The posterior of a departure is nearly as wide as its prior.
    Untested {
        /// The parameter.
        parameter: String,
        /// Posterior width over prior width.
        ratio: f64,
    },
    /// No state of a long run could be kept to go on from.
    CheckpointNotWritten {
        /// The run directory.
        run: String,
        /// Why.
        reason: String,
    },
    /// Sampling ended before every parameter passed.
    NotConverged {
        /// The worst parameter.
        parameter: String,
        /// What it failed, as `bulk ESS 212 of 400`.
        failed: String,
        /// About how many times as long it needs; none if unknown.
        longer: Option<f64>,
    },
    /// Rows without shell edges, which are predicted at a point.
    UnaveragedShell {
        /// The survey.
        survey: String,
        /// Largest difference that averaging over shells as wide as the rows' spacing makes, relative to the multipole's largest value.
        difference: f64,
    },
    /// An evolution bias that is hardly one.
    LargeEvolution {
        /// `SURVEY.BIN.first.evolution`, or `observed_density_slope` where that is given.
        quantity: String,
        /// The evolution bias.
        evolution: f64,
        /// Whether it comes from the slope of the catalogue.
        slope: bool,
    },
    /// Realisations that the numbering of the mocks' files leads one to expect, and that are not there.
    MissingMocks {
        /// The survey.
        survey: String,
        /// The pattern, as it was given.
        pattern: String,
        /// How many there are.
        found: usize,
        /// The names that are missing.
        missing: Vec<String>,
    },
    /// A column of a table that nothing reads.
    IgnoredColumn {
        /// The file.
        file: String,
        /// The column.
        column: String,
        /// The column that may have been meant.
        nearest: Option<String>,
    },
}

impl Warning {
    /// A word for scripts, never reworded.
    pub fn code(&self) -> &'static str {
        match self {
            Self::PriorEdge { .. } => "prior-edge",
            Self::NuisanceMoved { .. } => "nuisance-moved",
            Self::UnsharedError { .. } => "unshared-error",
            Self::SmallSeparation { .. } => "small-separation",
            Self::GrowthAssumed { .. } => "growth-assumed",
            Self::Untested { .. } => "untested",
            Self::CheckpointNotWritten { .. } => "checkpoint-not-written",
            Self::NotConverged { .. } => "not-converged",
            Self::UnaveragedShell { .. } => "unaveraged-shell",
            Self::LargeEvolution { .. } => "large-evolution",
            Self::MissingMocks { .. } => "missing-mocks",
            Self::IgnoredColumn { .. } => "ignored-column",
        }
    }

    /// What it is about: a parameter, a bin, a survey, a file.
    pub fn place(&self) -> &str {
        match self {
            Self::PriorEdge { parameter, .. }
            | Self::NuisanceMoved { parameter, .. }
            | Self::Untested { parameter, .. }
            | Self::NotConverged { parameter, .. } => parameter,
            Self::LargeEvolution { quantity, .. } => quantity,
            Self::UnsharedError { departure, .. } => departure,
            Self::SmallSeparation { bins, .. } => bins.first().map_or("", |(bin, ..)| bin),
            Self::GrowthAssumed { hypothesis } => hypothesis,
            Self::UnaveragedShell { survey, .. } | Self::MissingMocks { survey, .. } => survey,
            Self::IgnoredColumn { file, .. } => file,
            Self::CheckpointNotWritten { run, .. } => run,
        }
    }

    /// What is suspicious, and the next thing to try.
    pub fn text(&self) -> String {
        match self {
            Self::PriorEdge { parameter, edge } => format!(
                "the posterior of `{parameter}` piles up at the end of its prior, {edge}; widen the prior, or say why nothing lies beyond"
            ),
            Self::NuisanceMoved { parameter, shift } => format!(
                "the data move `{parameter}` by {shift:+.1} of its prior's standard deviations; check that prior, and the data that pull it"
            ),
            Self::UnsharedError { quantity, parameters, departure, independent, shared } => format!(
                "{} have equal priors on {quantity} with independent errors, which gives `{departure}` a standard deviation of {independent:.3}; were it one error in all of them it would be {shared:.3}: if they share a source, say so with a [[systematic]]",
                parameters.join(", ")
            ),
            Self::SmallSeparation { bins, held } => {
                let bins: Vec<String> = bins
                    .iter()
                    .map(|(bin, separation, worth)| format!("{worth:.2} at {separation} Mpc/h in `{bin}`"))
                    .collect();
                let way_out = if held.is_empty() {
                    "the priors on `offset` carry that into the error; see whether the departure moves without the smallest separations (`keep`)".to_owned()
                } else {
                    let held: Vec<String> = held.iter().map(|bin| format!("`{bin}.offset`")).collect();
                    format!(
                        "give a prior to {}, or drop the smallest separations with `keep`",
                        held.join(", ")
                    )
                };
                format!(
                    "1 km/s of redshift offset is worth much in tau at the smallest separations: {}; {way_out}",
                    bins.join(", ")
                )
            }
            Self::GrowthAssumed { hypothesis } => format!(
                "`{hypothesis}` is felt by light alone: it takes matter to grow as in general relativity; free `growth_index`, or give `growth_rate`, to see how much hangs on that"
            ),
            Self::Untested { parameter, ratio } => format!(
                "the posterior of `{parameter}` is {ratio:.2} times as wide as its prior: the data do not test it; widen the prior, or do not quote it as a measurement"
            ),
            Self::CheckpointNotWritten { reason, .. } => format!(
                "the last checkpoint could not be written ({reason}), so a run that is killed may have lost more than a moment; make room on the disk"
            ),
            Self::NotConverged { parameter, failed, longer } => {
                let longer = longer.map_or_else(
                    || "run it longer, with a larger `--maximum-evaluations`".to_owned(),
                    |longer| format!("run it about {longer:.1} times as long (`--maximum-evaluations`)"),
                );
                format!("not converged: `{parameter}` has {failed}; {longer}")
            }
            Self::UnaveragedShell { survey, difference } => format!(
                "the rows of `{survey}` have no `low` and `high`: averaging over shells as wide as their spacing would change the prediction by up to {:.1} % of the multipole's largest value; add the two columns",
                100.0 * difference
            ),
            Self::LargeEvolution { quantity, evolution, slope: false } => format!(
                "`{quantity}` is {evolution:.4}: evolution is at fixed luminosity threshold, e = slope observed − 5 s (1 + 1/(r H)); if it is the slope that a catalogue shows, give it as `observed_density_slope`"
            ),
            Self::LargeEvolution { quantity, evolution, slope: true } => format!(
                "`{quantity}` comes to an evolution bias of {evolution:.4}, e = slope observed − 5 s (1 + 1/(r H)); check the slope, which is that of the comoving density with ln a, and the magnification bias"
            ),
            Self::MissingMocks { survey, pattern, found, missing } => {
                let shown = missing.iter().take(10).map(String::as_str).collect::<Vec<_>>().join(", ");
                let more = if missing.len() > 10 {
                    format!(" and {} more", missing.len() - 10)
                } else {
                    String::new()
                };
                format!(
                    "the mocks of `{survey}` are numbered with gaps: {found} match `{pattern}`, without {shown}{more}; if they failed for a reason that has to do with what they measure, those that are left are no fair sample"
                )
            }
            Self::IgnoredColumn { file, column, nearest } => {
                let meant = nearest.as_ref().map_or_else(String::new, |name| {
                    format!("; if it is `{name}`, map it in [survey.columns]")
                });
                format!("the column `{column}` of {file} is not read{meant}")
            }
        }
    }
}

impl Serialize for Warning {
    fn serialize<S: Serializer>(&self, serializer: S) -> Result<S::Ok, S::Error> {
        let mut out = serializer.serialize_struct("Warning", 3)?;
        out.serialize_field("code", self.code())?;
        out.serialize_field("text", &self.text())?;
        out.serialize_field("where", self.place())?;
        out.end()
    }
}
