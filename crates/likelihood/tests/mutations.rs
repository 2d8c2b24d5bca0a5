//! Damaged files: whatever happens to its bytes, a reader answers, with an error or with numbers, and soon.
//!
//! Sound files are cut, doubled, shuffled and overwritten by property-based generation; a panic, or an answer that takes
//! longer than two seconds for a few kilobytes, fails and is shrunk. 256 damaged files a reader and run; more by
//! `PROPTEST_CASES=200000 cargo test -p oddwell-likelihood --test mutations` (that profile checks arithmetic for overflow
//! too). No coverage-guided fuzzing is set up: it needs a nightly compiler and a crate outside the workspace.

#![allow(clippy::unwrap_used, reason = "in a helper of a test as in a test")]

use std::collections::BTreeMap;
use std::path::Path;
use std::time::{Duration, Instant};

use oddwell_likelihood::{Covariance, CovarianceRows, MockSet, MultipoleTable};
use proptest::prelude::*;
use proptest::sample::Index;

/// What can happen to a file.
#[derive(Clone, Debug)]
enum Damage {
    /// One byte becomes another.
    Overwrite(Index, u8),
    /// Some bytes go.
    Delete(Index, Index),
    /// The rest goes.
    Truncate(Index),
    /// Some bytes come twice.
    Double(Index, Index),
    /// Some bytes are written over others.
    Copy(Index, Index, Index),
    /// A word is put in.
    Insert(Index, &'static [u8]),
}

/// Bytes and words that mean something to one of the readers.
const BYTES: &[u8] = b"0123456789-+eE.()[]{}'\"\n\r,# TF\0\x01\x02\xff<>";
const WORDS: [&[u8]; 16] = [
    b"nan",
    b"-inf",
    b"1e999",
    b"99999999999999999999",
    b"18446744073709551615",
    b"-1",
    b"((((((((((((((((((((((((((((((((",
    b"[[[[[[[[[[[[[[[[[[[[[[[[[[[[[[[[",
    b"{{{{{{{{{{{{{{{{{{{{{{{{{{{{{{{{",
    b"\"",
    b"\r\n\r\n",
    b"\xef\xbb\xbf",
    b"END     ",
    b"CONTINUE  'x&'",
    b",,,,,,",
    b"# ",
];

fn damage() -> impl Strategy<Value = Damage> {
    let index = any::<Index>;
    let byte = prop_oneof![proptest::sample::select(BYTES), any::<u8>()];
    prop_oneof![
        4 => (index(), byte).prop_map(|(at, byte)| Damage::Overwrite(at, byte)),
        1 => (index(), index()).prop_map(|(from, count)| Damage::Delete(from, count)),
        1 => index().prop_map(Damage::Truncate),
        1 => (index(), index()).prop_map(|(from, count)| Damage::Double(from, count)),
        1 => (index(), index(), index()).prop_map(|(from, count, to)| Damage::Copy(from, count, to)),
        2 => (index(), proptest::sample::select(&WORDS[..])).prop_map(|(at, word)| Damage::Insert(at, word)),
    ]
}

fn damaged(sound: &[u8], all: &[Damage]) -> Vec<u8> {
    let mut bytes = sound.to_vec();
    for damage in all {
        if bytes.is_empty() {
            break;
        }
        let length = bytes.len();
        let range = |from: &Index, count: &Index| {
            let from = from.index(length);
            from..(from + 1 + count.index(120)).min(length)
        };
        match damage {
            // Most of what matters stands at the beginning: half of these hit the first 400 bytes.
            Damage::Overwrite(at, byte) if at.index(2) == 0 => bytes[at.index(length)] = *byte,
            Damage::Overwrite(at, byte) => bytes[at.index(length.min(400))] = *byte,
            Damage::Delete(from, count) => drop(bytes.drain(range(from, count))),
            Damage::Truncate(at) => bytes.truncate(at.index(length)),
            Damage::Double(from, count) => {
                let range = range(from, count);
                let copy = bytes[range.clone()].to_vec();
                bytes.splice(range.end..range.end, copy);
            }
            Damage::Copy(from, count, to) => {
                let copy = bytes[range(from, count)].to_vec();
                let to = to.index(length);
                let count = copy.len().min(length - to);
                bytes[to..to + count].copy_from_slice(&copy[..count]);
            }
            Damage::Insert(at, word) => {
                let at = at.index(length.min(400));
                bytes.splice(at..at, word.iter().copied());
            }
        }
    }
    bytes
}

/// Answers of `reader` to damaged forms of a sound file, each within two seconds.
fn check(
    sound: &[u8],
    damages: &[Damage],
    reader: impl Fn(&[u8]) -> Result<(), String>,
) -> Result<(), TestCaseError> {
    let bytes = damaged(sound, damages);
    let start = Instant::now();
    let answer = reader(&bytes);
    prop_assert!(start.elapsed() < Duration::from_secs(2), "{:?} for {} bytes", start.elapsed(), bytes.len());
    if let Err(message) = answer {
        prop_assert!(!message.is_empty());
        // A message shows little of what stands in the file.
        prop_assert!(message.chars().count() < 2000, "{message}");
    }
    Ok(())
}

fn array(name: &str) -> Vec<u8> {
    std::fs::read(Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/reference/arrays").join(name)).unwrap()
}

const TABLE: &[u8] = b"# shells\nbin,pair,multipole,separation,wavenumber,low,high,value,error\n\
    near,first-second,1,28,,24,32,0.001,1e-4\nnear,first-first,0,36,,32,40,0.002,1e-4\n\
    far,,2,,0.1,0.08,0.12,310,12\nfar,,3,28,,24,32,-0.001,1e-4\n";
const MATRIX: &[u8] = b"# three rows\n4,1,-0.5\n1,9,0.25\n-0.5,0.25,1.5\n";

fn covariance(file: &'static str) -> impl Fn(&[u8]) -> Result<(), String> {
    move |bytes| Covariance::parse(file, bytes, 3).map(|_| ()).map_err(|error| error.to_string())
}

fn mocks(file: &'static str) -> impl Fn(&[u8]) -> Result<(), String> {
    move |bytes| {
        let mocks = MockSet::parse(file, bytes, 3).map_err(|error| error.to_string())?;
        mocks.covariance().map(|_| ()).map_err(|error| error.to_string())
    }
}

proptest! {
    #![proptest_config(ProptestConfig { failure_persistence: None, ..ProptestConfig::default() })]

    #[test]
    fn tables(damages in prop::collection::vec(damage(), 1..6)) {
        check(TABLE, &damages, |bytes| {
            MultipoleTable::parse("table.csv", bytes, &BTreeMap::new()).map(|_| ()).map_err(|error| error.to_string())
        })?;
    }

    #[test]
    fn covariance_rows(damages in prop::collection::vec(damage(), 1..6)) {
        check(TABLE, &damages, |bytes| {
            CovarianceRows::parse("rows.csv", bytes, &BTreeMap::new()).map(|_| ()).map_err(|error| error.to_string())
        })?;
    }

    #[test]
    fn text(damages in prop::collection::vec(damage(), 1..6)) {
        check(MATRIX, &damages, covariance("cov.csv"))?;
        check(MATRIX, &damages, mocks("mocks.csv"))?;
    }

    #[test]
    fn npy(
        damages in prop::collection::vec(damage(), 1..6),
        name in prop::sample::select(vec!["c-order", "fortran-order", "single", "version-2", "structured", "mocks"]),
    ) {
        let sound = array(&format!("{name}.npy"));
        check(&sound, &damages, covariance("cov.npy"))?;
        check(&sound, &damages, mocks("mocks.npy"))?;
    }

    #[test]
    fn fits(
        damages in prop::collection::vec(damage(), 1..6),
        name in prop::sample::select(vec!["primary", "extension", "after-a-table", "single", "compressed", "empty"]),
    ) {
        let sound = array(&format!("{name}.fits"));
        check(&sound, &damages, covariance("cov.fits"))?;
        check(&sound, &damages, mocks("mocks.fits"))?;
    }
}

/// The undamaged files are sound, so that damage is what the tests above are about.
#[test]
fn what_is_damaged_was_sound() {
    MultipoleTable::parse("table.csv", TABLE, &BTreeMap::new()).unwrap();
    CovarianceRows::parse("rows.csv", TABLE, &BTreeMap::new()).unwrap();
    covariance("cov.csv")(MATRIX).unwrap();
    covariance("cov.npy")(&array("version-2.npy")).unwrap();
    covariance("cov.fits")(&array("after-a-table.fits")).unwrap();
    mocks("mocks.npy")(&array("mocks.npy")).unwrap();
}
