//! The prediction beside the measurements, as CSV and as JSON.

use oddwell_study::PredictedRow;
use serde_json::{Map, Value};

/// Which of the two arguments of a multipole the rows have.
struct Axes {
    separation: bool,
    wavenumber: bool,
}

impl Axes {
    fn of(rows: &[PredictedRow]) -> Self {
        let wavenumber = rows.iter().any(|row| row.wavenumber.is_some());
        // A table without rows keeps the usual header.
        let separation = !wavenumber || rows.iter().any(|row| row.separation.is_some());
        Self { separation, wavenumber }
    }
}

/// What each effect contributes to each row: a column's name, and a number a row.
pub type EffectColumns<'a> = &'a [(String, Vec<f64>)];

/// A line a row under the header `survey,bin,pair,multipole,separation,measured,error,predicted`; `wavenumber` stands for
/// `separation` in Fourier space, and both are there in a study of both. Separations in Mpc/h, wavenumbers in h/Mpc,
/// multipoles without unit or in (Mpc/h)³. Numbers have the fewest digits that give the same number when read back;
/// what a row does not have is empty. The columns of `effects`, if any, follow, and add up to `predicted`.
pub fn prediction_csv(rows: &[PredictedRow], effects: EffectColumns<'_>) -> String {
    let axes = Axes::of(rows);
    let mut out = String::from("survey,bin,pair,multipole");
    for (there, name) in [(axes.separation, ",separation"), (axes.wavenumber, ",wavenumber")] {
        if there {
            out.push_str(name);
        }
    }
    out.push_str(",measured,error,predicted");
    for (name, _) in effects {
        out.push(',');
        out.push_str(name);
    }
    out.push('\n');
    for (index, row) in rows.iter().enumerate() {
        let words = [&row.survey, &row.bin, &row.pair];
        let mut cells: Vec<String> = words.into_iter().map(|word| quoted(word)).collect();
        cells.push(row.multipole.to_string());
        for (there, at) in [(axes.separation, row.separation), (axes.wavenumber, row.wavenumber)] {
            if there {
                cells.push(at.map_or_else(String::new, number));
            }
        }
        cells.push(row.measured.map_or_else(String::new, number));
        cells.extend([row.error, row.predicted].map(number));
        cells.extend(effects.iter().map(|(_, column)| number(column[index])));
        out.push_str(&cells.join(","));
        out.push('\n');
    }
    out
}

/// The same as a list of objects, with the CSV's columns as keys; what a row does not have is null.
pub fn prediction_json(rows: &[PredictedRow], effects: EffectColumns<'_>) -> Value {
    let axes = Axes::of(rows);
    rows.iter()
        .enumerate()
        .map(|(index, row)| {
            let mut object = Map::new();
            object.insert("survey".to_owned(), row.survey.clone().into());
            object.insert("bin".to_owned(), row.bin.clone().into());
            object.insert("pair".to_owned(), row.pair.clone().into());
            object.insert("multipole".to_owned(), row.multipole.into());
            if axes.separation {
                object.insert("separation".to_owned(), row.separation.into());
            }
            if axes.wavenumber {
                object.insert("wavenumber".to_owned(), row.wavenumber.into());
            }
            object.insert("measured".to_owned(), row.measured.into());
            object.insert("error".to_owned(), row.error.into());
            object.insert("predicted".to_owned(), row.predicted.into());
            for (name, column) in effects {
                object.insert(name.clone(), column[index].into());
            }
            Value::Object(object)
        })
        .collect()
}

fn number(value: f64) -> String {
    if value.is_finite() { format!("{value:?}") } else { String::new() }
}

/// A cell of RFC 4180.
fn quoted(text: &str) -> String {
    if text.contains([',', '"', '\n', '\r']) {
        format!("\"{}\"", text.replace('"', "\"\""))
    } else {
        text.to_owned()
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn row(separation: Option<f64>, wavenumber: Option<f64>) -> PredictedRow {
        PredictedRow {
            survey: "larkfield".to_owned(),
            bin: "near".to_owned(),
            pair: "first-second".to_owned(),
            multipole: 1,
            separation,
            wavenumber,
            measured: Some(1.0 / 3.0),
            error: 2.5e-7,
            predicted: -0.001,
        }
    }

    #[test]
    fn separations_only() {
        assert_eq!(
            prediction_csv(&[row(Some(28.0), None)], &[]),
            "survey,bin,pair,multipole,separation,measured,error,predicted\n\
             larkfield,near,first-second,1,28.0,0.3333333333333333,2.5e-7,-0.001\n"
        );
    }

    #[test]
    fn wavenumbers_only() {
        assert_eq!(
            prediction_csv(&[row(None, Some(0.05))], &[]),
            "survey,bin,pair,multipole,wavenumber,measured,error,predicted\n\
             larkfield,near,first-second,1,0.05,0.3333333333333333,2.5e-7,-0.001\n"
        );
    }

    #[test]
    fn both_and_neither() {
        let both = prediction_csv(&[row(Some(28.0), None), row(None, Some(0.05))], &[]);
        assert_eq!(
            both,
            "survey,bin,pair,multipole,separation,wavenumber,measured,error,predicted\n\
             larkfield,near,first-second,1,28.0,,0.3333333333333333,2.5e-7,-0.001\n\
             larkfield,near,first-second,1,,0.05,0.3333333333333333,2.5e-7,-0.001\n"
        );
        assert_eq!(
            prediction_csv(&[], &[]),
            "survey,bin,pair,multipole,separation,measured,error,predicted\n"
        );
    }

    #[test]
    fn numbers_survive_the_round_trip_and_words_their_commas() {
        for value in [0.1 + 0.2, 1.234_567_890_123_456_7e-300, -9.007_199_254_740_993e15, 5e-324] {
            assert_eq!(number(value).parse::<f64>().ok(), Some(value));
        }
        assert_eq!(number(f64::NAN), "");
        assert_eq!(quoted("a,\"b\""), "\"a,\"\"b\"\"\"");
    }

    #[test]
    fn json_has_the_columns_of_the_csv() {
        let mut unknown = row(None, Some(0.05));
        unknown.error = f64::NAN;
        assert_eq!(
            prediction_json(&[unknown], &[]).to_string(),
            "[{\"survey\":\"larkfield\",\"bin\":\"near\",\"pair\":\"first-second\",\"multipole\":1,\"wavenumber\":0.05,\
             \"measured\":0.3333333333333333,\"error\":null,\"predicted\":-0.001}]"
        );
    }

    #[test]
    fn effects_follow_the_prediction() {
        let effects = [("doppler".to_owned(), vec![-0.0015]), ("offset".to_owned(), vec![0.0005])];
        assert_eq!(
            prediction_csv(&[row(Some(28.0), None)], &effects),
            "survey,bin,pair,multipole,separation,measured,error,predicted,doppler,offset\n\
             larkfield,near,first-second,1,28.0,0.3333333333333333,2.5e-7,-0.001,-0.0015,0.0005\n"
        );
        let json = prediction_json(&[row(Some(28.0), None)], &effects);
        assert_eq!((&json[0]["doppler"], &json[0]["offset"]), (&(-0.0015).into(), &0.0005.into()));
    }
}
