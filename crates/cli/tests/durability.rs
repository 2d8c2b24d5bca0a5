//! A run that is killed, stopped, starved of disk or tampered with loses nothing.
#![cfg(target_os = "linux")]
#![allow(clippy::unwrap_used, clippy::panic, reason = "a test stops at the first surprise")]

mod common;

use common::{Folder, Ran};
use std::fs;
use std::path::PathBuf;
use std::process::{Child, Command, Stdio};
use std::sync::OnceLock;
use std::thread::sleep;
use std::time::{Duration, Instant};

/// With the background free an evaluation takes long enough for a run of half a second.
const FREE: &str = "background.omega_m={ normal = [0.31, 0.02] }";
const BIAS: &str = "larkfield.near.first.bias={ normal = [2.1, 0.1] }";

fn folder() -> Folder {
    Folder::with("{ normal = [0.0, 0.3] }", 2_000)
}

fn words(more: &[&'static str]) -> Vec<&'static str> {
    let mut words = vec!["fit", "study.toml", "--out", "runs/one", "--set", FREE, "--set", BIAS];
    words.extend(more);
    words
}

/// The chain of a run that nothing happened to.
fn reference() -> &'static [u8] {
    static CHAIN: OnceLock<Vec<u8>> = OnceLock::new();
    CHAIN.get_or_init(|| {
        let folder = folder();
        let ran = folder.run(&words(&["--threads", "1"]));
        assert_eq!(ran.status, Some(0), "{}", ran.err);
        assert_eq!(names(&folder), ["one"], "nothing is left of a run that is done");
        fs::read(folder.path("runs/one/chain.csv")).unwrap()
    })
}

fn names(folder: &Folder) -> Vec<String> {
    let entries = fs::read_dir(folder.path("runs")).unwrap();
    let mut names: Vec<String> =
        entries.map(|entry| entry.unwrap().file_name().into_string().unwrap()).collect();
    names.sort();
    names
}

fn state(folder: &Folder, file: &str) -> PathBuf {
    folder.path("runs/.one.unfinished").join(file)
}

fn start(folder: &Folder, more: &[&'static str]) -> Child {
    folder.oddwell(&words(more)).stdout(Stdio::piped()).stderr(Stdio::piped()).spawn().unwrap()
}

/// Waits until the run has kept its first state.
fn wait_for_state(folder: &Folder, child: &mut Child) {
    let began = Instant::now();
    while !state(folder, "checkpoint").exists() {
        assert!(began.elapsed() < Duration::from_secs(60), "no checkpoint");
        assert!(child.try_wait().unwrap().is_none(), "the run ended before its checkpoint: make it longer");
        sleep(Duration::from_millis(5));
    }
}

/// A run killed by SIGKILL once it has kept a state.
fn killed(folder: &Folder) {
    let mut child = start(folder, &[]);
    wait_for_state(folder, &mut child);
    child.kill().unwrap();
    child.wait().unwrap();
    assert!(!folder.path("runs/one").exists());
}

fn resumes(folder: &Folder, said: &str) {
    let ran = folder.run(&words(&["--resume"]));
    assert_eq!(ran.status, Some(0), "{}", ran.err);
    assert!(ran.err.contains(said), "{}", ran.err);
    assert_eq!(names(folder), ["one"]);
    let chain = fs::read(folder.path("runs/one/chain.csv")).unwrap();
    assert!(chain == reference(), "the chain is another");
}

#[test]
fn a_killed_run_goes_on_to_the_same_chain() {
    let folder = folder();
    killed(&folder);
    // Not by accident, though: without `--resume` it is neither overwritten nor gone on with.
    let ran = folder.run(&words(&[]));
    assert_eq!(ran.status, Some(1));
    assert!(ran.err.contains("a run was broken off here; go on with `--resume`"), "{}", ran.err);
    resumes(&folder, "went on from the last checkpoint");
    resumes(&folder, "had been finished before");
}

#[test]
fn a_run_killed_before_its_first_checkpoint_begins_anew() {
    let folder = folder();
    let mut child = start(&folder, &[]);
    sleep(Duration::from_millis(60));
    child.kill().unwrap();
    child.wait().unwrap();
    resumes(&folder, "the run was begun");
}

#[test]
fn a_stopped_run_goes_on_to_the_same_chain() {
    let folder = folder();
    let mut child = start(&folder, &[]);
    wait_for_state(&folder, &mut child);
    let signalled = Instant::now();
    assert!(Command::new("kill").args(["-TERM", &child.id().to_string()]).status().unwrap().success());
    let ran = Ran::of(child.wait_with_output().unwrap());
    // A second on an idle machine; this one may be busy with other tests.
    assert!(signalled.elapsed() < Duration::from_secs(10), "{:?}", signalled.elapsed());
    assert_eq!(ran.status, Some(130), "{}", ran.err);
    // A fast machine may keep its first state while it still warms up, with no draw to hand back.
    let early = ran.err.contains("stopped before there was a draw to hand back");
    let left: &[&str] = if early { &[".one.unfinished"] } else { &[".one.unfinished", "one"] };
    assert_eq!(names(&folder), left);
    assert_eq!(folder.path("runs/one/summary.json").is_file(), !early);
    resumes(&folder, "went on from the last checkpoint");
}

#[test]
fn a_second_process_is_refused_while_the_first_lives() {
    let folder = folder();
    let mut child = start(&folder, &[]);
    wait_for_state(&folder, &mut child);
    let ran = folder.run(&words(&["--resume"]));
    assert_eq!(ran.status, Some(1));
    let holder = format!("process {} is writing this run", child.id());
    assert!(ran.err.contains(&holder), "{}", ran.err);
    child.kill().unwrap();
    child.wait().unwrap();
    // Its lock file is still there, and no lock any more.
    assert!(state(&folder, "lock").is_file());
    resumes(&folder, "went on from the last checkpoint");
}

#[test]
fn a_damaged_checkpoint_is_noticed_and_the_one_before_it_used() {
    let folder = folder();
    killed(&folder);
    let last = state(&folder, "checkpoint");
    let whole = fs::read(&last).unwrap();
    fs::write(state(&folder, "checkpoint-before"), &whole).unwrap();
    fs::write(&last, &whole[..whole.len() / 2]).unwrap();
    resumes(&folder, "went on from the checkpoint before the last, which is damaged");
}

#[test]
fn another_study_or_seed_is_refused_and_the_state_stays() {
    let folder = folder();
    killed(&folder);
    let table = folder.path("multipoles.csv");
    let was = fs::read_to_string(&table).unwrap();
    fs::write(&table, was.replace("0.0031", "0.0032")).unwrap();
    let ran = folder.run(&words(&["--resume"]));
    assert_eq!(ran.status, Some(1));
    assert!(ran.err.contains("multipoles.csv has changed since"), "{}", ran.err);
    fs::write(&table, was).unwrap();
    let ran = folder.run(&words(&["--resume", "--seed", "9"]));
    assert_eq!(ran.status, Some(1));
    assert!(ran.err.contains("begun with seed 3, and this is seed 9"), "{}", ran.err);
    resumes(&folder, "went on from the last checkpoint");
}

/// A limit on the size of files stands for a full disk: the same error of the same system calls. First for the checkpoints of
/// a run, which goes on and ends as ever but for a warning where results fit; then for its results.
#[test]
fn a_full_disk_ends_a_run_with_a_message_and_its_checkpoint_whole() {
    let folder = folder();
    killed(&folder);
    let checkpoint = fs::read(state(&folder, "checkpoint")).unwrap();
    let program = folder.oddwell(&[]);
    let mut starved = Command::new("bash");
    starved.args(["-c", "trap '' XFSZ; ulimit -f 1; exec \"$0\" \"$@\""]);
    starved.arg(program.get_program()).args(words(&["--resume"]));
    starved.current_dir(program.get_current_dir().unwrap());
    let ran = Ran::of(starved.output().unwrap());
    assert_eq!(ran.status, Some(1), "{}", ran.err);
    assert!(ran.err.contains("runs/one"), "{}", ran.err);
    assert!(!folder.path("runs/one").exists());
    assert_eq!(names(&folder), [".one.unfinished"]);
    assert!(fs::read(state(&folder, "checkpoint")).unwrap() == checkpoint, "another checkpoint");
    assert!(!state(&folder, "checkpoint-new").exists() && !state(&folder, "results").exists());
    resumes(&folder, "went on from the last checkpoint");
}

/// Where nobody can write, not even whom permissions do not bind.
#[test]
fn a_folder_that_cannot_be_written_is_refused_before_the_run() {
    let folder = folder();
    let began = Instant::now();
    let ran = folder.run(&["fit", "study.toml", "--out", "/proc/runs/one", "--set", FREE, "--set", BIAS]);
    assert_eq!(ran.status, Some(1));
    assert!(ran.err.contains("/proc/runs/one"), "{}", ran.err);
    assert!(began.elapsed() < Duration::from_secs(10));
}
