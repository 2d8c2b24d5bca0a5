//! From a phrase to a secret number, and a commitment to the phrase.

use crate::checksum::sha256;
use crate::run_error::RunError;
use rand::SeedableRng;
use rand_distr::{Distribution, StandardNormal};
use rand_xoshiro::Xoshiro256PlusPlus;
use sha2::{Digest, Sha256};
use std::path::Path;

/// A phrase shorter than this is guessed in no time by whoever tries.
const SHORTEST: usize = 8;

/// What only its keeper knows. Neither shown nor written anywhere: it has no `Debug` that prints it.
pub(super) struct Phrase(String);

impl Phrase {
    /// The text of a file, without white space at its ends.
    ///
    /// # Errors
    /// [`RunError::Phrase`] for a file that can't be read or a phrase of fewer than eight characters.
    pub(super) fn read(path: &Path) -> Result<Phrase, RunError> {
        let fail = |reason: String| RunError::Phrase { path: path.to_owned(), reason };
        let text =
            std::fs::read_to_string(path).map_err(|error| fail(format!("it can't be read ({error})")))?;
        let phrase = text.trim();
        if phrase.chars().count() < SHORTEST {
            return Err(fail(format!("it must hold at least {SHORTEST} characters; choose a longer phrase")));
        }
        Ok(Phrase(phrase.to_owned()))
    }

    fn digest(&self, purpose: &str, salt: &str) -> [u8; 32] {
        let mut hash = Sha256::new();
        for part in [purpose, salt, &self.0] {
            hash.update((part.len() as u64).to_le_bytes());
            hash.update(part.as_bytes());
        }
        hash.finalize().into()
    }

    /// What the study publishes: it tells whether a phrase is the one, and not which it is.
    pub(super) fn commitment(&self, salt: &str) -> String {
        sha256(&self.digest("commitment", salt))
    }

    /// The secret departure: normal, of standard deviation `width`. From another digest than the commitment.
    pub(super) fn departure(&self, salt: &str, width: f64) -> f64 {
        let mut random = Xoshiro256PlusPlus::from_seed(self.digest("departure", salt));
        let normal: f64 = StandardNormal.sample(&mut random);
        width * normal
    }
}

/// Sixteen random bytes, in hexadecimal.
pub(super) fn fresh_salt() -> String {
    let bytes: [u8; 16] = rand::random();
    bytes.iter().map(|byte| format!("{byte:02x}")).collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn departures_are_normal_and_commitments_tell_phrases_apart() {
        let draws: Vec<f64> =
            (0..2000).map(|i| Phrase("a long phrase".into()).departure(&format!("{i:x}"), 2.0)).collect();
        let mean = draws.iter().sum::<f64>() / 2000.0;
        let variance = draws.iter().map(|draw| (draw - mean).powi(2)).sum::<f64>() / 1999.0;
        // Four standard errors: 2/√2000 of the mean, 4·√(2/2000) of the variance.
        assert!(mean.abs() < 4.0 * 2.0 / 2000.0_f64.sqrt(), "{mean}");
        assert!((variance - 4.0).abs() < 4.0 * 4.0 * (2.0 / 2000.0_f64).sqrt(), "{variance}");
        let commitment = |phrase: &str, salt: &str| Phrase(phrase.into()).commitment(salt);
        assert_eq!(commitment("a long phrase", "00"), commitment("a long phrase", "00"));
        assert_ne!(commitment("a long phrase", "00"), commitment("a long phrasf", "00"));
        assert_ne!(commitment("a long phrase", "00"), commitment("a long phrase", "01"));
    }
}
