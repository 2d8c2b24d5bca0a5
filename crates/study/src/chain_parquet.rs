//! A chain as a Parquet file: the table of `chain.csv`, column by column, with units and descriptions.

use oddwell_sampler::Chain;
use parquet::basic::{Encoding, Repetition, Type as PhysicalType};
use parquet::data_type::{DoubleType, Int64Type};
use parquet::errors::ParquetError;
use parquet::file::metadata::KeyValue;
use parquet::file::properties::WriterProperties;
use parquet::file::writer::{SerializedFileWriter, SerializedRowGroupWriter};
use parquet::schema::types::Type;
use std::collections::BTreeMap;
use std::io::{self, Write};
use std::sync::Arc;

/// Key of the units in the file's metadata: a JSON object from column to unit, where a column has one.
pub const UNITS_KEY: &str = "oddwell.units";
/// Key of the descriptions: a JSON object from column to words.
pub const DESCRIPTIONS_KEY: &str = "oddwell.descriptions";

/// Columns in front of the parameters that count something.
const COUNTS: [&str; 3] = ["ensemble", "walker", "step"];
/// Columns in front of the parameters that measure something.
const LOGARITHMS: [&str; 2] = ["log_prior", "log_likelihood"];

/// Writes the draws under the names of `chain.csv`, every number with all its bits. A derived quantity that is not finite
/// is null. One group of rows, plain encoding, no compression: so any reader can read it.
pub(crate) fn write_parquet(
    out: impl Write + Send,
    names: &[String],
    chain: &Chain,
    (derived, columns): (&[String], &[Vec<f64>]),
    units: &BTreeMap<String, String>,
) -> io::Result<()> {
    write(out, names, chain, (derived, columns), units).map_err(io::Error::other)
}

fn write(
    out: impl Write + Send,
    names: &[String],
    chain: &Chain,
    (derived, columns): (&[String], &[Vec<f64>]),
    units: &BTreeMap<String, String>,
) -> Result<(), ParquetError> {
    let field = |name: &str, kind, repetition| -> Result<Arc<Type>, ParquetError> {
        Ok(Arc::new(Type::primitive_type_builder(name, kind).with_repetition(repetition).build()?))
    };
    let mut fields = Vec::new();
    for name in COUNTS {
        fields.push(field(name, PhysicalType::INT64, Repetition::REQUIRED)?);
    }
    for name in LOGARITHMS.into_iter().chain(names.iter().map(String::as_str)) {
        fields.push(field(name, PhysicalType::DOUBLE, Repetition::REQUIRED)?);
    }
    for name in derived {
        fields.push(field(name, PhysicalType::DOUBLE, Repetition::OPTIONAL)?);
    }
    let described: Vec<&str> =
        COUNTS.into_iter().chain(LOGARITHMS).chain(names.iter().chain(derived).map(String::as_str)).collect();
    let descriptions: BTreeMap<&str, String> =
        described.iter().map(|name| (*name, description_of(name))).collect();
    let json =
        |value: serde_json::Result<String>| value.map_err(|error| ParquetError::External(Box::new(error)));
    let metadata = vec![
        KeyValue::new(UNITS_KEY.to_owned(), json(serde_json::to_string(units))?),
        KeyValue::new(DESCRIPTIONS_KEY.to_owned(), json(serde_json::to_string(&descriptions))?),
    ];
    let properties = WriterProperties::builder()
        .set_created_by(concat!("oddwell version ", env!("CARGO_PKG_VERSION")).to_owned())
        .set_dictionary_enabled(false)
        .set_encoding(Encoding::PLAIN)
        .set_key_value_metadata(Some(metadata));
    let schema = Type::group_type_builder("chain").with_fields(fields).build()?;
    let mut file = SerializedFileWriter::new(out, Arc::new(schema), Arc::new(properties.build()))?;
    let mut group = file.next_row_group()?;
    let count = |value: u64| i64::try_from(value).unwrap_or(i64::MAX);
    write_counts(&mut group, chain.draws().map(|draw| count(draw.ensemble as u64)))?;
    write_counts(&mut group, chain.draws().map(|draw| count(draw.walker as u64)))?;
    write_counts(&mut group, chain.draws().map(|draw| count(draw.step)))?;
    write_numbers(&mut group, &chain.log_prior, false)?;
    write_numbers(&mut group, &chain.log_likelihood, false)?;
    for parameter in 0..names.len() {
        write_numbers(&mut group, &chain.column(parameter), false)?;
    }
    for column in columns {
        write_numbers(&mut group, column, true)?;
    }
    group.close()?;
    file.close()?;
    Ok(())
}

fn write_counts<W: Write + Send>(
    group: &mut SerializedRowGroupWriter<'_, W>,
    values: impl Iterator<Item = i64>,
) -> Result<(), ParquetError> {
    let values: Vec<i64> = values.collect();
    if let Some(mut column) = group.next_column()? {
        column.typed::<Int64Type>().write_batch(&values, None, None)?;
        column.close()?;
    }
    Ok(())
}

fn write_numbers<W: Write + Send>(
    group: &mut SerializedRowGroupWriter<'_, W>,
    values: &[f64],
    optional: bool,
) -> Result<(), ParquetError> {
    if let Some(mut column) = group.next_column()? {
        if optional {
            let there: Vec<f64> = values.iter().copied().filter(|value| value.is_finite()).collect();
            let levels: Vec<i16> = values.iter().map(|value| i16::from(value.is_finite())).collect();
            column.typed::<DoubleType>().write_batch(&there, Some(&levels), None)?;
        } else {
            column.typed::<DoubleType>().write_batch(values, None, None)?;
        }
        column.close()?;
    }
    Ok(())
}

/// What a column of a chain is, in words.
#[must_use]
pub fn description_of(name: &str) -> String {
    let fixed = match name {
        "ensemble" => "independent ensemble of walkers, from 0",
        "walker" => "walker within the ensemble, from 0",
        "step" => "step of the walker, warm-up counted",
        "log_prior" => "natural logarithm of the prior density",
        "log_likelihood" => "natural logarithm of the likelihood, constants included",
        _ => "",
    };
    if !fixed.is_empty() {
        return fixed.to_owned();
    }
    if let Some(bin) = name.strip_prefix("derived.clock_contrast.") {
        return format!("rms difference of the rates of clocks in {bin}, for clocks `clock_distance` apart");
    }
    if let Some(systematic) = name.strip_prefix("systematic.") {
        return format!("amplitude of the systematic {systematic}");
    }
    if let Some(parameter) = name.strip_prefix("departure.") {
        return format!("the departure's parameter {parameter}");
    }
    let (place, last) = name.rsplit_once('.').unwrap_or(("", name));
    let what = match last {
        "bias" => "linear bias b",
        "magnification" => "magnification bias s",
        "evolution" => "evolution bias e at fixed luminosity threshold",
        "bias_slope" => "dln b/dln a",
        "offset" => "redshift offset, second tracer less first",
        "growth_rate" => "growth rate f",
        "growth_slope" => "df/dln a",
        "growth_index" => "growth index: f = Ωm(a) to its power",
        "damping" => "damping length of the spectrum",
        "smearing" => "smearing length of the acoustic peak",
        other => other,
    };
    format!("{what} of {place}")
}

#[cfg(test)]
#[allow(clippy::unwrap_used, reason = "a test stops at the first surprise")]
mod tests {
    use super::*;

    #[test]
    fn every_kind_of_column_is_described() {
        for (name, expected) in [
            ("step", "step of the walker, warm-up counted"),
            ("larkfield.near.first.bias", "linear bias b of larkfield.near.first"),
            ("systematic.dust", "amplitude of the systematic dust"),
            ("departure.tau", "the departure's parameter tau"),
            ("background.sigma8", "sigma8 of background"),
        ] {
            assert_eq!(description_of(name), expected);
        }
    }
}
