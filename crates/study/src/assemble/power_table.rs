//! Reads the user's own matter power spectrum.

use crate::run_error::RunError;
use oddwell_cosmology::PowerTable;
use std::path::Path;

/// A CSV table with the columns `wavenumber` (h/Mpc, rising) and `power` ((Mpc/h)³ at redshift 0, any amplitude: it is
/// rescaled to σ8). Lines that begin with # are notes.
///
/// # Errors
/// [`RunError::PowerTable`] for a missing file or column, text in a number, and what [`PowerTable::new`] refuses.
pub(super) fn read_power_table(path: &Path) -> Result<PowerTable, RunError> {
    let file = path.display().to_string();
    let fail = |at: String, rule, value: String, way_out| {
        Err(RunError::PowerTable { file: file.clone(), at, rule, value, way_out })
    };
    let reader = csv::ReaderBuilder::new().comment(Some(b'#')).trim(csv::Trim::All).from_path(path);
    let mut reader = match reader {
        Ok(reader) => reader,
        Err(error) => {
            let way_out = "correct the path, which counts from the folder of the study file";
            return fail(String::new(), "must be a readable table", error.to_string(), way_out);
        }
    };
    let header = match reader.headers() {
        Ok(header) => header.clone(),
        Err(error) => {
            return fail(String::new(), "must be text", error.to_string(), "save it as CSV in UTF-8");
        }
    };
    let mut columns = [0; 2];
    for (name, column) in ["wavenumber", "power"].iter().zip(&mut columns) {
        match header.iter().position(|field| field == *name) {
            Some(position) => *column = position,
            None => {
                let found = header.iter().collect::<Vec<_>>().join(",");
                let rule = "must have the columns `wavenumber` (h/Mpc) and `power` ((Mpc/h)³)";
                return fail(
                    ", line 1".into(),
                    rule,
                    format!("`{found}`"),
                    "name the columns so in the header",
                );
            }
        }
    }
    let (mut wavenumbers, mut powers) = (Vec::new(), Vec::new());
    for record in reader.records() {
        let record = match record {
            Ok(record) => record,
            Err(error) => {
                return fail(String::new(), "must be a table", error.to_string(), "correct that line");
            }
        };
        let at = record.position().map_or_else(String::new, |place| format!(", line {}", place.line()));
        for (column, numbers) in columns.iter().zip([&mut wavenumbers, &mut powers]) {
            let text = record.get(*column).unwrap_or_default();
            match text.parse::<f64>() {
                Ok(number) => numbers.push(number),
                Err(_) => return fail(at, "must hold numbers", format!("`{text}`"), "correct that entry"),
            }
        }
    }
    PowerTable::new(wavenumbers, powers)
        .or_else(|error| fail(String::new(), "must be a spectrum", error.to_string(), "correct the table"))
}
