//! Reads the user's own matter power spectrum.

use crate::run_error::RunError;
use oddwell_cosmology::PowerTable;
use oddwell_likelihood::DataError;
use std::path::Path;

/// A CSV table with the columns `wavenumber` (h/Mpc, rising) and `power` ((Mpc/h)³ at redshift 0, any amplitude: it is
/// rescaled to σ8), among others perhaps. Blank lines and lines that begin with # count for nothing.
///
/// # Errors
/// [`DataError`] for a file that can't be read; [`RunError::PowerTable`] for a missing column and text in a number;
/// [`RunError::Power`] for what [`PowerTable::new`] refuses.
pub(super) fn read_power_table(path: &Path) -> Result<PowerTable, RunError> {
    let file = path.display().to_string();
    let fail = |line: u64, rule, value: String, way_out| {
        Err(RunError::PowerTable { file: file.clone(), at: format!(", line {line}"), rule, value, way_out })
    };
    let text = std::fs::read_to_string(path).map_err(|reason| match reason.kind() {
        std::io::ErrorKind::NotFound => DataError::Missing { file: file.clone() },
        _ => DataError::Unreadable { file: file.clone(), reason },
    })?;
    let lines = (1..).zip(text.strip_prefix('\u{feff}').unwrap_or(&text).lines());
    let mut lines = lines.filter(|(_, line)| !line.trim().is_empty() && !line.trim_start().starts_with('#'));
    let (first, header) = lines.next().unwrap_or((1, ""));
    let header: Vec<&str> = header.split(',').map(str::trim).collect();
    let column = |name: &str| header.iter().position(|field| *field == name);
    let (Some(wavenumber), Some(power)) = (column("wavenumber"), column("power")) else {
        let rule = "must have the columns `wavenumber` (h/Mpc) and `power` ((Mpc/h)³)";
        return fail(first, rule, format!("`{}`", header.join(",")), "name the columns so in the header");
    };
    let (mut wavenumbers, mut powers) = (Vec::new(), Vec::new());
    for (line, record) in lines {
        let fields: Vec<&str> = record.split(',').map(str::trim).collect();
        for (column, numbers) in [(wavenumber, &mut wavenumbers), (power, &mut powers)] {
            let text = fields.get(column).copied().unwrap_or_default();
            match text.parse::<f64>() {
                Ok(number) => numbers.push(number),
                Err(_) => return fail(line, "must hold numbers", format!("`{text}`"), "correct that entry"),
            }
        }
    }
    PowerTable::new(wavenumbers, powers).map_err(|source| RunError::Power { file, source })
}
