//! `chain.parquet` is `chain.csv`: the same columns, and every number with all its bits.

#![allow(
    clippy::unwrap_used,
    clippy::panic,
    clippy::print_stderr,
    reason = "a test stops at the first surprise"
)]

use oddwell_study::review::ChainTable;
use oddwell_study::{Control, DESCRIPTIONS_KEY, FitOptions, Study, UNITS_KEY, fit};
use parquet::file::reader::{FileReader, SerializedFileReader};
use parquet::record::Field;
use serde_json::Value;
use std::fs::File;
use std::path::Path;
use std::process::Command;

#[test]
fn parquet_and_csv_hold_the_same_draws() {
    let study =
        Study::read(Path::new(env!("CARGO_MANIFEST_DIR")).join("../data-demo/study.toml"), &[]).unwrap();
    let folder = tempfile::tempdir().unwrap();
    let out = folder.path().join("run");
    let options = FitOptions {
        out: out.clone(),
        existing: oddwell_study::Existing::Refuse,
        seed: None,
        maximum_evaluations: Some(20_000),
        command: Vec::new(),
        threads: 2,
    };
    fit(&study, study.hypothesis(Some("constant")).unwrap(), &options, &mut |_, _| Control::Continue)
        .unwrap();
    let text = ChainTable::read(&out).unwrap();
    let file = SerializedFileReader::new(File::open(out.join("chain.parquet")).unwrap()).unwrap();
    let schema = file.metadata().file_metadata().schema_descr();
    let names: Vec<&str> = schema.columns().iter().map(|column| column.name()).collect();
    assert_eq!(names[..5], ["ensemble", "walker", "step", "log_prior", "log_likelihood"]);
    assert_eq!(names[5..], text.names);
    let mut rows = 0;
    for (row, record) in file.get_row_iter(None).unwrap().enumerate() {
        let fields: Vec<Field> = record.unwrap().into_columns().into_iter().map(|(_, field)| field).collect();
        let counts = [text.ensemble[row], text.walker[row], text.step[row]];
        for (field, count) in fields.iter().zip(counts) {
            assert_eq!(*field, Field::Long(count as i64));
        }
        let front = [text.log_prior[row], text.log_likelihood[row]];
        let numbers = front.into_iter().chain(text.columns.iter().map(|column| column[row]));
        for ((field, number), name) in fields[3..].iter().zip(numbers).zip(&names[3..]) {
            match field {
                Field::Double(found) => assert_eq!(found.to_bits(), number.to_bits(), "{name}, row {row}"),
                Field::Null => assert!(number.is_nan(), "{name}, row {row}"),
                other => panic!("{name} is {other}"),
            }
        }
        rows += 1;
    }
    assert_eq!(rows, text.len());
    let metadata = file.metadata().file_metadata().key_value_metadata().unwrap();
    let of = |key: &str| -> Value {
        let entry = metadata.iter().find(|entry| entry.key == key).unwrap();
        serde_json::from_str(entry.value.as_ref().unwrap()).unwrap()
    };
    assert_eq!(of(UNITS_KEY)["larkfield.near.offset"], "km/s");
    assert_eq!(of(DESCRIPTIONS_KEY).as_object().unwrap().len(), names.len());
    // The optional part: a library that is not ours.
    let Some(python) = std::env::var_os("ODDWELL_PYTHON") else {
        eprintln!("not read by polars: set ODDWELL_PYTHON to a Python that has it");
        return;
    };
    let script = Path::new(env!("CARGO_MANIFEST_DIR")).join("python/parquet_equals_csv.py");
    let said = Command::new(python).arg(script).arg(&out).output().unwrap();
    assert!(said.status.success(), "{}", String::from_utf8_lossy(&said.stderr));
    let compared: usize = String::from_utf8_lossy(&said.stdout).trim().parse().unwrap();
    assert_eq!(compared, rows * names.len());
}
