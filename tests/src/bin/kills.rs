//! Kills a run again and again, at random moments, and checks that it always goes on to the same chain:
//! `cargo run --release -p oddwell-tests --bin kills -- [KILLS] [SEED]`, 100 kills and seed 1 by default, from the top of the
//! project.
//!
//! The run is the demo's with its background free. A life of it ends by SIGKILL after a random part of the time that the whole
//! takes, or because it is done; then the chain is compared with that of a run that nothing happened to, byte for byte, and
//! another run begins.
#![allow(clippy::print_stdout, clippy::print_stderr, reason = "a program's report to whoever runs it")]

use oddwell_study::{Control, Existing, FitOptions, Override, Study, fit};
use rand::{RngExt, SeedableRng};
use rand_xoshiro::Xoshiro256PlusPlus;
use std::path::Path;
use std::process::{Child, Command, ExitCode};
use std::time::{Duration, Instant};

/// Says that this process is the run itself.
const LIFE: &str = "--life";

fn main() -> ExitCode {
    let words: Vec<String> = std::env::args().skip(1).collect();
    let done = match words.as_slice() {
        [life, out] if life == LIFE => live(Path::new(out)),
        words => kill(words),
    };
    match done {
        Ok(()) => ExitCode::SUCCESS,
        Err(message) => {
            eprintln!("{message}");
            ExitCode::FAILURE
        }
    }
}

/// Goes on with the run, or begins it.
fn live(out: &Path) -> Result<(), String> {
    let free =
        Override::parse("background.omega_m={ normal = [0.31, 0.01] }").map_err(|error| error.to_string())?;
    let study = Study::read("data-demo/study.toml", &[free]).map_err(|error| error.to_string())?;
    let options = FitOptions {
        out: out.to_owned(),
        existing: Existing::Resume,
        seed: None,
        // Not converged, and of a fixed length.
        maximum_evaluations: Some(20_000),
        command: vec![],
        threads: 2,
    };
    fit(&study, study.default_hypothesis(), &options, &mut |_, _| Control::Continue)
        .map(|_| ())
        .map_err(|error| error.to_string())
}

fn start(out: &Path) -> Result<Child, String> {
    let program = std::env::current_exe().map_err(|error| error.to_string())?;
    Command::new(program).arg(LIFE).arg(out).spawn().map_err(|error| error.to_string())
}

/// Waits for the end; whether it came within `patience`.
fn ends_within(child: &mut Child, patience: Duration) -> Result<bool, String> {
    let began = Instant::now();
    loop {
        match child.try_wait().map_err(|error| error.to_string())? {
            Some(status) if status.success() => return Ok(true),
            Some(status) => return Err(format!("the run ended with {status}")),
            None if began.elapsed() >= patience => return Ok(false),
            None => std::thread::sleep(Duration::from_millis(1)),
        }
    }
}

fn chain(out: &Path) -> Result<Vec<u8>, String> {
    std::fs::read(out.join("chain.csv")).map_err(|error| format!("{}: {error}", out.display()))
}

fn kill(words: &[String]) -> Result<(), String> {
    let number = |at: usize, default: u64| match words.get(at) {
        Some(word) => word.parse::<u64>().map_err(|error| format!("`{word}`: {error}; give a whole number")),
        None => Ok(default),
    };
    let (kills, seed) = (number(0, 100)?, number(1, 1)?);
    let folder = tempfile::tempdir().map_err(|error| error.to_string())?;
    let began = Instant::now();
    if !ends_within(&mut start(&folder.path().join("whole"))?, Duration::from_secs(3600))? {
        return Err("the run does not end within an hour".to_owned());
    }
    let whole = began.elapsed();
    let reference = chain(&folder.path().join("whole"))?;
    println!("a whole run takes {:.1} s, its chain {} bytes", whole.as_secs_f64(), reference.len());
    let mut random = Xoshiro256PlusPlus::seed_from_u64(seed);
    let out = folder.path().join("killed");
    let (mut killed, mut finished, mut lives, mut most) = (0, 0, 0, 0);
    while killed < kills || lives > 0 {
        let mut child = start(&out)?;
        // Once there have been enough, the last run may end.
        let patience =
            if killed < kills { whole.mul_f64(random.random_range(0.0..0.7)) } else { whole * 100 };
        lives += 1;
        if ends_within(&mut child, patience)? {
            if chain(&out)? != reference {
                return Err(format!("after {} kills of one run its chain is another", lives - 1));
            }
            (finished, most, lives) = (finished + 1, most.max(lives - 1), 0);
            std::fs::remove_dir_all(&out).map_err(|error| error.to_string())?;
        } else {
            child.kill().map_err(|error| error.to_string())?;
            child.wait().map_err(|error| error.to_string())?;
            killed += 1;
        }
    }
    println!(
        "{killed} kills of {finished} runs, at most {most} of one: every chain is the same, byte for byte"
    );
    Ok(())
}
