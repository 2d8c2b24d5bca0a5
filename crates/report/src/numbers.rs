//! Numbers for people: as many digits as their error is worth.

/// The power of ten of the last digit that an error of two significant digits has: −2 for 0.31, 2 for 1,900.
/// None for an error that is zero or not finite.
fn last_place(error: f64) -> Option<i32> {
    if error == 0.0 || !error.is_finite() {
        return None;
    }
    // Rounded first: 0.0996 is 0.10 with two digits, one place up.
    exponent(error, 1).map(|exponent| exponent - 1)
}

/// The power of ten of the first digit, once rounded to `digits` after it.
fn exponent(value: f64, digits: usize) -> Option<i32> {
    let text = format!("{:.*e}", digits, value.abs());
    text.split_once('e').and_then(|(_, exponent)| exponent.parse().ok())
}

/// A value with the digits that its error allows: (1.2345, 0.0312) gives `1.234`, (1234, 190) gives `1230`. Without a
/// usable error, four significant digits; what is not finite is `–`.
pub(crate) fn rounded(value: f64, error: f64) -> String {
    match last_place(error) {
        _ if !value.is_finite() => UNKNOWN.to_owned(),
        Some(place) => at_place(value, place),
        None => significant(value, 4),
    }
}

/// An error alone, with two significant digits.
pub(crate) fn two_digits(error: f64) -> String {
    rounded(error, error)
}

/// A number with so many significant digits.
pub fn significant(value: f64, digits: i32) -> String {
    if !value.is_finite() {
        return UNKNOWN.to_owned();
    }
    match exponent(value, usize::try_from(digits - 1).unwrap_or(0)) {
        Some(first) if value != 0.0 => at_place(value, first - digits + 1),
        _ => "0".to_owned(),
    }
}

/// With a sign, also where it is positive.
pub fn signed(text: &str) -> String {
    if text.starts_with('-') || text.trim_start_matches(['0', '.']).is_empty() {
        text.to_owned()
    } else {
        format!("+{text}")
    }
}

/// What stands where a number is unknown.
pub(crate) const UNKNOWN: &str = "–";

fn at_place(value: f64, place: i32) -> String {
    let plain = if place > 0 {
        let step = 10f64.powi(place);
        (value / step).round() * step
    } else {
        value
    };
    let decimals = usize::try_from(-place).unwrap_or(0);
    let text = if (-6..=5).contains(&place) {
        format!("{plain:.decimals$}")
    } else {
        // Neither a row of zeros after the point nor one before it.
        let digits = exponent(value, 0).map_or(0, |first| usize::try_from(first - place).unwrap_or(0));
        format!("{value:.digits$e}")
    };
    match text.strip_prefix('-') {
        Some(zero) if zero.chars().all(|letter| matches!(letter, '0' | '.')) => zero.to_owned(),
        _ => text,
    }
}

/// A probability: two digits, never rounded to 0 or 1.
pub(crate) fn probability(value: f64) -> String {
    match value {
        _ if !value.is_finite() => UNKNOWN.to_owned(),
        _ if value <= 0.0 => "below 1e-300".to_owned(),
        _ if value < 1e-3 => format!("{value:.0e}"),
        _ if value < 0.01 => format!("{value:.4}"),
        _ if value > 0.995 => format!("{value:.4}").replace("1.0000", "above 0.9999"),
        _ => format!("{value:.2}"),
    }
}

/// A probability as a share of a whole: two digits in per cent, a power of ten where it is tiny.
pub(crate) fn share(value: f64) -> String {
    let hundredfold = 100.0 * value;
    match hundredfold {
        _ if !value.is_finite() || value < 1e-4 => probability(value),
        _ if hundredfold < 99.5 => format!("{} %", significant(hundredfold, 2)),
        _ => format!("{hundredfold:.1} %"),
    }
}

/// A count with a comma at every third digit.
pub fn count(value: u64) -> String {
    let digits = value.to_string();
    let mut out = String::new();
    for (index, digit) in digits.chars().enumerate() {
        if index > 0 && (digits.len() - index).is_multiple_of(3) {
            out.push(',');
        }
        out.push(digit);
    }
    out
}

/// A count that came as a real number, such as effective samples; rounded down, to promise nothing.
pub fn whole(value: f64) -> String {
    if value.is_finite() && value >= 0.0 { count(value.floor() as u64) } else { UNKNOWN.to_owned() }
}

/// A stretch of time: `0.42 s`, `12 s`, `3 min 20 s`, `2 h 5 min`.
pub fn duration(seconds: f64) -> String {
    if !seconds.is_finite() || seconds < 0.0 {
        return UNKNOWN.to_owned();
    }
    let whole = seconds.round() as u64;
    match whole {
        0..=9 => format!("{} s", significant(seconds, 2)),
        10..=59 => format!("{whole} s"),
        60..=3599 => format!("{} min {} s", whole / 60, whole % 60),
        _ => format!("{} h {} min", whole / 3600, whole % 3600 / 60),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn values_carry_the_digits_of_their_error() {
        for (value, error, expected) in [
            (1.2345, 0.0312, "1.234"),
            (-1.2356, 0.31, "-1.24"),
            (1.0, 0.0996, "1.00"),
            (1234.0, 190.0, "1230"),
            (-0.0004, 0.2, "0.00"),
            (404.3, 0.5, "404.30"),
            (1.281_150e-9, 3.0e-11, "1.281e-9"),
            (2.0e12, 3.0e10, "2.000e12"),
            (1.234_56, 0.0, "1.235"),
            (f64::NAN, 1.0, "–"),
            (0.5, f64::INFINITY, "0.5000"),
        ] {
            assert_eq!(rounded(value, error), expected, "{value} ± {error}");
        }
        assert_eq!(two_digits(0.0996), "0.10");
        assert_eq!(two_digits(17.32), "17");
        assert_eq!(two_digits(0.0), "0");
    }

    #[test]
    fn signs_are_shown_except_on_zero() {
        assert_eq!(signed("1.2"), "+1.2");
        assert_eq!(signed("-1.2"), "-1.2");
        assert_eq!(signed("0.00"), "0.00");
    }

    #[test]
    fn probabilities_are_never_certainties() {
        for (value, expected) in [
            (0.8, "0.80"),
            (0.0123, "0.01"),
            (0.0042, "0.0042"),
            (3.2e-7, "3e-7"),
            (0.0, "below 1e-300"),
            (0.9991, "0.9991"),
            (1.0, "above 0.9999"),
        ] {
            assert_eq!(probability(value), expected);
        }
        for (value, expected) in
            [(0.0123, "1.2 %"), (0.31, "31 %"), (2.0e-9, "2e-9"), (0.997, "99.7 %"), (0.000_27, "0.027 %")]
        {
            assert_eq!(share(value), expected);
        }
    }

    #[test]
    fn counts_and_times_read_easily() {
        assert_eq!(count(0), "0");
        assert_eq!(count(1_234_567), "1,234,567");
        assert_eq!(whole(4012.9), "4,012");
        assert_eq!(whole(f64::NAN), "–");
        assert_eq!(duration(0.421), "0.42 s");
        assert_eq!(duration(12.4), "12 s");
        assert_eq!(duration(200.0), "3 min 20 s");
        assert_eq!(duration(7500.0), "2 h 5 min");
    }
}
