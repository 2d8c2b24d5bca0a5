#![allow(clippy::unwrap_used, reason = "a test stops at the first surprise")]

use super::*;

fn identity() -> RunIdentity {
    let file = |path: &str, sha256: &str| InputFile { path: path.to_owned(), sha256: sha256.to_owned() };
    RunIdentity {
        version: "oddwell 0.1.0".to_owned(),
        task: "fit of `constant`".to_owned(),
        inputs: vec![file("study.toml", "aa"), file("larkfield.csv", "bb")],
        overrides: vec![],
        seed: 1,
    }
}

fn kept(folder: &Path, states: &[Vec<f64>]) -> Checkpoints {
    let mut checkpoints = Checkpoints::new(folder, Path::new("runs/first"), identity());
    for state in states {
        checkpoints.keep(state, true);
        assert_eq!(checkpoints.failure(), None);
    }
    checkpoints
}

fn loaded(checkpoints: &Checkpoints) -> (Vec<f64>, Option<String>) {
    let Kept { state, damage } = checkpoints.load().unwrap().unwrap();
    (state, damage)
}

#[test]
fn the_last_state_comes_back_bit_by_bit() {
    let folder = tempfile::tempdir().unwrap();
    let odd = vec![0.1, f64::NEG_INFINITY, -0.0, f64::MIN_POSITIVE, f64::NAN];
    let checkpoints = kept(folder.path(), &[vec![1.0], odd.clone()]);
    let (state, damage) = loaded(&checkpoints);
    assert!(state.iter().zip(&odd).all(|(one, other)| one.to_bits() == other.to_bits()));
    assert_eq!(damage, None);
    let nothing = Checkpoints::new(folder.path().parent().unwrap(), Path::new("r"), identity());
    assert!(nothing.load::<Vec<f64>>().unwrap().is_none());
}

/// Every cut and every flipped bit of the last checkpoint is noticed, and the one before it serves.
#[test]
fn a_damaged_checkpoint_is_noticed_and_the_one_before_it_serves() {
    let folder = tempfile::tempdir().unwrap();
    let checkpoints = kept(folder.path(), &[vec![1.0, 2.0], vec![3.0, 4.0]]);
    let path = folder.path().join("checkpoint");
    let whole = fs::read(&path).unwrap();
    for length in 0..whole.len() {
        fs::write(&path, &whole[..length]).unwrap();
        let (state, damage) = loaded(&checkpoints);
        assert_eq!(state, [1.0, 2.0], "cut to {length}");
        assert!(damage.is_some());
    }
    for bit in 0..8 * whole.len() {
        let mut flipped = whole.clone();
        flipped[bit / 8] ^= 1 << (bit % 8);
        fs::write(&path, &flipped).unwrap();
        assert_eq!(loaded(&checkpoints).0, [1.0, 2.0], "bit {bit}");
    }
    // Killed between two renames: no last one at all.
    fs::remove_file(&path).unwrap();
    assert_eq!(loaded(&checkpoints), (vec![1.0, 2.0], None));
    fs::write(folder.path().join("checkpoint-before"), b"rubbish").unwrap();
    let error = checkpoints.load::<Vec<f64>>().unwrap_err().to_string();
    assert!(error.contains("runs/first") && error.contains("checkpoint-before"), "{error}");
}

#[test]
fn the_state_of_another_run_is_refused_with_the_difference() {
    let folder = tempfile::tempdir().unwrap();
    kept(folder.path(), &[vec![1.0]]);
    let mut others = vec![];
    let mut change = |expected: &'static str, edit: &dyn Fn(&mut RunIdentity)| {
        let mut other = identity();
        edit(&mut other);
        others.push((expected, other));
    };
    change("this is oddwell 0.2.0", &|other| other.version = "oddwell 0.2.0".to_owned());
    change("study.toml has changed", &|other| other.inputs[0].sha256 = "cc".to_owned());
    change("larkfield.csv has changed", &|other| other.inputs[1].sha256 = "cc".to_owned());
    change("other files", &|other| other.inputs.truncate(1));
    change("this is fit of `gr`", &|other| other.task = "fit of `gr`".to_owned());
    change("`--set`", &|other| other.overrides = vec!["a.b=1".to_owned()]);
    change("seed 1, and this is seed 2", &|other| other.seed = 2);
    for (expected, other) in others {
        let checkpoints = Checkpoints::new(folder.path(), Path::new("runs/first"), other);
        let error = checkpoints.load::<Vec<f64>>().unwrap_err().to_string();
        assert!(error.contains(expected), "{error}");
    }
    // The same files seen from another folder are the same.
    let mut moved = identity();
    moved.inputs[0].path = "../study.toml".to_owned();
    assert!(Checkpoints::new(folder.path(), Path::new("r"), moved).load::<Vec<f64>>().is_ok());
}

/// A folder where a file is in the way of the new checkpoint stands for every disk that can't be written.
#[test]
fn a_state_that_cannot_be_written_leaves_the_last_one_and_says_why() {
    let folder = tempfile::tempdir().unwrap();
    let mut checkpoints = kept(folder.path(), &[vec![1.0]]);
    fs::create_dir(folder.path().join("checkpoint-new")).unwrap();
    checkpoints.keep(&vec![2.0], true);
    assert!(checkpoints.failure().is_some());
    assert_eq!(loaded(&checkpoints), (vec![1.0], None));
    fs::remove_dir(folder.path().join("checkpoint-new")).unwrap();
    checkpoints.keep(&vec![2.0], true);
    assert_eq!(checkpoints.failure(), None);
    assert_eq!(loaded(&checkpoints), (vec![2.0], None));
}
