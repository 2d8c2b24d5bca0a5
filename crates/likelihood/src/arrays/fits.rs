//! Images of FITS files.

use fitsio_pure::block::padded_byte_len;
use fitsio_pure::hdu::{Hdu, HduInfo};
use fitsio_pure::header::{Card, header_byte_len, parse_header_blocks};
use fitsio_pure::image::read_image_physical;
use fitsio_pure::value::Value;
use nalgebra::DMatrix;

use super::{ArrayError, ArrayFormat, row_names, two_dimensions};
use crate::error::DataError;

/// The first image of the file, in the primary unit or in an extension, of 32- or 64-bit floating-point numbers; NAXIS1
/// counts columns. Scaled by BSCALE and BZERO where given. Compressed images and integers are refused.
#[derive(Debug)]
pub(super) struct Fits;

impl ArrayFormat for Fits {
    fn name(&self) -> &'static str {
        "fits"
    }

    fn extensions(&self) -> &'static [&'static str] {
        &["fits", "fit"]
    }

    fn summary(&self) -> &'static str {
        "the first FITS image of 32- or 64-bit floating-point numbers, primary or extension, not compressed"
    }

    fn numbers(
        &self,
        file: &str,
        bytes: &[u8],
        rule: &dyn Fn(usize, usize) -> Result<(), DataError>,
    ) -> Result<(DMatrix<f64>, Vec<String>), DataError> {
        let (image, shape, bits) = first_image(file, bytes)?;
        let shape: Vec<usize> = shape.into_iter().rev().collect();
        let (lines, columns) = two_dimensions(file, &shape)?;
        if bits != -32 && bits != -64 {
            let found = format!("BITPIX = {bits}");
            return Err(ArrayError::ElementType { file: file.to_owned(), found }.into());
        }
        rule(lines, columns)?;
        let numbers = read_image_physical(bytes, &image).map_err(|error| malformed(file, error))?;
        if numbers.len() != lines * columns {
            return Err(malformed(file, "not as many numbers as its axes announce"));
        }
        Ok((DMatrix::from_row_slice(lines, columns, &numbers), row_names(lines)))
    }
}

fn malformed(file: &str, reason: impl ToString) -> DataError {
    ArrayError::Malformed { file: file.to_owned(), format: "fits", reason: reason.to_string() }.into()
}

/// The first unit with an image, its axes (fastest first) and BITPIX.
///
/// Walks from header to header by the crate's own functions rather than by its reader of whole files, which reserves
/// memory for as many axes as a header claims.
fn first_image(file: &str, bytes: &[u8]) -> Result<(Hdu, Vec<usize>, i64), DataError> {
    let mut start = 0;
    let mut passed: Vec<&str> = Vec::new();
    while start < bytes.len() {
        let rest = &bytes[start..];
        let header = header_byte_len(rest).and_then(|length| Ok((length, parse_header_blocks(rest)?)));
        let (length, cards) = match header {
            Ok(header) => header,
            // What follows the last unit may be anything.
            Err(_) if !passed.is_empty() => break,
            Err(error) => return Err(malformed(file, error)),
        };
        let data = start + length;
        let announced = data_length(&cards).map_err(|reason| malformed(file, reason))?;
        let found = bytes.len().saturating_sub(data);
        if announced > found as u64 {
            return Err(ArrayError::Truncated { file: file.to_owned(), announced, found }.into());
        }
        let unit = Hdu::from_cards(cards, start, data).map_err(|error| malformed(file, error))?;
        let what = match &unit.info {
            HduInfo::Primary { naxes, .. } if naxes.is_empty() => "an empty primary unit",
            HduInfo::Image { naxes, .. } if naxes.is_empty() => "an empty image",
            HduInfo::Primary { bitpix, naxes } | HduInfo::Image { bitpix, naxes } => {
                let (bits, axes) = (*bitpix, naxes.clone());
                return Ok((unit, axes, bits));
            }
            HduInfo::CompressedImage { .. } => "a compressed image",
            _ => "a table",
        };
        passed.push(what);
        start = data + padded_byte_len(announced as usize);
    }
    Err(ArrayError::NoImage { file: file.to_owned(), found: passed.join(", ") }.into())
}

/// Bytes of the numbers that follow a header, from keywords that are sane enough for the crate to go on with.
fn data_length(cards: &[Card]) -> Result<u64, &'static str> {
    let integer = |keyword: &str| {
        cards.iter().find(|card| card.keyword_str() == keyword).and_then(|card| match card.value {
            Some(Value::Integer(value)) => Some(value),
            _ => None,
        })
    };
    let count = |keyword: &str, default: Option<u64>| match integer(keyword) {
        Some(value) => u64::try_from(value).ok(),
        None => default,
    };
    let bits = integer("BITPIX").ok_or("it has no BITPIX")?;
    if ![8, 16, 32, 64, -32, -64].contains(&bits) {
        return Err("its BITPIX is none of 8, 16, 32, 64, -32 and -64");
    }
    let axes = count("NAXIS", None).filter(|axes| *axes <= 999).ok_or("its NAXIS is not within 0 and 999")?;
    if count("ZNAXIS", Some(0)).is_none_or(|axes| axes > 999) {
        return Err("its ZNAXIS is not within 0 and 999");
    }
    if axes == 0 {
        return Ok(0);
    }
    let mut numbers = 1_u64;
    for axis in 1..=axes {
        let length =
            count(&format!("NAXIS{axis}"), None).ok_or("the length of an axis is missing or negative")?;
        numbers = numbers.checked_mul(length).ok_or("its axes announce more numbers than can be counted")?;
    }
    let parameters = count("PCOUNT", Some(0)).ok_or("its PCOUNT is negative")?;
    let groups = count("GCOUNT", Some(1)).ok_or("its GCOUNT is negative")?;
    let random_groups = cards.iter().any(|card| card.keyword_str() == "GROUPS");
    if random_groups {
        return Err("it holds random groups, not an image");
    }
    // As the crate counts: parameters are bytes, no groups stand for one.
    let size = bits.unsigned_abs() / 8;
    let bytes = numbers.checked_mul(size).and_then(|bytes| bytes.checked_add(parameters));
    let bytes = bytes.and_then(|bytes| bytes.checked_mul(groups.max(1)));
    bytes.filter(|bytes| *bytes < 1 << 62).ok_or("its axes announce more numbers than can be counted")
}
