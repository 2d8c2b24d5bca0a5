//! The known name that an unknown one was probably meant to be.

use std::fmt;

/// Similarity (1 − Damerau–Levenshtein distance / longer length) from which a name counts as a slip of another.
///
/// One wrong letter in two, as `h0` for `h`, still counts; `evidence` for `evolution` does not.
const CLOSE: f64 = 0.5;

/// What to say about an unknown name.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Nearest {
    name: Option<String>,
    close: bool,
    known: Vec<String>,
}

impl Nearest {
    /// Finds the known name that lies nearest to `name`; the first of equals.
    pub(crate) fn find<S: AsRef<str>>(name: &str, known: impl IntoIterator<Item = S>) -> Self {
        let known: Vec<String> = known.into_iter().map(|each| each.as_ref().to_owned()).collect();
        let mut best: Option<(&String, f64)> = None;
        for candidate in &known {
            let similarity = strsim::normalized_damerau_levenshtein(name, candidate);
            if best.is_none_or(|(_, highest)| similarity > highest) {
                best = Some((candidate, similarity));
            }
        }
        let close = best.is_some_and(|(_, similarity)| similarity >= CLOSE);
        Self { name: best.map(|(candidate, _)| candidate.clone()), close, known }
    }

    /// The nearest known name; none where nothing is known.
    pub fn name(&self) -> Option<&str> {
        self.name.as_deref()
    }

    /// Whether it is near enough to be what was meant.
    pub fn is_close(&self) -> bool {
        self.close
    }

    /// The names that are known, in their own order.
    pub fn known(&self) -> &[String] {
        &self.known
    }
}

impl fmt::Display for Nearest {
    fn fmt(&self, out: &mut fmt::Formatter<'_>) -> fmt::Result {
        match &self.name {
            Some(name) if self.close => write!(out, "did you mean `{name}`?"),
            Some(name) if self.known.len() > 12 => write!(out, "the nearest known name is `{name}`"),
            Some(_) => write!(out, "known: {}", listed(&self.known)),
            None => write!(out, "there is none"),
        }
    }
}

/// `` `a`, `b`, `c` ``
pub(crate) fn listed<S: AsRef<str>>(names: &[S]) -> String {
    let quoted: Vec<String> = names.iter().map(|name| format!("`{}`", name.as_ref())).collect();
    quoted.join(", ")
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_slip_is_named_and_a_stranger_gets_the_list() {
        let known = ["constant", "dark-energy", "none"];
        assert_eq!(Nearest::find("constnt", known).to_string(), "did you mean `constant`?");
        assert_eq!(Nearest::find("zzz", known).to_string(), "known: `constant`, `dark-energy`, `none`");
        assert_eq!(Nearest::find("zzz", Vec::<String>::new()).to_string(), "there is none");
    }
}
