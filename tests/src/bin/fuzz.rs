//! Feeds a reader damaged inputs: `cargo run --release -p oddwell-tests --bin fuzz -- TARGET SECONDS [SEED]`, TARGET one of
//! those that it lists without one, or `all`. Exit status 1 where something was found.

#![allow(clippy::print_stdout, clippy::print_stderr, reason = "a program that says what it found")]

use oddwell_tests::fuzz::{Outcome, Target, run, targets};
use std::process::ExitCode;
use std::time::Duration;

fn main() -> ExitCode {
    let words: Vec<String> = std::env::args().skip(1).collect();
    let all = match targets() {
        Ok(targets) => targets,
        Err(error) => {
            eprintln!("no temporary folder can be written: {error}");
            return ExitCode::FAILURE;
        }
    };
    let numbers =
        (words.get(1).map(|word| word.parse::<u64>()), words.get(2).map(|word| word.parse::<u64>()));
    let (Some(name), (Some(Ok(seconds)), seed @ (None | Some(Ok(_))))) = (words.first(), numbers) else {
        eprintln!("fuzz TARGET SECONDS [SEED]; targets: all, or");
        for target in &all {
            eprintln!("  {:16} {}", target.name, target.about);
        }
        return ExitCode::from(2);
    };
    let seed = seed.and_then(Result::ok).unwrap_or(1);
    let chosen: Vec<&Target> = all.iter().filter(|target| name == "all" || target.name == name).collect();
    if chosen.is_empty() {
        eprintln!("there is no target `{name}`");
        return ExitCode::from(2);
    }
    let mut status = ExitCode::SUCCESS;
    for target in chosen {
        let Outcome { attempts, accepted, found } =
            run(target, seed, |_, elapsed| elapsed >= Duration::from_secs(seconds));
        println!(
            "{}: {attempts} inputs in {seconds} s, {accepted} accepted, {} finds, seed {seed}",
            target.name,
            found.len()
        );
        for find in found {
            println!("  after {}: {:?}\n{}", find.attempt, find.find, String::from_utf8_lossy(&find.input));
            status = ExitCode::FAILURE;
        }
    }
    status
}
