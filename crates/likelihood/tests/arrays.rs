//! Covariances as NumPy arrays and FITS images, written by NumPy and Astropy (`reference/arrays.py`), and what is
//! refused, with the whole of what the user reads.

#![allow(clippy::unwrap_used, reason = "in a helper of a test as in a test")]

use std::path::{Path, PathBuf};

use nalgebra::DMatrix;
use oddwell_likelihood::{Covariance, DataError, array_formats, read_covariance};

fn path(name: &str) -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/reference/arrays").join(name)
}

fn bytes(name: &str) -> Vec<u8> {
    std::fs::read(path(name)).unwrap()
}

/// As in the script; the tiny asymmetry is evened out.
fn wanted() -> DMatrix<f64> {
    let even = 1.0 + 2.0_f64.powi(-31);
    DMatrix::from_row_slice(3, 3, &[4.0, even, -0.5, even, 9.0, 0.25, -0.5, 0.25, 1.5])
}

#[test]
fn every_way_to_write_a_covariance_reads_the_same() {
    for name in [
        "c-order.npy",
        "fortran-order.npy",
        "big-endian.npy",
        "version-2.npy",
        "primary.fits",
        "extension.fits",
        "after-a-table.fits",
    ] {
        let covariance = read_covariance(path(name), 3).unwrap();
        assert_eq!(covariance.matrix(), &wanted(), "{name}");
        assert!(covariance.origin().ends_with(name));
        assert_eq!(covariance.labels(), ["row 1", "row 2", "row 3"]);
    }
    // Of 32 bits, the asymmetry is lost.
    for name in ["single.npy", "single.fits"] {
        let covariance = read_covariance(path(name), 3).unwrap();
        assert_eq!(covariance.matrix()[(1, 0)], 1.0, "{name}");
        assert_eq!(covariance.matrix()[(1, 1)], 9.0, "{name}");
    }
    let text = b"4,1,-0.5\n1,9,0.25\n-0.5,0.25,1.5\n";
    let from_text = Covariance::parse("larkfield.CSV", text, 3).unwrap();
    assert!((from_text.matrix() - wanted()).amax() < 1e-9);
}

/// Astropy and NumPy write the two orders of axes as they do; a matrix that is not symmetric tells them apart.
#[test]
fn lines_stay_lines() {
    for name in ["not-square.npy", "not-square.fits"] {
        let message = read_covariance(path(name), 3).unwrap_err().to_string();
        let wanted = "must be 3 × 3, one line and one column for each of the 3 rows, found 2 × 3; give the covariance of \
                      all rows of the table, in the table's order";
        assert_eq!(message, format!("{}: {wanted}", path(name).display()));
    }
}

fn check(name: &str, bytes: &[u8], rows: usize, message: &str) {
    let found = Covariance::parse(name, bytes, rows).unwrap_err().to_string();
    assert_eq!(found, format!("{name}: {message}"));
}

#[test]
fn what_a_covariance_file_cannot_be() {
    for (name, message) in [
        (
            "integers.npy",
            "must hold floating-point numbers of 32 or 64 bits, found the type `<i8`; save it as such",
        ),
        (
            "complex.npy",
            "must hold floating-point numbers of 32 or 64 bits, found the type `<c16`; save it as such",
        ),
        (
            "structured.npy",
            "must hold floating-point numbers of 32 or 64 bits, found the type `[('value', '<f8')]`; save it as such",
        ),
        (
            "integers.fits",
            "must hold floating-point numbers of 32 or 64 bits, found BITPIX = 32; save it as such",
        ),
        (
            "three-dimensions.npy",
            "must be an array of two dimensions, found 3, of shape (1, 3, 3); save one table of it",
        ),
        (
            "three-dimensions.fits",
            "must be an array of two dimensions, found 3, of shape (1, 3, 3); save one table of it",
        ),
        (
            "not-a-number.npy",
            "the covariance of row 2 with row 2 must be a finite number, found NaN; correct the entry, or cut the row \
             with `keep` where it was not measured",
        ),
        (
            "not-a-number.fits",
            "the covariance of row 2 with row 2 must be a finite number, found NaN; correct the entry, or cut the row \
             with `keep` where it was not measured",
        ),
        (
            "list.npy",
            "must be 3 × 3, one line and one column for each of the 3 rows, found 3 × 1; give the covariance of all rows \
             of the table, in the table's order",
        ),
        (
            "mocks.npy",
            "must be 3 × 3, one line and one column for each of the 3 rows, found 4 × 3; give the covariance of all rows \
             of the table, in the table's order",
        ),
        (
            "empty.fits",
            "holds no image, only an empty primary unit; save the matrix as an image, in the primary unit or in an \
             extension",
        ),
        (
            "table.fits",
            "holds no image, only an empty primary unit, a table; save the matrix as an image, in the primary unit or \
             in an extension",
        ),
        (
            "compressed.fits",
            "holds no image, only an empty primary unit, a compressed image; save the matrix as an image, in the \
             primary unit or in an extension",
        ),
    ] {
        check(name, &bytes(name), 3, message);
    }
    check(
        "primary.fits",
        &bytes("primary.fits"),
        2,
        "must be 2 × 2, one line and one column for each of the 2 rows, found 3 × 3; if it holds more rows than the \
         table, name its rows with `covariance_rows`",
    );
}

#[test]
fn files_that_are_cut_short_or_go_on() {
    let npy = bytes("c-order.npy");
    let fits = bytes("primary.fits");
    let short = "ends too early: its header announces 72 bytes of numbers, found";
    let again = "copy or write the file again";
    check("cov.npy", &npy[..npy.len() - 1], 3, &format!("{short} 71; {again}"));
    check("cov.npy", &npy[..128], 3, &format!("{short} 0; {again}"));
    // The padding of the last block may be missing, its numbers may not.
    assert_eq!(Covariance::parse("cov.fits", &fits[..2880 + 72], 3).unwrap().matrix(), &wanted());
    check("cov.fits", &fits[..2880 + 71], 3, &format!("{short} 71; {again}"));
    let longer = [npy.as_slice(), &[0; 8]].concat();
    check(
        "cov.npy",
        &longer,
        3,
        "has 8 bytes after the last number that its header announces; write the file again, one array a file",
    );
    let malformed = |format: &str, reason: &str| {
        format!("is no readable {format} file ({reason}); write it again, or correct its ending")
    };
    for (name, bytes, message) in [
        ("cov.npy", &npy[..100], malformed("npy", "it ends within its header")),
        ("cov.npy", &npy[..7], malformed("npy", "it ends within its header")),
        ("cov.npy", b"", malformed("npy", "it does not begin as one")),
        ("cov.npy", b"4,1\n1,9\n", malformed("npy", "it does not begin as one")),
        ("cov.fits", &fits[..2000], malformed("fits", "unexpected end of file")),
        ("cov.fits", b"4,1\n1,9\n", malformed("fits", "unexpected end of file")),
        ("cov.fits", &npy.repeat(20), malformed("fits", "unexpected end of file")),
    ] {
        check(name, bytes, 3, &message);
    }
}

/// Headers that would make a careless reader reserve memory, or recurse, without end.
#[test]
fn headers_that_lie() {
    let npy = bytes("c-order.npy");
    let edited = |from: &str, to: &str| {
        let at = npy.windows(from.len()).position(|window| window == from.as_bytes()).unwrap();
        let mut bytes = npy.clone();
        // The padding of the header gives the room.
        let end = npy.iter().position(|byte| *byte == b'\n').unwrap();
        let text = [&npy[at + from.len()..end]].concat();
        let text = [to.as_bytes(), text.as_slice()].concat();
        bytes[at..end].copy_from_slice(&text[..end - at]);
        bytes
    };
    check(
        "cov.npy",
        &edited("(3, 3)", "(3000000000, 6000000000)"),
        3,
        "ends too early: its header announces 18446744073709551615 bytes of numbers, found 72; copy or write the file \
         again",
    );
    check(
        "cov.npy",
        &edited("(3, 3)", "((((((3, 3))))))"),
        3,
        "is no readable npy file (its header describes no plain array); write it again, or correct its ending",
    );
    check(
        "cov.npy",
        &edited("'shape'", "'shave'"),
        3,
        "is no readable npy file (error parsing header: unknown key: 'shave'); write it again, or correct its ending",
    );
    let mut version = npy.clone();
    version[6] = 9;
    check(
        "cov.npy",
        &version,
        3,
        "is no readable npy file (its version is unknown); write it again, or correct its ending",
    );
    let fits = bytes("primary.fits");
    let with = |card: &str| {
        let keyword = &card.as_bytes()[..8];
        let at = fits.chunks(80).position(|line| line.starts_with(keyword)).unwrap() * 80;
        let mut bytes = fits.clone();
        bytes[at..at + 80].copy_from_slice(format!("{card:80}").as_bytes());
        bytes
    };
    let malformed =
        |reason: &str| format!("is no readable fits file ({reason}); write it again, or correct its ending");
    for (card, message) in [
        ("NAXIS   =                   -1", malformed("its NAXIS is not within 0 and 999")),
        ("NAXIS   =         999999999999", malformed("its NAXIS is not within 0 and 999")),
        ("NAXIS   =                    3", malformed("the length of an axis is missing or negative")),
        ("NAXIS1  =                   -3", malformed("the length of an axis is missing or negative")),
        ("NAXIS1  =  9000000000000000000", malformed("its axes announce more numbers than can be counted")),
        ("BITPIX  =                   12", malformed("its BITPIX is none of 8, 16, 32, 64, -32 and -64")),
        (
            "NAXIS1  =              3000000",
            "ends too early: its header announces 72000000 bytes of numbers, found 2880; copy or write the file again"
                .to_owned(),
        ),
    ] {
        check("cov.fits", &with(card), 3, &message);
    }
}

#[test]
fn the_registry_names_the_endings() {
    for format in array_formats() {
        assert_eq!(format.extensions()[0], format.name());
        assert!(!format.summary().is_empty());
    }
    let refused = |name: &str| {
        let error = read_covariance(name, 3).unwrap_err();
        assert!(matches!(error, DataError::Array(_)));
        error.to_string()
    };
    for name in ["cov.txt", "cov", "cov.npz"] {
        assert_eq!(
            refused(name),
            format!(
                "{name}: the format is told from the ending, which must be one of .csv, .npy, .fits; save or rename the \
                 file"
            )
        );
    }
    assert_eq!(
        read_covariance("no-such.npy", 3).unwrap_err().to_string(),
        "no-such.npy: there is no such file; correct the path, which counts from the folder of the study file"
    );
}
