//! The window of a survey: measured row = Σ window · prediction at rows of its own.

use super::matrix_file::read_matrix;
use crate::checksum::{InputHashes, file_sha256};
use crate::file::SurveySection;
use crate::nearest::Nearest;
use crate::resolve::Study;
use crate::run_error::RunError;
use nalgebra::DMatrix;
use oddwell_likelihood::{MultipoleTable, read_covariance_rows};
use oddwell_model::{Pair, Row, Space};
use std::collections::BTreeMap;
use std::path::Path;

/// The bin of a predicted row that a restriction leaves out.
const LEFT_OUT: usize = usize::MAX;

/// A survey's window, cut to the rows that are kept and to the columns that they need.
#[derive(Clone, Debug, PartialEq)]
pub struct SurveyWindow {
    /// Kept measured rows × predicted rows.
    pub matrix: DMatrix<f64>,
    /// The predicted rows, in Mpc/h.
    pub rows: Vec<Row>,
}

/// The error that a file of a window is wrong.
fn fail<T>(
    file: &str,
    at: String,
    rule: impl Into<String>,
    value: impl Into<String>,
    way_out: impl Into<String>,
) -> Result<T, RunError> {
    let file = file.to_owned();
    Err(RunError::Window { file, at, rule: rule.into(), value: value.into(), way_out: way_out.into() })
}

/// Reads the window of a survey, if it has one. `table` holds all rows of the survey, `kept` the positions of those that
/// `keep` leaves; `first_bin` is the survey's first bin among the study's. `h` is given where the survey's files are in
/// Mpc: separations are then multiplied by it, wavenumbers divided, and an entry of the matrix from a spectrum to a
/// correlation function by h⁻³ (the reverse by h³), which is the unit of what it multiplies.
///
/// # Errors
/// [`RunError::Data`] and [`RunError::Window`]: a file that can't be read, a matrix that has not a line for each row of the
/// table and a column for each row of `window_rows`, an entry that isn't finite, a line of zeros, a row of an unknown bin,
/// edges in the wrong order.
pub(super) fn read_window(
    study: &Study,
    section: &SurveySection,
    (table, kept): (&MultipoleTable, &[usize]),
    first_bin: usize,
    h: Option<f64>,
    columns: &BTreeMap<String, String>,
    inputs: &mut InputHashes,
) -> Result<Option<SurveyWindow>, RunError> {
    let (Some(matrix), Some(rows)) = (&section.window, &section.window_rows) else { return Ok(None) };
    let matrix_path = study.file.path_of(&matrix.value);
    let rows_path = study.file.path_of(&rows.value);
    let rows = read_rows(&rows_path, section, first_bin, columns)?;
    inputs.add(&rows_path, file_sha256(&rows_path));
    let matrix = read_matrix(&matrix_path)?;
    inputs.add(&matrix_path, file_sha256(&matrix_path));
    let file = matrix_path.display().to_string();
    if matrix.shape() != (table.len(), rows.len()) {
        let rule = format!(
            "must have {} lines, one for each row of {}, and {} columns, one for each row of {}",
            table.len(),
            table.file,
            rows.len(),
            rows_path.display()
        );
        let (lines, columns) = matrix.shape();
        let way_out = if (columns, lines) == (table.len(), rows.len()) {
            "transpose it"
        } else {
            "give the window of all rows of the table, in the table's order, whatever `keep` cuts"
        };
        return fail(&file, String::new(), rule, format!("{lines} and {columns}"), way_out);
    }
    let empty = kept.iter().find(|&&line| matrix.row(line).iter().all(|entry| *entry == 0.0));
    if let Some(&line) = empty {
        let at = format!(", matrix line {}", line + 1);
        let rule = "must have an entry other than 0 for a row that is kept";
        return fail(&file, at, rule, "zeros only", "correct the line, or cut that row with `keep`");
    }
    let kept_lines = matrix.select_rows(kept);
    let needed: Vec<usize> = (0..rows.len())
        .filter(|&column| kept_lines.column(column).iter().any(|entry| *entry != 0.0))
        .collect();
    if let Some(&column) = needed.iter().find(|&&column| rows[column].bin == LEFT_OUT) {
        let at = format!(", matrix column {}", column + 1);
        let rule = "must be 0 for rows that are kept where it predicts a bin that is left out";
        return fail(&file, at, rule, "another number", "leave that bin in, or these rows out");
    }
    let mut matrix = kept_lines.select_columns(&needed);
    let mut rows: Vec<Row> = needed.iter().map(|&column| rows[column]).collect();
    if let Some(h) = h {
        convert(&mut matrix, &mut rows, table, kept, h);
    }
    Ok(Some(SurveyWindow { matrix, rows }))
}

/// From Mpc to Mpc/h.
fn convert(matrix: &mut DMatrix<f64>, rows: &mut [Row], table: &MultipoleTable, kept: &[usize], h: f64) {
    let measured = table.value_factors(h);
    for (column, row) in rows.iter_mut().enumerate() {
        let (length, predicted) = match row.space {
            Space::Separation => (h, 1.0),
            Space::Fourier => (1.0 / h, h.powi(3)),
        };
        row.at *= length;
        row.edges = row.edges.map(|(low, high)| (low * length, high * length));
        for (line, &position) in kept.iter().enumerate() {
            matrix[(line, column)] *= measured[position] / predicted;
        }
    }
}

/// Reads `window_rows`: the columns `bin`, `multipole`, `separation` or `wavenumber`, optionally `pair`, and `low` and
/// `high`, the shell that the prediction is averaged over.
fn read_rows(
    path: &Path,
    section: &SurveySection,
    first_bin: usize,
    columns: &BTreeMap<String, String>,
) -> Result<Vec<Row>, RunError> {
    // The rows of a covariance are named in the same way: this checks every field that both have.
    read_covariance_rows(path, columns)?;
    let file = path.display().to_string();
    let text = std::fs::read_to_string(path)
        .or_else(|error| fail(&file, String::new(), "must be readable", error.to_string(), "try again"))?;
    let text = text.strip_prefix('\u{feff}').unwrap_or(&text).replace("\r\n", "\n").replace('\r', "\n");
    let lines = (1..).zip(text.split('\n'));
    let mut lines = lines.filter(|(_, line)| !line.trim().is_empty() && !line.trim_start().starts_with('#'));
    let header = lines.next().map(|(_, line)| fields(line)).unwrap_or_default();
    let place = |ours: &str| {
        let theirs = columns.get(ours).map_or(ours, String::as_str);
        header.iter().position(|name| name == theirs)
    };
    let places = ["bin", "pair", "multipole", "separation", "wavenumber", "low", "high"].map(place);
    let mut rows = Vec::new();
    for (line, text) in lines {
        let fields = fields(text);
        let [bin, pair, multipole, separation, wavenumber, low, high] =
            places.map(|place| place.and_then(|place| fields.get(place)).map_or("", String::as_str));
        let (space, at) = if separation.is_empty() {
            (Space::Fourier, wavenumber)
        } else {
            (Space::Separation, separation)
        };
        let at: f64 = at.parse().unwrap_or(f64::NAN);
        rows.push(Row {
            bin: match section.left_out.iter().any(|name| name == bin) {
                true => LEFT_OUT,
                false => first_bin + position_of_bin(&file, line, bin, section)?,
            },
            pair: Pair::parse(pair).unwrap_or(Pair::FirstSecond),
            multipole: multipole.parse::<f64>().unwrap_or(f64::NAN) as u8,
            space,
            at,
            edges: read_edges(&file, line, at, low, high)?,
        });
    }
    Ok(rows)
}

fn fields(line: &str) -> Vec<String> {
    let reader =
        csv::ReaderBuilder::new().has_headers(false).trim(csv::Trim::All).from_reader(line.as_bytes());
    let record = reader.into_records().next().and_then(Result::ok).unwrap_or_default();
    record.iter().map(str::to_owned).collect()
}

fn position_of_bin(file: &str, line: u64, bin: &str, section: &SurveySection) -> Result<usize, RunError> {
    let names = || section.bins.iter().map(|bin| bin.name.value.as_str());
    if let Some(position) = names().position(|name| name == bin) {
        return Ok(position);
    }
    let rule = format!("must be a [[survey.bin]] of `{}`", section.name.value);
    fail(
        file,
        format!(", line {line}, column `bin`"),
        rule,
        format!("`{bin}`"),
        Nearest::find(bin, names()).to_string(),
    )
}

fn read_edges(file: &str, line: u64, at: f64, low: &str, high: &str) -> Result<Option<(f64, f64)>, RunError> {
    if low.is_empty() && high.is_empty() {
        return Ok(None);
    }
    if let (Ok(from), Ok(to)) = (low.parse::<f64>(), high.parse::<f64>())
        && from >= 0.0
        && from < to
        && to.is_finite()
        && (from..=to).contains(&at)
    {
        return Ok(Some((from, to)));
    }
    let rule = format!("must have `low` and `high` with 0 <= low < high around {at}, or neither");
    let value = format!("`{low}` and `{high}`");
    fail(file, format!(", line {line}"), rule, value, "correct the two")
}
