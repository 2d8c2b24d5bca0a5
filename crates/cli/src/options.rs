//! The command line.

use std::ffi::OsString;
use std::path::PathBuf;

use clap::{Args, ColorChoice, CommandFactory, FromArgMatches, Parser, Subcommand, ValueEnum};

use crate::ending::Status;
use crate::output::Output;

/// What `--hypothesis` calls every hypothesis of the study.
pub(crate) const ALL: &str = "all";

/// From the odd multipoles that were measured in galaxy surveys to a posterior on a departure from general relativity.
///
/// Odd multipoles of the cross-correlation of two samples of galaxies know how gravity bends time. A study is a text file
/// (TOML) that names the measurements, the samples with what is known of them, and hypotheses; `oddwell` turns it into
/// predictions and posteriors.
#[derive(Debug, Parser)]
#[command(
    name = "oddwell",
    version,
    max_term_width = 100,
    subcommand_required = true,
    arg_required_else_help = true
)]
#[command(after_help = "A start: `oddwell new first`, then `oddwell fit first/study.toml`.")]
#[command(after_long_help = "\
A start:
  oddwell new first
  oddwell show first/study.toml
  oddwell fit first/study.toml

Exit status:
  0    done
  1    the input is wrong: study, data, or a folder that cannot be written (a bug, too, and then it says so)
  2    the command line is wrong
  3    done, but not converged, or estimators disagree: results are written and marked so
  130  ended by Ctrl-C or SIGTERM; what a fit has sampled is written and marked as not converged

What it can and cannot say:
  All predictions are linear theory, which ends near 20 Mpc/h. A departure that light alone feels is the same, at every
  separation, as an error of the evolution biases: the priors on those decide how well it can be known, and `fit` says
  by how much they would have to be off.")]
pub(crate) struct Options {
    #[command(flatten)]
    pub(crate) global: Global,
    #[command(subcommand)]
    pub(crate) command: Command,
}

/// Options of every command.
#[derive(Args, Debug)]
pub(crate) struct Global {
    /// Say nothing but results and errors; `fit` then only writes its run directory
    #[arg(long, global = true, help_heading = EVERYWHERE)]
    pub(crate) quiet: bool,
    /// Print results as JSON on standard output; errors too, as {"error": …}
    #[arg(long, global = true, help_heading = EVERYWHERE)]
    pub(crate) json: bool,
    /// When to use colour
    #[arg(long, global = true, value_enum, value_name = "WHEN", default_value_t = Colour::Auto)]
    #[arg(help_heading = EVERYWHERE)]
    pub(crate) color: Colour,
}

/// When to use colour.
#[derive(Clone, Copy, Debug, PartialEq, Eq, ValueEnum)]
pub(crate) enum Colour {
    /// On a terminal, unless NO_COLOR is set
    Auto,
    /// Also in files and pipes
    Always,
    /// Not at all
    Never,
}

/// The commands.
#[derive(Debug, Subcommand)]
pub(crate) enum Command {
    /// Write a small working study with invented data, every key explained
    #[command(after_help = "Example: oddwell new first")]
    New(NewArguments),
    /// Show what a study comes down to: every quantity, held or inferred, and where it was given
    ///
    /// Prints a line a quantity: its name (which `--set`, `same_as` and results use), whether it is held, inferred or
    /// tied to another, the line of the study file it came from, and its value or prior.
    #[command(after_help = "Example: oddwell show study.toml --hypothesis constant")]
    Show(StudyArguments),
    /// Predict every measured number, as CSV
    ///
    /// Prints a line a measured row: survey,bin,pair,multipole,separation,measured,error,predicted. Lengths are in Mpc/h.
    ///
    /// Inferred quantities stand at the centre of their priors: this is not the best fit. `--set` puts them elsewhere.
    #[command(
        after_help = "Example: oddwell predict study.toml --set departure.tau=3 --set larkfield.near.offset=10"
    )]
    Predict(PredictArguments),
    /// Check study and measurements before a fit; samples nothing
    ///
    /// Reads everything, says what is wrong (error) or suspicious (warning) and what to do about it, then the data's own
    /// verdicts: covariances and mocks, how much signal there is, whether it is gravitational redshift, how far the
    /// measurements lie from general relativity, whether the tracers are swapped, what limits the departure.
    #[command(after_help = "Example: oddwell check study.toml")]
    Check(StudyArguments),
    /// Fit a hypothesis: a posterior of everything inferred, in a run directory
    ///
    /// Samples until the departure has as many effective samples as `[sampling]` asks for and every parameter passes, then
    /// writes chain.csv, summary.json and manifest.json, and prints what came out, what else would look the same, and
    /// what to look at before believing it.
    ///
    /// A posterior says where the departure lies if the hypothesis holds. It is not an evidence, and an interval that
    /// leaves out zero is no detection. The same study, seed and version give the same chain with any number of threads.
    #[command(after_help = "\
Example: oddwell fit study.toml --hypothesis constant --out runs/first --seed 7

Ctrl-C stops early and keeps what was sampled, marked as not converged; a second one ends at once. Either way, and even
if the run is killed, `--resume` goes on with it.")]
    #[command(mut_arg("hypothesis", |argument| argument.help(WHICH_TO_FIT)))]
    Fit(FitArguments),
    /// Weigh the hypotheses of a study against each other: evidences, odds, and what they hang on
    ///
    /// Computes the evidence of every hypothesis by independent routes that must agree, samples every posterior, and says how
    /// the odds depend on the prior of the departure, and at which width of it they turn. Prior odds come from `weight` in
    /// `[[hypothesis]]`.
    ///
    /// An evidence is no detection, and a prior can decide it. Where the estimators disagree, the exit status is 3.
    #[command(after_help = "\
Example: oddwell weigh study.toml --out runs/weighed

Ctrl-C stops early; what is finished is kept, and `--resume` goes on with it.")]
    Weigh(WeighArguments),
    /// Draw synthetic measurements from the study's own model, as a complete study
    ///
    /// Writes a folder with the study, its tables with drawn values, its covariances, and truth.csv. Inferred quantities
    /// stand at the centre of their priors, or where `--set` puts them, or are drawn from the priors with `--from-prior`.
    /// Without `--hypothesis`, as `fit` chooses.
    ///
    /// A survey with a [survey.design] (volumes or redshift edges, densities, shells) needs no measurements: its covariance is
    /// that of Gaussian fields, cosmic variance and shot noise, in general relativity at the centre of the priors. Another
    /// survey is drawn with its covariance as given. The noise is normal.
    #[command(after_help = "\
Examples:
  oddwell simulate study.toml --out drawn --set departure.tau=2 --seed 7
  oddwell simulate study.toml --out mocked --from-prior --mocks 600")]
    Simulate(SimulateArguments),
    /// Shift the measurements by a secret departure, so that nobody can steer the analysis
    ///
    /// Writes a complete blinded study into a folder. The secret departure is drawn from the phrase, three times as wide
    /// as what the study expects to measure; the study commits to the phrase by a salted hash. While it is blinded, what
    /// would tell where the departure lies is withheld. The phrase is written nowhere: keep its file.
    #[command(after_help = "Example: oddwell blind study.toml --phrase-file phrase.txt --out blinded")]
    Blind(BlindArguments),
    /// Take the secret shift out again, once the analysis is frozen
    ///
    /// Checks the phrase, prints the secret, writes the study with the measurements as they were, and a log (reveal.json)
    /// of when, and of what was planned before anybody knew.
    #[command(after_help = "Example: oddwell reveal blinded --phrase-file phrase.txt --out revealed")]
    Reveal(BlindArguments),
    /// Write one self-contained HTML page about one or more runs, to pass round
    ///
    /// Answers a referee's questions in the order in which they are asked: what came out, against redshift, the data
    /// beside the prediction, whether it can be trusted, what limits it, whether it holds still, how hypotheses compare,
    /// how to repeat it. The page asks for nothing from anywhere. The publications to cite are written beside it (BibTeX).
    #[command(
        after_help = "Example: oddwell report runs/two-invented-surveys-constant runs/two-invented-surveys-per-bin"
    )]
    Report(ReportArguments),
    /// Print runs as a table, for a paper or for another program
    ///
    /// A line a parameter and a column a run, rounded; with `--format csv` a line a run and parameter, every digit.
    #[command(after_help = "Example: oddwell table runs/two-invented-surveys-constant --format latex")]
    Table(TableArguments),
    /// Print a JSON Schema: of the study file (for editors that complete it as it is typed), or of a result
    ///
    /// Without a topic, lists what there are schemas of.
    #[command(after_help = "Example: oddwell schema study > study.schema.json")]
    Schema(SchemaArguments),
    /// Print a script that lets a shell complete commands and options
    #[command(
        after_help = "Example: oddwell completions bash > ~/.local/share/bash-completion/completions/oddwell"
    )]
    Completions(CompletionsArguments),
    /// Print a page of the manual: what a departure is, and what an odd multipole can and cannot tell about it
    ///
    /// Without a topic, lists the topics: every departure with its formula.
    #[command(after_help = "Example: oddwell manual finite-range")]
    Manual(ManualArguments),
}

/// Options of `report`.
#[derive(Args, Debug)]
pub(crate) struct ReportArguments {
    /// Run directories; the page is about the first that infers one departure, beside the others
    #[arg(value_name = "RUN", required = true)]
    pub(crate) runs: Vec<PathBuf>,
    /// The page to write [default: report.html in the first run directory]
    #[arg(long, value_name = "FILE")]
    pub(crate) out: Option<PathBuf>,
    /// Also write every figure into this folder, as SVG and as PDF
    #[arg(long, value_name = "DIR")]
    pub(crate) figures: Option<PathBuf>,
    /// Replace files that exist
    #[arg(long)]
    pub(crate) replace: bool,
}

/// Options of `table`.
#[derive(Args, Debug)]
pub(crate) struct TableArguments {
    /// Run directories
    #[arg(value_name = "RUN", required = true)]
    pub(crate) runs: Vec<PathBuf>,
    /// How to write the table
    #[arg(long, value_enum, value_name = "FORMAT", default_value_t = TableStyle::Markdown)]
    pub(crate) format: TableStyle,
}

/// How `table` writes.
#[derive(Clone, Copy, Debug, PartialEq, Eq, ValueEnum)]
pub(crate) enum TableStyle {
    /// A tabular of LaTeX
    Latex,
    /// A table of Markdown
    Markdown,
    /// A line a run and parameter, every digit
    Csv,
}

/// Options of `schema`.
#[derive(Args, Debug)]
pub(crate) struct SchemaArguments {
    /// What to describe, such as study or summary
    #[arg(value_name = "TOPIC")]
    pub(crate) topic: Option<String>,
}

/// Options of `completions`.
#[derive(Args, Debug)]
pub(crate) struct CompletionsArguments {
    /// The shell
    #[arg(value_name = "SHELL", value_enum)]
    pub(crate) shell: clap_complete::Shell,
}

/// Options of `manual`.
#[derive(Args, Debug)]
pub(crate) struct ManualArguments {
    /// The topic, such as the name of a departure
    #[arg(value_name = "TOPIC")]
    pub(crate) topic: Option<String>,
    /// Write the manual pages of all commands into this folder, as `man` reads them
    #[arg(long, value_name = "DIR", conflicts_with = "topic")]
    pub(crate) pages: Option<PathBuf>,
}

/// Options of `new`.
#[derive(Args, Debug)]
pub(crate) struct NewArguments {
    /// The folder to make; it must not exist, or be empty
    #[arg(value_name = "DIR")]
    pub(crate) directory: PathBuf,
}

/// Options of `blind` and `reveal`.
#[derive(Args, Debug)]
pub(crate) struct BlindArguments {
    /// The study file, or (to reveal) the folder of the blinded study
    #[arg(value_name = "STUDY")]
    pub(crate) study: PathBuf,
    /// A file that holds the phrase, at least eight characters
    #[arg(long, value_name = "F")]
    pub(crate) phrase_file: PathBuf,
    /// The folder to make; it must not exist
    #[arg(long, value_name = "DIR")]
    pub(crate) out: PathBuf,
}

/// Options of `simulate`.
#[derive(Args, Debug)]
pub(crate) struct SimulateArguments {
    #[command(flatten)]
    pub(crate) study: StudyArguments,
    /// The folder to make; it must not exist
    #[arg(long, value_name = "DIR")]
    pub(crate) out: PathBuf,
    /// Seed of the noise, and of the truth with `--from-prior`
    #[arg(long, value_name = "N", default_value_t = 1)]
    pub(crate) seed: u64,
    /// Draw the truth from the priors
    #[arg(long)]
    pub(crate) from_prior: bool,
    /// Draw N mocks of each survey too; the written study estimates its covariances from them
    #[arg(long, value_name = "N", value_parser = clap::value_parser!(u16).range(2..))]
    pub(crate) mocks: Option<u16>,
}

/// Which study, which hypothesis, and what to change in it.
#[derive(Args, Debug)]
pub(crate) struct StudyArguments {
    /// The study file
    #[arg(value_name = "STUDY")]
    pub(crate) study: PathBuf,
    /// The hypothesis, by its name in the study; if not given, the first with an inferred departure
    #[arg(long, value_name = "NAME")]
    pub(crate) hypothesis: Option<String>,
    /// Give a quantity another value or prior, as in departure.tau=3 or 'larkfield.near.offset={ normal = [0, 5] }'
    #[arg(long, value_name = "NAME=VALUE")]
    pub(crate) set: Vec<String>,
}

const EVERYWHERE: &str = "Everywhere";

const WHICH_TO_FIT: &str = "The hypothesis, by its name in the study, or `all` of them in turn; if not given, the first with \
                            an inferred departure, and it says which";

const OUT_HELP: &str = "The run directory to make [default: runs/<title>-<hypothesis>]; with `--hypothesis all`, a folder \
                        in which each has its own";

/// Options of `predict`.
#[derive(Args, Debug)]
pub(crate) struct PredictArguments {
    #[command(flatten)]
    pub(crate) study: StudyArguments,
    /// Also print what each physical effect contributes: columns that add up to the prediction
    #[arg(long)]
    pub(crate) by_effect: bool,
}

/// Options of `fit`.
#[derive(Args, Debug)]
pub(crate) struct FitArguments {
    #[command(flatten)]
    pub(crate) study: StudyArguments,
    /// The run directory to make
    #[arg(long, value_name = "DIR", help = OUT_HELP)]
    pub(crate) out: Option<PathBuf>,
    /// Fit this survey or bin alone, as larkfield or larkfield.near; may be given several times
    #[arg(long, value_name = "SURVEY[.BIN]")]
    pub(crate) only: Vec<String>,
    /// Leave this survey or bin out; may be given several times
    #[arg(long, value_name = "SURVEY[.BIN]")]
    pub(crate) without: Vec<String>,
    /// Replace the run directory if it exists, once the new run is complete
    #[arg(long)]
    pub(crate) replace: bool,
    /// Go on with a run that was interrupted or killed: the chain will be the same as if it had not been
    ///
    /// Starts the run if there is none, and takes one that is finished as it is.
    #[arg(long, conflicts_with = "replace")]
    pub(crate) resume: bool,
    /// Seed of every random number, in place of the study's
    #[arg(long, value_name = "N", value_parser = clap::value_parser!(u64).range(..=i64::MAX as u64))]
    pub(crate) seed: Option<u64>,
    /// Threads to sample with [default: one a core]
    #[arg(long, value_name = "N", value_parser = clap::value_parser!(u16).range(1..=1024))]
    pub(crate) threads: Option<u16>,
    /// Then fit again with the smallest and largest separations cut, bins and surveys left out, other noise models and
    /// growth free, and write beside the run (stability.json) how far the departure moves, and by how much it must
    #[arg(long)]
    pub(crate) stability: bool,
    /// Give up after so many likelihood evaluations, converged or not
    #[arg(long, value_name = "N", value_parser = clap::value_parser!(u64).range(1..=i64::MAX as u64))]
    pub(crate) maximum_evaluations: Option<u64>,
}

/// Options of `weigh`.
#[derive(Args, Debug)]
#[command(mut_arg("hypothesis", |argument| argument.hide(true)))]
pub(crate) struct WeighArguments {
    #[command(flatten)]
    pub(crate) study: StudyArguments,
    /// The run directory to make [default: runs/TITLE-weigh]
    #[arg(long, value_name = "DIR")]
    pub(crate) out: Option<PathBuf>,
    /// Replace the run directory if it exists, once the new run is complete
    #[arg(long)]
    pub(crate) replace: bool,
    /// Go on with what an interrupted run has finished
    #[arg(long)]
    pub(crate) resume: bool,
    /// Seed of every random number, in place of the study's
    #[arg(long, value_name = "N", value_parser = clap::value_parser!(u64).range(..=i64::MAX as u64))]
    pub(crate) seed: Option<u64>,
    /// Threads to compute with [default: one a core]
    #[arg(long, value_name = "N", value_parser = clap::value_parser!(u16).range(1..=1024))]
    pub(crate) threads: Option<u16>,
}

/// Reads the command line. A request for help or version is answered, a mistake explained; then there is only a status.
pub(crate) fn read(words: impl IntoIterator<Item = OsString>) -> Result<Options, Status> {
    let words: Vec<OsString> = words.into_iter().collect();
    let colour = match asked_colour(&words) {
        Some("always") => ColorChoice::Always,
        Some("never") => ColorChoice::Never,
        _ => ColorChoice::Auto,
    };
    let read = Options::command()
        .color(colour)
        .try_get_matches_from(&words)
        .and_then(|matches| Options::from_arg_matches(&matches));
    read.map_err(|error| {
        // To standard output for help, which may be closed early; else to standard error.
        let _ = error.print();
        if !error.use_stderr() {
            return Status::Done;
        }
        if words.iter().any(|word| word == "--json") {
            let first = error.to_string().lines().next().unwrap_or_default().to_owned();
            let text = first.strip_prefix("error: ").unwrap_or(&first).to_owned();
            let _ = Output::json_error(&text);
        }
        Status::CommandLineWrong
    })
}

/// The value of `--color`, needed before anything else is understood.
fn asked_colour(words: &[OsString]) -> Option<&str> {
    let at = words.iter().position(|word| word.to_str().is_some_and(|word| word.starts_with("--color")))?;
    match words[at].to_str()?.strip_prefix("--color")? {
        "" => words.get(at + 1)?.to_str(),
        value => value.strip_prefix('='),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn words(line: &str) -> Vec<OsString> {
        line.split_whitespace().map(OsString::from).collect()
    }

    #[test]
    fn the_options_are_consistent() {
        Options::command().debug_assert();
    }

    #[test]
    fn a_fit_with_everything() {
        let line = "oddwell fit study.toml --hypothesis all --out here --seed 7 --threads 2 --replace --set a.b=1 \
                    --set c=2 --only a --only b.c --without b.c --maximum-evaluations 1000 --quiet --json --color never";
        let options = read(words(line)).expect("valid");
        assert!(options.global.quiet && options.global.json && options.global.color == Colour::Never);
        let Command::Fit(fit) = options.command else { unreachable!("`fit` is `fit`") };
        assert_eq!(fit.study.study, PathBuf::from("study.toml"));
        assert_eq!(fit.study.hypothesis.as_deref(), Some(ALL));
        assert_eq!(fit.study.set, ["a.b=1", "c=2"]);
        assert_eq!((fit.only.join(" "), fit.without.join(" ")), ("a b.c".to_owned(), "b.c".to_owned()));
        assert_eq!((fit.seed, fit.threads, fit.maximum_evaluations), (Some(7), Some(2), Some(1000)));
        assert_eq!((fit.out, fit.replace), (Some(PathBuf::from("here")), true));
    }

    #[test]
    fn colour_is_found_wherever_it_stands() {
        assert_eq!(asked_colour(&words("oddwell --color=always fit")), Some("always"));
        assert_eq!(asked_colour(&words("oddwell fit --color never")), Some("never"));
        assert_eq!(asked_colour(&words("oddwell fit --colorful")), None);
        assert_eq!(asked_colour(&words("oddwell fit --color")), None);
    }
}
