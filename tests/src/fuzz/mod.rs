//! Damaged inputs for every reader: seeded, so that what was found can be found again.
//!
//! `cargo run --release -p oddwell-tests --bin fuzz -- TARGET SECONDS [SEED]`

mod damage;
mod targets;

use rand::SeedableRng;
use rand_xoshiro::Xoshiro256PlusPlus;
use std::panic::{AssertUnwindSafe, catch_unwind};
use std::sync::{Arc, Mutex, PoisonError};
use std::time::{Duration, Instant};

pub use targets::{Target, targets};

/// An answer that takes longer than this is a find.
pub const PATIENCE: Duration = Duration::from_secs(5);

/// What a damaged input did that none may do.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Find {
    /// It panicked: message and place.
    Panic(String),
    /// It took too long.
    Slow(Duration),
    /// It was refused without a word.
    Silent,
}

/// A find with the input that makes it.
#[derive(Clone, Debug)]
pub struct Found {
    /// What happened.
    pub find: Find,
    /// How many inputs came before.
    pub attempt: u64,
    /// The damaged input.
    pub input: Vec<u8>,
}

/// What a run came to.
#[derive(Clone, Debug, Default)]
pub struct Outcome {
    /// Inputs tried.
    pub attempts: u64,
    /// Of them, accepted as sound.
    pub accepted: u64,
    /// Finds, the first of each kind of panic.
    pub found: Vec<Found>,
}

/// Feeds a target damaged inputs until `enough` says so (of attempts and time).
pub fn run(target: &Target, seed: u64, enough: impl Fn(u64, Duration) -> bool) -> Outcome {
    let said = Arc::new(Mutex::new(String::new()));
    let heard = Arc::clone(&said);
    let before = std::panic::take_hook();
    std::panic::set_hook(Box::new(move |panic| {
        *heard.lock().unwrap_or_else(PoisonError::into_inner) = panic.to_string();
    }));
    let mut random = Xoshiro256PlusPlus::seed_from_u64(seed);
    let start = Instant::now();
    let mut outcome = Outcome::default();
    while !enough(outcome.attempts, start.elapsed()) {
        let input = damage::damaged(target.sound(outcome.attempts), &mut random);
        let begun = Instant::now();
        let answer = catch_unwind(AssertUnwindSafe(|| target.answer(outcome.attempts, &input)));
        let find = match answer {
            Err(_) => {
                let said = said.lock().unwrap_or_else(PoisonError::into_inner).clone();
                Some(Find::Panic(said))
            }
            _ if begun.elapsed() > PATIENCE => Some(Find::Slow(begun.elapsed())),
            Ok(Err(message)) if message.trim().is_empty() => Some(Find::Silent),
            Ok(answer) => {
                outcome.accepted += u64::from(answer.is_ok());
                None
            }
        };
        if let Some(find) = find
            && !outcome.found.iter().any(|known| known.find == find)
        {
            outcome.found.push(Found { find, attempt: outcome.attempts, input });
        }
        outcome.attempts += 1;
    }
    std::panic::set_hook(before);
    outcome
}
