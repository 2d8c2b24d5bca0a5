//! Text as wide as a page: wrapping, and tables in aligned columns.

use unicode_width::UnicodeWidthStr;

/// Columns that nothing exceeds, names apart that are longer themselves.
pub(crate) const PAGE: usize = 100;

/// Breaks a paragraph into lines of at most [`PAGE`] columns: the first begins with `first`, the others with as many
/// spaces as `hang`. A word wider than the page stands on a line of its own.
pub(crate) fn wrapped(first: &str, hang: usize, text: &str) -> String {
    let mut out = String::from(first);
    let mut column = first.width();
    let mut fresh = true;
    for word in text.split_whitespace() {
        if !fresh && column + 1 + word.width() > PAGE {
            out.push('\n');
            out.push_str(&" ".repeat(hang));
            column = hang;
            fresh = true;
        }
        if !fresh {
            out.push(' ');
            column += 1;
        }
        out.push_str(word);
        column += word.width();
        fresh = false;
    }
    out.push('\n');
    out
}

/// The text with spaces behind it, up to a width.
pub(crate) fn padded(text: &str, width: usize) -> String {
    format!("{text}{}", " ".repeat(width.saturating_sub(text.width())))
}

/// Rows of cells: the first column to the left, the others to the right.
pub(crate) struct Table {
    rows: Vec<Vec<String>>,
}

impl Table {
    /// A table with this header.
    pub(crate) fn new(header: &[&str]) -> Self {
        Self { rows: vec![header.iter().map(|&cell| cell.to_owned()).collect()] }
    }

    /// Adds a row; it must have as many cells as the header.
    pub(crate) fn row(&mut self, cells: Vec<String>) {
        debug_assert_eq!(cells.len(), self.rows[0].len(), "a row has as many cells as the header");
        self.rows.push(cells);
    }

    /// The table, every line after two spaces; `heading` dresses the header. A name that would push the numbers off the
    /// page stands on a line of its own, above them.
    pub(crate) fn render(&self, heading: impl Fn(&str) -> String) -> String {
        let column =
            |index: usize| self.rows.iter().map(move |row| row.get(index).map_or(0, |cell| cell.width()));
        let widths: Vec<usize> =
            (1..self.rows[0].len()).map(|index| column(index).max().unwrap_or(0)).collect();
        let numbers: usize = widths.iter().map(|width| width + 3).sum();
        let room = PAGE.saturating_sub(2 + numbers);
        let names = column(0).filter(|&width| width <= room).max().unwrap_or(0);
        let mut out = String::new();
        for (index, row) in self.rows.iter().enumerate() {
            let mut line = String::from("  ");
            let name = row.first().map_or("", String::as_str);
            line.push_str(name);
            if name.width() > names {
                line.push_str("\n  ");
                line.push_str(&" ".repeat(names));
            } else {
                line.push_str(&" ".repeat(names - name.width()));
            }
            for (cell, width) in row.iter().skip(1).zip(&widths) {
                line.push_str(&" ".repeat(3 + width - cell.width()));
                line.push_str(cell);
            }
            let line = line.trim_end();
            out.push_str(&if index == 0 { heading(line) } else { line.to_owned() });
            out.push('\n');
        }
        out
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn paragraphs_stay_on_the_page() {
        let text = "word ".repeat(50);
        let lines = wrapped("- ", 2, &text);
        assert_eq!(lines.lines().count(), 3);
        assert!(lines.lines().all(|line| line.width() <= PAGE));
        assert!(
            lines.starts_with("- word word") && lines.lines().skip(1).all(|line| line.starts_with("  word"))
        );
    }

    #[test]
    fn a_combining_hat_takes_no_column() {
        let mut table = Table::new(&["", "R̂"]);
        table.row(vec!["a".to_owned(), "1.004".to_owned()]);
        assert_eq!(table.render(str::to_owned), "          R̂\n  a   1.004\n");
    }

    #[test]
    fn a_name_too_long_for_the_page_stands_above_its_numbers() {
        let mut table = Table::new(&["name", "mean"]);
        let long = "n".repeat(95);
        table.row(vec![long.clone(), "1.0".to_owned()]);
        table.row(vec!["short".to_owned(), "2.0".to_owned()]);
        assert_eq!(
            table.render(str::to_owned),
            format!("  name    mean\n  {long}\n           1.0\n  short    2.0\n")
        );
    }
}
