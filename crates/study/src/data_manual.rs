//! The manual's pages about the measurements: noise, covariances, templates, tracers.

use oddwell_likelihood::{array_formats, noise_families};
use serde::Serialize;

/// One page about the measurements.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct DataPage {
    /// The topic.
    pub name: &'static str,
    /// One line for the list of topics.
    pub summary: &'static str,
    /// Keys, or values of a key, with what they mean.
    pub entries: Vec<(String, String)>,
    /// What else there is to know.
    pub text: &'static str,
}

/// Every page about the measurements.
pub fn data_pages() -> Vec<DataPage> {
    vec![noise(), covariance(), templates(), tracers()]
}

fn entries(list: &[(&str, &str)]) -> Vec<(String, String)> {
    list.iter().map(|(key, meaning)| ((*key).to_owned(), (*meaning).to_owned())).collect()
}

fn noise() -> DataPage {
    let families = noise_families().iter().map(|family| {
        let needs = if family.needs_mocks { "; needs `mock_count` or `mocks`" } else { "" };
        (format!("noise = \"{}\"", family.name), format!("{}{needs}", family.summary))
    });
    DataPage {
        name: "noise",
        summary: "what turns χ² into a likelihood: noise and mock_count, determined",
        entries: families
            .chain(entries(&[
                ("mock_count", "from how many mocks the covariance was estimated (divisor one less)"),
                (
                    "determined",
                    "beside percival: how many quantities the data determine; by default the free quantities that move the \
                     survey's rows and whose standard deviation at the peak is below half of their prior's; `weigh` takes \
                     the largest count of any hypothesis for all",
                ),
            ]))
            .collect(),
        text: "Of these, only percival makes intervals cover as often as they say where the covariance is an estimate; \
               gaussian, hartlap and t are too narrow by about the square root of 1 + B (n_d − n_θ). Where its exponent does \
               not exceed the number of rows it is no density: odds then hold, evidences mean nothing by themselves. \
               p-values are by F where mocks made the covariance.",
    }
}

fn covariance() -> DataPage {
    let formats: Vec<String> =
        array_formats().iter().map(|format| format!(".{}", format.extensions()[0])).collect();
    let mut list = vec![(
        "covariance".to_owned(),
        format!("a square table ({}), rows as in the table of multipoles", formats.join(", ")),
    )];
    list.extend(entries(&[
        (
            "covariance_rows",
            "bin,pair,multipole,separation: names the rows of covariance, mocks (one array), extra_covariance and \
             shrink_towards, which may then hold more rows than the table, in another order",
        ),
        (
            "mocks",
            "in place of a covariance: one array with a mock a line, or a pattern such as \"mocks/m-*.csv\" of one table a \
             realisation; gaps in their numbers are listed",
        ),
        (
            "shrink_towards",
            "with mocks: a model covariance T; C = λ T + (1 − λ) S, λ from the mocks' own scatter (Pope & Szapudi 2008), of \
             the rows that are kept",
        ),
        ("empty_blocks", "pairs of bins (jointly: of SURVEY or SURVEY.BIN) whose covariance is set to nothing"),
        ("extra_covariance", "is added last, as an error of the theory; may be singular, with rows of nothing"),
        (
            "[[joint_covariance]]",
            "surveys = [\"a\", \"b\"] that share volume: file (rows of a, then of b), or their mocks, realisation by \
             realisation; noise, mock_count, determined and the keys above then stand here, one for all of them",
        ),
    ]));
    DataPage {
        name: "covariance",
        summary: "covariances, mocks, theory errors, surveys that share volume",
        entries: list,
        text: "Surveys without a joint covariance are taken to share no volume. A shrunk estimate, one with empty blocks, and \
               one with a theory error added are no longer distributed as an estimate from mocks: noise models for mocks are \
               then a little too cautious. With unit = \"Mpc\" all of them are converted like the measurements.",
    }
}

fn templates() -> DataPage {
    DataPage {
        name: "templates",
        summary: "shapes with an amplitude of their own, added to the prediction",
        entries: entries(&[
            ("name", "the amplitude is the parameter SURVEY.template.NAME"),
            ("file", "one number for each row of the survey's table, in its unit, whatever `keep` cuts"),
            ("amplitude", "a number, a prior, or the name of another quantity"),
        ]),
        text: "With noise gaussian or hartlap and a normal prior without `within`, an amplitude that no systematic, tie or \
               joint prior connects to anything is integrated out exactly and drawn back: chain and summary have it beside \
               the parameters that were sampled. Every other amplitude is sampled as any quantity is.",
    }
}

fn tracers() -> DataPage {
    DataPage {
        name: "tracers",
        summary: "bias, magnification, evolution, and the slope that a catalogue shows",
        entries: entries(&[
            ("bias", "b"),
            ("magnification", "s, dlog10 N/dmagnitude at the flux limit"),
            ("evolution", "e, dln n/dln a of the comoving density at fixed luminosity threshold"),
            (
                "observed_density_slope",
                "in place of evolution: the slope dln n/dln a that the flux-limited catalogue shows; \
                 e = slope − 5 s (1 + 1/(r H)), at every redshift, with magnification and background as they are inferred",
            ),
            ("bias_slope", "dln b/dln a"),
        ]),
        text: "The same error of e in both tracers is exactly a departure. K-corrections are left out of the conversion. \
               Evolution biases beyond 5 are warned about: a slope typed as evolution moves τ by many units.",
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn every_noise_and_every_key_of_a_covariance_is_explained() {
        let pages = data_pages();
        let text = |name: &str| {
            let page = pages.iter().find(|page| page.name == name).unwrap();
            page.entries.iter().map(|(key, meaning)| format!("{key}: {meaning}\n")).collect::<String>()
        };
        for family in noise_families() {
            assert!(text("noise").contains(&format!("noise = \"{}\": {}", family.name, family.summary)));
        }
        for key in ["covariance_rows", "mocks", "shrink_towards", "empty_blocks", "extra_covariance"] {
            assert!(text("covariance").contains(&format!("{key}: ")), "{key}");
        }
        for format in array_formats() {
            assert!(text("covariance").contains(format.extensions()[0]));
        }
    }
}
