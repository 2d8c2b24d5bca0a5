//! NumPy's array files.

use nalgebra::DMatrix;
use ndarray::{Array2, ArrayD, Axis, Ix2};
use ndarray_npy::npy::header::Header;
use ndarray_npy::{ReadNpyError, ReadNpyExt, ReadableElement, WriteNpyExt};

use super::{ArrayError, ArrayFormat, row_names, two_dimensions};
use crate::error::DataError;

/// Bytes that a header may have: NumPy's own limit.
const LONGEST_HEADER: usize = 10_000;

/// Brackets that may be open at once in a header. A plain array's has two; the parser of the header needs time that
/// grows with a power of the depth, and stack in proportion to it.
const DEEPEST: usize = 4;

/// Versions 1 to 3, C or Fortran order, either byte order, `float64` or `float32`. Integers are refused: a covariance
/// saved as integers has lost its digits.
#[derive(Debug)]
pub(super) struct Npy;

impl ArrayFormat for Npy {
    fn name(&self) -> &'static str {
        "npy"
    }

    fn extensions(&self) -> &'static [&'static str] {
        &["npy"]
    }

    fn summary(&self) -> &'static str {
        "NumPy array of two dimensions, float64 or float32, C or Fortran order"
    }

    fn numbers(
        &self,
        file: &str,
        bytes: &[u8],
        rule: &dyn Fn(usize, usize) -> Result<(), DataError>,
    ) -> Result<(DMatrix<f64>, Vec<String>), DataError> {
        let malformed = |reason: String| malformed(file, reason);
        let start = check_header(bytes).map_err(|reason| malformed(reason.to_owned()))?;
        let header = Header::from_reader(&mut &bytes[..]).map_err(|error| malformed(error.to_string()))?;
        let descriptor = header.type_descriptor.to_string();
        let size: u64 = match descriptor.trim_matches('\'') {
            "<f8" | ">f8" | "=f8" => 8,
            "<f4" | ">f4" | "=f4" => 4,
            found => {
                let (file, found) = (file.to_owned(), format!("the type `{found}`"));
                return Err(ArrayError::ElementType { file, found }.into());
            }
        };
        let (lines, columns) = two_dimensions(file, &header.shape)?;
        // Before anything is allocated for them: a header can announce any number of numbers.
        let announced = (lines as u64).checked_mul(columns as u64).and_then(|count| count.checked_mul(size));
        let (announced, found) = (announced.unwrap_or(u64::MAX), bytes.len().saturating_sub(start));
        if announced > found as u64 {
            return Err(ArrayError::Truncated { file: file.to_owned(), announced, found }.into());
        }
        if announced < found as u64 {
            let extra = found - announced as usize;
            return Err(ArrayError::TooLong { file: file.to_owned(), extra }.into());
        }
        rule(lines, columns)?;
        let matrix = match size {
            8 => read::<f64>(bytes),
            _ => read::<f32>(bytes),
        }
        .map_err(|error| malformed(error.to_string()))?;
        Ok((matrix, row_names(lines)))
    }
}

/// The bytes of a NumPy array file of `float64` in C order: what [`array_formats`](super::array_formats) reads as `.npy`.
///
/// Empty where the numbers of lines and columns are such that no array can hold them (never: they are in memory).
#[must_use]
pub fn npy_bytes(matrix: &DMatrix<f64>) -> Vec<u8> {
    let array = Array2::from_shape_fn(matrix.shape(), |place| matrix[place]);
    let mut bytes = Vec::new();
    match array.write_npy(&mut bytes) {
        Ok(()) => bytes,
        Err(_) => Vec::new(),
    }
}

fn malformed(file: &str, reason: String) -> DataError {
    // The parser of headers draws the place of a fault over several lines.
    let reason = reason.lines().next().unwrap_or_default().trim_end_matches(':').to_owned();
    ArrayError::Malformed { file: file.to_owned(), format: "npy", reason }.into()
}

/// Where the numbers begin, from a header that the parser can be trusted with.
fn check_header(bytes: &[u8]) -> Result<usize, &'static str> {
    if !bytes.starts_with(b"\x93NUMPY") {
        return Err("it does not begin as one");
    }
    let length = match (bytes.get(6), bytes.get(8..12)) {
        (Some(1), Some([low, high, ..])) => 10 + usize::from(u16::from_le_bytes([*low, *high])),
        (Some(2 | 3), Some(&[a, b, c, d])) => 12 + u32::from_le_bytes([a, b, c, d]) as usize,
        (Some(_), Some(_)) => return Err("its version is unknown"),
        _ => return Err("it ends within its header"),
    };
    if length > LONGEST_HEADER {
        return Err("its header is longer than 10000 bytes");
    }
    let Some(text) = bytes.get(..length) else {
        return Err("it ends within its header");
    };
    let mut open = 0_usize;
    for byte in text {
        match byte {
            b'(' | b'[' | b'{' => open += 1,
            b')' | b']' | b'}' => open = open.saturating_sub(1),
            _ => {}
        }
        if open > DEEPEST {
            return Err("its header describes no plain array");
        }
    }
    Ok(length)
}

/// The array, in the order of its indices whatever the order in the file.
fn read<T: ReadableElement + Into<f64> + Copy>(bytes: &[u8]) -> Result<DMatrix<f64>, ReadNpyError> {
    let array = ArrayD::<T>::read_npy(bytes)?;
    let array = if array.ndim() == 1 { array.insert_axis(Axis(1)) } else { array };
    let wrong = |array_dimensions: usize| ReadNpyError::WrongNdim(Some(2), array_dimensions);
    let dimensions = array.ndim();
    let array = array.into_dimensionality::<Ix2>().map_err(|_| wrong(dimensions))?;
    Ok(DMatrix::from_fn(array.nrows(), array.ncols(), |i, j| array[(i, j)].into()))
}
