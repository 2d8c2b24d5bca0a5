//! What can happen to a file.

use rand::RngExt;
use rand_xoshiro::Xoshiro256PlusPlus;

/// Bytes that mean something to one of the readers.
const BYTES: &[u8] = b"0123456789-+eE.()[]{}'\"=\n\r,# TF\0\x01\x02\xff<>";

/// Numbers and words that mean something, or used to.
const WORDS: [&str; 32] = [
    "0",
    "-0.0",
    "1",
    "-1",
    "2",
    "0.5",
    "-3.7",
    "1e-300",
    "-1e-300",
    "1e300",
    "-1e300",
    "1e999",
    "nan",
    "inf",
    "-inf",
    "1e-12",
    "1e12",
    "99999999999999999999",
    "18446744073709551615",
    "-9223372036854775808",
    "true",
    "\"\"",
    "[]",
    "{}",
    "[[",
    "]]",
    "\"",
    "\r\n\r\n",
    "\u{feff}",
    ",,,,",
    "((((((((((",
    "END     ",
];

/// One to five damages to a sound input.
pub(super) fn damaged(sound: &[u8], random: &mut Xoshiro256PlusPlus) -> Vec<u8> {
    let mut bytes = sound.to_vec();
    for _ in 0..random.random_range(1..6) {
        if bytes.is_empty() {
            break;
        }
        let length = bytes.len();
        let from = random.random_range(0..length);
        let range = from..(from + 1 + random.random_range(0..120)).min(length);
        match random.random_range(0..10) {
            0 => bytes[from] = BYTES[random.random_range(0..BYTES.len())],
            1 => bytes[from] = random.random(),
            // Most of what matters stands at the beginning.
            2 => bytes[from.min(random.random_range(0..length.min(400)))] = random.random(),
            3 => drop(bytes.drain(range)),
            4 => bytes.truncate(from),
            5 => {
                let copy = bytes[range.clone()].to_vec();
                bytes.splice(range.end..range.end, copy);
            }
            6 => {
                let word = WORDS[random.random_range(0..WORDS.len())];
                bytes.splice(from..from, word.bytes());
            }
            7 => swap_lines(&mut bytes, random),
            // A number becomes another word.
            _ => replace_number(&mut bytes, from, random),
        }
    }
    bytes
}

fn replace_number(bytes: &mut Vec<u8>, from: usize, random: &mut Xoshiro256PlusPlus) {
    let part = |byte: &u8| byte.is_ascii_digit() || b".eE+-".contains(byte);
    let Some(start) = bytes[from..].iter().position(u8::is_ascii_digit).map(|offset| from + offset) else {
        return;
    };
    let end = bytes[start..].iter().position(|byte| !part(byte)).map_or(bytes.len(), |offset| start + offset);
    let word = WORDS[random.random_range(0..WORDS.len())];
    bytes.splice(start..end, word.bytes());
}

fn swap_lines(bytes: &mut Vec<u8>, random: &mut Xoshiro256PlusPlus) {
    let mut lines: Vec<Vec<u8>> = bytes.split(|byte| *byte == b'\n').map(<[u8]>::to_vec).collect();
    let count = lines.len();
    lines.swap(random.random_range(0..count), random.random_range(0..count));
    *bytes = lines.join(&b'\n');
}
