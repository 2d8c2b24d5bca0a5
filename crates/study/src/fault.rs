//! Every rule that a study can break, with the text that says so: subject, rule, value, way out.

use oddwell_cosmology::CosmologyError;
use oddwell_sampler::PriorError;
use thiserror::Error;

use crate::nearest::{Nearest, listed};

/// A broken rule. [`crate::Problem`] adds where.
#[derive(Clone, Debug, PartialEq, Error)]
#[non_exhaustive]
pub enum Fault {
    /// The text is not TOML.
    #[error("not valid TOML: {message}; see the study file's language in the README")]
    Syntax {
        /// What the parser says.
        message: String,
    },
    /// A key that its section does not have.
    #[error("`{key}` is not a key of {section}; {nearest}")]
    UnknownKey {
        /// The key.
        key: String,
        /// The section, as `[background]`.
        section: String,
        /// What may have been meant.
        nearest: Nearest,
    },
    /// A key that must be given is not.
    #[error("{section} needs `{key}`; add `{example}`")]
    MissingKey {
        /// The section.
        section: String,
        /// The key.
        key: String,
        /// A line that would do.
        example: String,
    },
    /// A value of the wrong kind.
    #[error("`{key}` must be {expected}, not {found}; write `{key} = {example}`")]
    WrongType {
        /// The key.
        key: String,
        /// What it must be.
        expected: &'static str,
        /// What it is.
        found: String,
        /// A value that would do.
        example: &'static str,
    },
    /// NaN or infinity.
    #[error("`{name}` is {value}; give a finite number")]
    NotFinite {
        /// Key or dotted name.
        name: String,
        /// The value.
        value: f64,
    },
    /// A number outside its range.
    #[error("`{name}` must be {rule}, not {value}; {way_out}")]
    OutOfRange {
        /// Key or dotted name.
        name: String,
        /// The rule, as `above 0`.
        rule: &'static str,
        /// The value, as text.
        value: String,
        /// What to do.
        way_out: &'static str,
    },
    /// A prior or a tie where only a number makes sense.
    #[error("`{name}` must be a number, not {found}; it says what to report and cannot be inferred")]
    MustBeHeld {
        /// Dotted name.
        name: String,
        /// What it is.
        found: String,
    },
    /// More baryons than matter.
    #[error(
        "`background.omega_b` must be below `background.omega_m` = {omega_m}, not {omega_b}; baryons are part of matter"
    )]
    BaryonsExceedMatter {
        /// Ωb.
        omega_b: f64,
        /// Ωm.
        omega_m: f64,
    },
    /// A range whose ends are in the wrong order.
    #[error("`{name}` needs its low end below its high end, not [{low}, {high}]; {way_out}")]
    Inverted {
        /// Key or dotted name.
        name: String,
        /// The first number.
        low: f64,
        /// The second number.
        high: f64,
        /// What to do.
        way_out: &'static str,
    },
    /// A word that is not one of those allowed.
    #[error("unknown {what} `{value}`; {nearest}")]
    UnknownChoice {
        /// What it should be, as `departure`.
        what: &'static str,
        /// The word.
        value: String,
        /// What may have been meant.
        nearest: Nearest,
    },
    /// Something that has to be there at least once is not.
    #[error("{section} has no {part}; add {example}")]
    Empty {
        /// Whose part is missing.
        section: String,
        /// What is missing.
        part: &'static str,
        /// What would do.
        example: &'static str,
    },
    /// A key that makes sense only beside another one.
    #[error("`{key}` needs `{other}` beside it; {way_out}")]
    NeedsOther {
        /// The key that is given.
        key: String,
        /// The key that is missing.
        other: String,
        /// What to do.
        way_out: &'static str,
    },

    /// Two keys that say the same thing in two ways.
    #[error("`{other}` stands beside `{one}`, which says the same; {way_out}")]
    EitherOr {
        /// One of the keys.
        one: &'static str,
        /// The other.
        other: &'static str,
        /// What to do.
        way_out: &'static str,
    },
    /// Two keys that do not go together.
    #[error("`{other}` cannot stand beside `{one}`; {way_out}")]
    Excluded {
        /// One of the keys.
        one: &'static str,
        /// The other.
        other: &'static str,
        /// What to do.
        way_out: &'static str,
    },
    /// A restriction that leaves nothing in.
    #[error("leaves no bin of the study in; leave out less")]
    NothingLeft,
    /// A survey that says for itself what a joint covariance says.
    #[error(
        "`{key}` of survey `{survey}` stands beside a [[joint_covariance]] of that survey, which speaks for all its rows; give it there"
    )]
    SpokenForJointly {
        /// The key.
        key: &'static str,
        /// The survey.
        survey: String,
    },
    /// A survey in two joint covariances.
    #[error(
        "the survey `{survey}` has a [[joint_covariance]] already; name each survey once, those that share volume together"
    )]
    JointlyTwice {
        /// The survey.
        survey: String,
    },
    /// An empty block of a part with itself.
    #[error(
        "`empty_blocks` takes two parts that have no rows in common, not `{one}` and `{other}`; name the two whose covariance is nothing"
    )]
    BlockWithItself {
        /// One part.
        one: String,
        /// The other.
        other: String,
    },
    /// A fiducial background in which a bin's redshift has no distance.
    #[error("the fiducial background of survey `{survey}` gives no distance: {cause}")]
    Fiducial {
        /// The survey.
        survey: String,
        /// Rule, value and way out.
        cause: CosmologyError,
    },

    /// A name that a dotted path, a table or a folder could not carry.
    #[error(
        "the {what} name `{name}` may have only letters, digits, `-` and `_`, since it becomes part of parameter names; rename it"
    )]
    BadName {
        /// Whose name.
        what: &'static str,
        /// The name.
        name: String,
    },
    /// A name that means something else.
    #[error("the {what} name `{name}` is taken by oddwell itself; rename it")]
    ReservedName {
        /// Whose name.
        what: &'static str,
        /// The name.
        name: String,
    },
    /// The same name twice.
    #[error("the {what} name `{name}` is given twice, first on line {first_line}; rename one of the two")]
    DuplicateName {
        /// Whose name.
        what: &'static str,
        /// The name.
        name: String,
        /// Where it was given first.
        first_line: usize,
    },

    /// A quantity that is neither a number nor a prior.
    #[error(
        "`{name}` must be a number (held) or a prior (inferred), not {found}; write `{name} = NUMBER` or `{name} = {{ normal = [MEAN, SD] }}`"
    )]
    NotAQuantity {
        /// Key or dotted name.
        name: String,
        /// What it is.
        found: String,
    },
    /// A prior without a family.
    #[error("the prior of `{name}` has no family; choose one of {}", listed(.families))]
    NoFamily {
        /// Key or dotted name.
        name: String,
        /// The families there are.
        families: Vec<String>,
    },
    /// Two priors for one quantity, in one place.
    #[error("`{name}` has two priors, `{first}` and `{second}`; keep one of them")]
    TwoPriors {
        /// Key or dotted name.
        name: String,
        /// One.
        first: String,
        /// The other.
        second: String,
    },
    /// A quantity with a prior of its own that also stands in a joint prior, or in two joint priors.
    #[error(
        "`{name}` has two priors, from {first} and from this [[joint_prior]]; give a number there (where the search starts) or take it out of `of`"
    )]
    TwoPriorsJoint {
        /// The dotted name.
        name: String,
        /// Where the other prior is, as `line 12`.
        first: String,
    },
    /// A family given something else than its numbers.
    #[error("`{name}`: `{key}` takes {takes}, not {found}")]
    PriorForm {
        /// Key or dotted name of the quantity.
        name: String,
        /// The family, or `within`.
        key: String,
        /// What it takes, as `[mean, sd]`.
        takes: String,
        /// What is there.
        found: String,
    },
    /// Numbers that a prior family refuses.
    #[error("`{name}`: {cause}")]
    Prior {
        /// Key or dotted name of the quantity.
        name: String,
        /// Rule, value and way out.
        cause: PriorError,
    },
    /// `within` beside something that is not a prior.
    #[error(
        "`within` of `{name}` stands beside `same_as`, which is no prior; remove it and bound `{source_name}` instead"
    )]
    WithinTie {
        /// Key or dotted name.
        name: String,
        /// The quantity it is tied to.
        source_name: String,
    },

    /// A dotted name that no quantity has.
    #[error("{subject} names `{name}`, but no quantity has that name; {nearest}")]
    UnknownQuantity {
        /// Who names it.
        subject: String,
        /// The name.
        name: String,
        /// What may have been meant.
        nearest: Nearest,
    },
    /// Quantities tied in a circle.
    #[error("`same_as` runs in a circle: {}; give one of them a number or a prior", .chain.join(" -> "))]
    Circle {
        /// The dotted names along the circle, the first one again at the end.
        chain: Vec<String>,
    },
    /// A systematic that moves a tied quantity by name.
    #[error(
        "the systematic `{systematic}` moves `{quantity}`, which follows `{source_name}`; move `{source_name}` instead"
    )]
    MovesTied {
        /// The systematic's name.
        systematic: String,
        /// The tied quantity.
        quantity: String,
        /// What it is tied to.
        source_name: String,
    },
    /// A systematic's pattern that matches nothing that can be moved.
    #[error(
        "the systematic `{systematic}` moves nothing: no quantity that can move is called `{pattern}`; {nearest}"
    )]
    MovesNothing {
        /// The systematic's name.
        systematic: String,
        /// The pattern.
        pattern: String,
        /// What may have been meant.
        nearest: Nearest,
    },
    /// A systematic that moves a departure or another systematic.
    #[error(
        "the systematic `{systematic}` moves `{pattern}`; a systematic moves quantities of [background], [prediction] and the surveys only"
    )]
    MovesForbidden {
        /// The systematic's name.
        systematic: String,
        /// The pattern.
        pattern: String,
    },

    /// Numbers that do not make a joint normal prior.
    #[error("{cause}")]
    JointPrior {
        /// Rule, value and way out.
        cause: PriorError,
    },
    /// A joint prior of a tied quantity.
    #[error("the joint prior names `{name}`, which follows `{source_name}`; name `{source_name}` instead")]
    JointTied {
        /// The tied quantity.
        name: String,
        /// What it is tied to.
        source_name: String,
    },

    /// A held parameter outside the range of its departure.
    #[error("`{name}` = {value}: {rule}")]
    DepartureValue {
        /// The dotted name.
        name: String,
        /// The value.
        value: f64,
        /// The shape's rule with its way out.
        rule: &'static str,
    },
    /// A parameter of another shape than the hypothesis has.
    #[error("`{key}` is no parameter of the departure `{departure}`, but of {}; remove it or change `departure`", listed(.others))]
    ForeignParameter {
        /// The key.
        key: String,
        /// The hypothesis' departure.
        departure: &'static str,
        /// Departures that have it.
        others: Vec<&'static str>,
    },
    /// A departure that cannot be felt so.
    #[error("the departure `{departure}` cannot be felt by {felt_by}; it can be felt by {allowed}")]
    FeltBy {
        /// The departure.
        departure: &'static str,
        /// Who should feel it.
        felt_by: &'static str,
        /// Who can.
        allowed: String,
    },
    /// A departure that moves matter beside growth that is given.
    #[error(
        "`{key}` gives the growth of matter, but the departure of hypothesis `{hypothesis}` is felt by {felt_by} and changes it; remove `{key}` or let light alone feel the departure"
    )]
    GrowthGiven {
        /// `growth_index`, or `growth_rate` of a bin.
        key: String,
        /// The hypothesis.
        hypothesis: String,
        /// Who feels its departure.
        felt_by: &'static str,
    },
    /// A departure that holds in one background only.
    #[error(
        "the departure `{departure}` of hypothesis `{hypothesis}` needs `{name}` held at {needed}, not {found}; hold it or choose another departure"
    )]
    NeedsBackground {
        /// The departure.
        departure: &'static str,
        /// The hypothesis.
        hypothesis: String,
        /// The dotted name.
        name: &'static str,
        /// The value it needs.
        needed: f64,
        /// What it is.
        found: String,
    },
    /// Lengths in Mpc need an h that is known.
    #[error(
        "`unit = \"Mpc\"` of survey `{survey}` needs a held `background.h`, but it is inferred; hold it, give `fiducial.h`, or give lengths in Mpc/h"
    )]
    UnitNeedsHeldH {
        /// The survey.
        survey: String,
    },

    /// A hypothesis that the study does not have.
    #[error("the study has no hypothesis `{name}`; {nearest}")]
    UnknownHypothesis {
        /// The name asked for.
        name: String,
        /// What may have been meant.
        nearest: Nearest,
    },
    /// A `--set` without `=`.
    #[error("`--set` takes NAME=VALUE, not `{text}`; write, say, `--set departure.tau=0.5`")]
    SetForm {
        /// What was given.
        text: String,
    },
    /// A `--set` of a quantity that the chosen hypothesis does not have.
    #[error("hypothesis `{hypothesis}` has no quantity `{name}`; {nearest}")]
    SetElsewhere {
        /// The chosen hypothesis.
        hypothesis: String,
        /// The quantity.
        name: String,
        /// What may have been meant.
        nearest: Nearest,
    },
}
