//! A run's `chain.csv` read back.

use crate::run_error::RunError;
use std::path::Path;

/// The draws of a run, as `chain.csv` has them.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct ChainTable {
    /// The names of the columns behind `log_likelihood`: parameters, then derived quantities.
    pub names: Vec<String>,
    /// Ensemble of each draw.
    pub ensemble: Vec<u64>,
    /// Walker of each draw.
    pub walker: Vec<u64>,
    /// Step of each draw.
    pub step: Vec<u64>,
    /// Log prior of each draw.
    pub log_prior: Vec<f64>,
    /// Log likelihood of each draw.
    pub log_likelihood: Vec<f64>,
    /// By column, a number a draw; what is empty in the file is not a number here.
    pub columns: Vec<Vec<f64>>,
}

/// The columns in front of the parameters.
const FRONT: [&str; 5] = ["ensemble", "walker", "step", "log_prior", "log_likelihood"];

impl ChainTable {
    /// Reads `chain.csv` of a run directory.
    ///
    /// # Errors
    /// [`RunError::UnreadableRun`] where it is not there, has other columns in front, or holds what is no number.
    pub fn read(directory: &Path) -> Result<ChainTable, RunError> {
        let path = directory.join("chain.csv");
        let unreadable = |reason: String| RunError::UnreadableRun { path: path.clone(), reason };
        let mut reader = csv::Reader::from_path(&path).map_err(|error| unreadable(error.to_string()))?;
        let header = reader.headers().map_err(|error| unreadable(error.to_string()))?.clone();
        if !header.iter().take(FRONT.len()).eq(FRONT) {
            return Err(unreadable(format!("its columns must begin with {}", FRONT.join(", "))));
        }
        let names: Vec<String> = header.iter().skip(FRONT.len()).map(str::to_owned).collect();
        let mut table = ChainTable { columns: vec![Vec::new(); names.len()], names, ..Self::default() };
        let mut record = csv::StringRecord::new();
        while reader.read_record(&mut record).map_err(|error| unreadable(error.to_string()))? {
            let line = record.position().map_or(0, csv::Position::line);
            let at = |column: usize| record.get(column).unwrap_or_default();
            let wrong = |column: usize| unreadable(format!("line {line}: `{}` is no number", at(column)));
            let whole = |column: usize| at(column).parse::<u64>().map_err(|_| wrong(column));
            let real = |column: usize| match at(column) {
                "" => Ok(f64::NAN),
                text => text.parse::<f64>().map_err(|_| wrong(column)),
            };
            table.ensemble.push(whole(0)?);
            table.walker.push(whole(1)?);
            table.step.push(whole(2)?);
            table.log_prior.push(real(3)?);
            table.log_likelihood.push(real(4)?);
            for (index, column) in table.columns.iter_mut().enumerate() {
                column.push(real(FRONT.len() + index)?);
            }
        }
        if table.is_empty() {
            return Err(unreadable("it has no draws".to_owned()));
        }
        Ok(table)
    }

    /// How many draws there are.
    #[must_use]
    pub fn len(&self) -> usize {
        self.step.len()
    }

    /// Whether there are none.
    #[must_use]
    pub fn is_empty(&self) -> bool {
        self.step.is_empty()
    }

    /// The draws of one quantity.
    #[must_use]
    pub fn column(&self, name: &str) -> Option<&[f64]> {
        let index = self.names.iter().position(|known| known == name)?;
        Some(&self.columns[index])
    }

    /// The draw of highest posterior density.
    #[must_use]
    pub fn highest(&self) -> usize {
        let height = |row: usize| self.log_prior[row] + self.log_likelihood[row];
        (0..self.len()).max_by(|&one, &other| height(one).total_cmp(&height(other))).unwrap_or(0)
    }

    /// Rows of at most `count` draws, evenly spread over the chain.
    #[must_use]
    pub fn spread(&self, count: usize) -> Vec<usize> {
        let count = count.min(self.len());
        // Middles of equal stretches, so that no ensemble's ends are preferred.
        (0..count).map(|index| (2 * index + 1) * self.len() / (2 * count)).collect()
    }
}

#[cfg(test)]
#[allow(clippy::unwrap_used, reason = "a test stops at the first surprise")]
mod tests {
    use super::*;

    fn read(text: &str) -> Result<ChainTable, RunError> {
        let folder = tempfile::tempdir().unwrap();
        std::fs::write(folder.path().join("chain.csv"), text).unwrap();
        ChainTable::read(folder.path())
    }

    #[test]
    fn draws_come_back_with_what_is_missing() {
        let table = read(
            "ensemble,walker,step,log_prior,log_likelihood,a.b,derived.c\n0,1,7,-1.5,-2.0,0.1,\n1,0,8,-1.0,-2.0,0.3,4.0\n",
        )
        .unwrap();
        assert_eq!((table.len(), table.highest(), &table.step[..]), (2, 1, &[7, 8][..]));
        assert_eq!(table.column("a.b"), Some(&[0.1, 0.3][..]));
        assert!(table.column("derived.c").unwrap()[0].is_nan());
        assert_eq!(table.column("c"), None);
    }

    #[test]
    fn what_is_no_chain_is_refused_with_its_place() {
        for (text, expected) in [
            ("walker,step\n0,1\n", "must begin with ensemble, walker"),
            ("ensemble,walker,step,log_prior,log_likelihood\n", "no draws"),
            ("ensemble,walker,step,log_prior,log_likelihood\n0,0,1,x,0\n", "line 2: `x` is no number"),
        ] {
            let message = read(text).unwrap_err().to_string();
            assert!(message.contains(expected), "{message}");
        }
    }

    #[test]
    fn spread_rows_are_even() {
        let mut table = ChainTable { step: vec![0; 10], ..ChainTable::default() };
        assert_eq!(table.spread(5), [1, 3, 5, 7, 9]);
        table.step.truncate(2);
        assert_eq!(table.spread(5), [0, 1]);
    }
}
