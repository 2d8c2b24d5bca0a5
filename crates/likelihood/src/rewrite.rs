//! The same table with other measured values: for synthetic and for blinded measurements.

use std::collections::BTreeMap;

/// The text of a table of multipoles with the value of some lines replaced; notes, other columns and other lines stay as
/// they are. `columns` maps our names to the file's headers as for [`crate::read_multipoles`], and `values` holds line
/// numbers (from 1) with their new values, written as the shortest text that reads back as the same number.
///
/// `None` where the text has no such column or a line has no such field: not for a table that `read_multipoles` took.
#[must_use]
pub fn with_values(text: &str, columns: &BTreeMap<String, String>, values: &[(u64, f64)]) -> Option<String> {
    let is_note = |line: &str| line.trim().is_empty() || line.trim_start().starts_with('#');
    let header = text.lines().find(|line| !is_note(line))?;
    let wanted = columns.get("value").map_or("value", String::as_str);
    let column = fields(header.trim_start_matches('\u{feff}'))?.iter().position(|field| field == wanted)?;
    let mut by_line: BTreeMap<u64, f64> = values.iter().copied().collect();
    let mut out = String::with_capacity(text.len());
    for (number, line) in (1..).zip(text.lines()) {
        match by_line.remove(&number) {
            None => out.push_str(line),
            Some(value) => {
                let mut fields = fields(line)?;
                *fields.get_mut(column)? = format!("{value:e}");
                out.push_str(&joined(&fields)?);
            }
        }
        out.push('\n');
    }
    by_line.is_empty().then_some(out)
}

fn fields(line: &str) -> Option<Vec<String>> {
    let mut reader =
        csv::ReaderBuilder::new().has_headers(false).trim(csv::Trim::All).from_reader(line.as_bytes());
    let record = reader.records().next()?.ok()?;
    Some(record.iter().map(str::to_owned).collect())
}

fn joined(fields: &[String]) -> Option<String> {
    let mut writer = csv::Writer::from_writer(Vec::new());
    writer.write_record(fields).ok()?;
    let line = String::from_utf8(writer.into_inner().ok()?).ok()?;
    Some(line.trim_end().to_owned())
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn only_the_asked_values_change() {
        let text = "# a note\nbin,ell,value,multipole\n\"a, b\",x,1.5,1\n# another\nc, y , 2.5e-3 ,3\n";
        let new = with_values(text, &BTreeMap::new(), &[(3, -0.1), (5, 1.0 / 3.0)]).unwrap();
        let expected =
            "# a note\nbin,ell,value,multipole\n\"a, b\",x,-1e-1,1\n# another\nc,y,3.333333333333333e-1,3\n";
        assert_eq!(new, expected);
        let back: f64 = "3.333333333333333e-1".parse().unwrap();
        assert!(back == 1.0 / 3.0 || (back - 1.0 / 3.0).abs() < 1e-16);
    }

    #[test]
    fn the_value_column_may_have_another_name() {
        let columns = BTreeMap::from([("value".to_owned(), "xi".to_owned())]);
        let new = with_values("value,xi\n1,2\n", &columns, &[(2, 5.0)]).unwrap();
        assert_eq!(new, "value,xi\n1,5e0\n");
    }

    #[test]
    fn a_line_that_is_not_there_is_refused() {
        assert_eq!(with_values("value\n1\n", &BTreeMap::new(), &[(7, 5.0)]), None);
        assert_eq!(with_values("xi\n1\n", &BTreeMap::new(), &[(2, 5.0)]), None);
    }
}
