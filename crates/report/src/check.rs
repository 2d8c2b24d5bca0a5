//! What `oddwell check` prints.

use oddwell_study::blinding::WITHHELD;
use oddwell_study::check::{AmplitudeVerdict, CheckReport, SignalVerdict, Verdicts};

use crate::numbers::{UNKNOWN, count, probability, rounded, share, significant, two_digits};
use crate::style::Style;
use crate::text::{Table, wrapped};

/// Errors and warnings first, each with what to do, then the data's own verdicts.
pub fn check_text(report: &CheckReport, style: Style) -> String {
    let mut out = String::new();
    for error in &report.errors {
        out.push_str(&style.fault(wrapped("error: ", 2, error).trim_end()));
        out.push('\n');
    }
    for warning in &report.warnings {
        let text = wrapped(&format!("warning {}: ", warning.code), 2, &warning.text);
        out.push_str(&style.caution(text.trim_end()));
        out.push('\n');
    }
    if report.errors.is_empty() && report.warnings.is_empty() {
        out.push_str("no errors, no warnings\n");
    }
    if let Some(verdicts) = &report.verdicts {
        let sections = [
            blinded(verdicts, style),
            rows(verdicts, style),
            three_claims(verdicts, style),
            signals(verdicts, style),
            goodness(verdicts, style),
            parity(verdicts, style),
            redshifts(verdicts, style),
            budget(verdicts, style),
            equivalents(verdicts, style),
            limits(style),
        ];
        for section in sections.into_iter().filter(|section| !section.is_empty()) {
            out.push('\n');
            out.push_str(&section);
        }
    }
    out
}

fn blinded(verdicts: &Verdicts, style: Style) -> String {
    if !verdicts.blinded {
        return String::new();
    }
    format!("{}\n", style.strong(wrapped("BLINDED: ", 2, WITHHELD).trim_end()))
}

fn rows(verdicts: &Verdicts, style: Style) -> String {
    let mut table = Table::new(&[
        "",
        "rows kept",
        "cut",
        "noise",
        "mocks",
        "errors grow",
        "condition",
        "covariance wants",
        "p-value",
    ]);
    let or = |text: Option<String>| text.unwrap_or_else(|| UNKNOWN.to_owned());
    let mut modes = String::new();
    for survey in &verdicts.surveys {
        let covariance = &survey.covariance;
        table.row(vec![
            survey.name.clone(),
            count(survey.rows_kept as u64),
            count(survey.rows_cut as u64),
            survey.noise.clone(),
            or(covariance.mocks.map(|mocks| count(mocks as u64))),
            or(covariance.error_growth.map(|growth| format!("× {growth:.2}"))),
            or(covariance.condition.map(|condition| significant(condition, 3))),
            or(covariance.scale.map(|scale| format!("× {}", significant(scale, 3)))),
            or(covariance.scale_p_value.map(probability)),
        ]);
        if let Some(mode) = covariance.smallest_modes.first() {
            let rows: Vec<String> =
                mode.rows.iter().map(|(row, part)| format!("{row} ({})", share(*part))).collect();
            let text = format!(
                "the smallest mode of {} ({} of an uncorrelated row's variance): {}",
                survey.name,
                significant(mode.eigenvalue, 2),
                rows.join(", ")
            );
            modes.push_str(&wrapped("  ", 4, &text));
        }
    }
    let heading = style.strong("Rows and covariances");
    format!("{heading}\n{}{modes}", table.render(|header| style.faint(header)))
}

fn deviations(sigma: Option<f64>) -> String {
    sigma.map_or_else(|| UNKNOWN.to_owned(), |sigma| format!("{sigma:.1} σ"))
}

fn amplitude(name: &str, verdict: &AmplitudeVerdict) -> String {
    let value = verdict.value.map_or_else(|| "withheld".to_owned(), |value| rounded(value, verdict.sd));
    let sigma = verdict.sigma.map_or_else(String::new, |sigma| format!(", {sigma:.1} σ from none"));
    wrapped("  ", 4, &format!("{name}: {value} ± {}{sigma}", two_digits(verdict.sd)))
}

/// `1.2 ± 3.4`, or the error alone while the value is withheld.
fn short(verdict: &AmplitudeVerdict) -> String {
    let error = two_digits(verdict.sd);
    verdict
        .value
        .map_or_else(|| format!("± {error}"), |value| format!("{} ± {error}", rounded(value, verdict.sd)))
}

/// Three claims with three numbers: never one for another.
fn three_claims(verdicts: &Verdicts, style: Style) -> String {
    let mut out = format!("{}\n", style.strong("Three claims, three numbers"));
    if let Some(any) = &verdicts.any_odd_signal {
        let text = format!(
            "any odd signal at all: {}, signal-to-noise {:.1}",
            deviations(any.sigma),
            any.signal_to_noise
        );
        out.push_str(&wrapped("  ", 4, &text));
    }
    if let Some(redshift) = &verdicts.gravitational_redshift {
        let name = "gravitational redshift (1 in general relativity, 0 without)";
        out.push_str(&amplitude(name, redshift));
    }
    if let Some(departure) = &verdicts.departure {
        let name = "the departure, linear about general relativity, beyond its prior";
        out.push_str(&amplitude(name, departure));
    }
    if let Some(turned) = &verdicts.orientation {
        let text = format!(
            "orientation: swapping the tracers changes −2 ln L by {:+.1} (about {:+.1} is expected where they stand right)",
            turned.difference, turned.expected
        );
        out.push_str(&wrapped("  ", 4, &text));
    }
    out
}

fn signals(verdicts: &Verdicts, style: Style) -> String {
    let mut table =
        Table::new(&["", "rows", "signal-to-noise", "any signal", "gravitational redshift", "departure"]);
    let known =
        |verdict: &Option<AmplitudeVerdict>| verdict.as_ref().map_or_else(|| UNKNOWN.to_owned(), short);
    for verdict in &verdicts.signals {
        let SignalVerdict { place, rows, signal_to_noise, sigma, .. } = verdict;
        table.row(vec![
            place.clone(),
            count(*rows as u64),
            format!("{signal_to_noise:.1}"),
            deviations(*sigma),
            known(&verdict.gravitational_redshift),
            known(&verdict.departure),
        ]);
    }
    let heading =
        style.strong("Signal of each multipole of each bin: any, gravitational redshift, departure");
    format!("{heading}\n{}", table.render(|header| style.faint(header)))
}

fn goodness(verdicts: &Verdicts, style: Style) -> String {
    if verdicts.goodness.is_empty() {
        return String::new();
    }
    let mut table = Table::new(&["", "χ²", "rows", "p-value"]);
    for place in &verdicts.goodness {
        table.row(vec![
            place.place.clone(),
            format!("{:.1}", place.chi2),
            count(place.rows as u64),
            place.p_value.map_or_else(|| UNKNOWN.to_owned(), probability),
        ]);
    }
    let heading =
        style.strong("About general relativity at the centre of the priors, their spread allowed for");
    let normal = verdicts.normality.map_or_else(String::new, |p_value| {
        wrapped(
            "  ",
            4,
            &format!("whitened residuals normal (Anderson–Darling): p = {}", probability(p_value)),
        )
    });
    format!("{heading}\n{}{normal}", table.render(|header| style.faint(header)))
}

/// Even multipoles where they do not belong.
fn parity(verdicts: &Verdicts, style: Style) -> String {
    if verdicts.leakage.is_empty() && verdicts.parity.is_empty() {
        return String::new();
    }
    let mut out =
        format!("{}\n", style.strong("Parity: even multipoles in odd ones, everything else marginalised"));
    let mut table = Table::new(&["", "share", "from none"]);
    for leak in &verdicts.leakage {
        table.row(vec![
            format!("{} multipole {} in {}", leak.bin, leak.from, leak.into),
            short(&leak.share),
            deviations(leak.share.sigma),
        ]);
    }
    out.push_str(&table.render(|header| style.faint(header)));
    for block in &verdicts.parity {
        let difference = block.largest_difference.map_or_else(
            || "what is expected is unknown without a [survey.design]".to_owned(),
            |difference| format!("at most {difference:+.3} from what Gaussian fields would have"),
        );
        let p_value =
            block.p_value.map_or_else(String::new, |p_value| format!(", p = {}", probability(p_value)));
        let text = format!(
            "correlations of odd with even multipoles in {}: {:+.3} at most ({} with {}), {difference}{p_value}",
            block.bin, block.largest, block.rows[0], block.rows[1]
        );
        out.push_str(&wrapped("  ", 4, &text));
    }
    out
}

/// What each bin's redshift can stand for.
fn redshifts(verdicts: &Verdicts, style: Style) -> String {
    if verdicts.widths.is_empty() && verdicts.scale_factors.is_empty() {
        return String::new();
    }
    let mut out = format!("{}\n", style.strong("Redshifts"));
    let mut table = Table::new(&["", "one redshift will do up to a width of", "average over the bin"]);
    for width in &verdicts.widths {
        table.row(vec![
            width.bin.clone(),
            significant(width.widest, 2),
            width.excess.map_or_else(|| UNKNOWN.to_owned(), |excess| format!("{:+.1} %", 100.0 * excess)),
        ]);
    }
    if !verdicts.widths.is_empty() {
        out.push_str(&table.render(|header| style.faint(header)));
    }
    let closest =
        verdicts.scale_factors.iter().min_by(|one, other| one.difference.total_cmp(&other.difference));
    if let Some(verdict) = closest {
        let text = format!(
            "were they scale factors: −2 ln L changes by {:+.1} or more ({}; about {:+.1} is expected of redshifts)",
            verdict.difference, verdict.place, verdict.expected
        );
        out.push_str(&wrapped("  ", 4, &text));
    }
    out
}

fn budget(verdicts: &Verdicts, style: Style) -> String {
    let Some(expected) = verdicts.expected_sd else { return String::new() };
    let mut table = Table::new(&["known exactly", "sd of the departure", "share of the variance"]);
    table.row(vec!["nothing".to_owned(), two_digits(expected), String::new()]);
    for line in &verdicts.error_budget {
        table.row(vec![line.group.clone(), two_digits(line.sd), share(line.share)]);
    }
    let heading = style.strong("Error budget: what the departure is expected to be measured to");
    format!("{heading}\n{}", table.render(|header| style.faint(header)))
}

fn equivalents(verdicts: &Verdicts, style: Style) -> String {
    if verdicts.tau_equivalents.is_empty() {
        return String::new();
    }
    let mut table = Table::new(&["in τ felt by light", "a unit", "a prior sd"]);
    for worth in &verdicts.tau_equivalents {
        table.row(vec![
            format!("{}.{}", worth.bin, worth.quantity),
            significant(worth.per_unit, 3),
            worth.per_prior_sd.map_or_else(|| UNKNOWN.to_owned(), |worth| significant(worth, 2)),
        ]);
    }
    let heading = style.strong("What nuisances are worth");
    format!("{heading}\n{}", table.render(|header| style.faint(header)))
}

fn limits(style: Style) -> String {
    let text = "An odd signal is not gravitational redshift, and gravitational redshift is no departure from general \
                relativity. A p-value says how often sound measurements would look like this, not how likely the \
                measurements are sound. Nothing was sampled: numbers are linear about general relativity. What each warning \
                looks at, and how often it arises where nothing is wrong: `oddwell manual check`.";
    format!("{}\n{}", style.strong("What this does not mean"), wrapped("  ", 2, text))
}
