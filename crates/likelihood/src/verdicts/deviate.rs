//! Tail probabilities as standard normal deviates.

use statrs::distribution::{ContinuousCDF, Normal, StudentsT};

/// The standard normal deviate of a Student's t with some degrees of freedom: same tail probability, same sign.
pub(super) fn deviate_of_t(t: f64, degrees_of_freedom: f64) -> f64 {
    let Ok(student) = StudentsT::new(0.0, 1.0, degrees_of_freedom) else {
        return f64::NAN;
    };
    let tail = student.sf(t.abs());
    // Below this the quantile of the normal runs out of numbers: Wallace 1959, Ann. Math. Stat. 30, 1121, is good to 10⁻³
    // of the deviate there.
    let deviate = match tail > 1e-290 {
        true => -Normal::standard().inverse_cdf(tail),
        false => {
            let m = degrees_of_freedom;
            (8.0 * m + 1.0) / (8.0 * m + 3.0) * (m * (t * t / m).ln_1p()).sqrt()
        }
    };
    deviate.copysign(t)
}

/// The standard normal deviate that exceeds a share p of the standard normal distribution; 38 where p is 0.
pub(super) fn deviate_of_p(p: f64) -> f64 {
    match p > 1e-300 {
        true => -Normal::standard().inverse_cdf(p),
        false => 38.0,
    }
}

/// The share of the standard normal distribution above `sigma`: the one-sided p-value of a number of standard deviations.
#[must_use]
pub fn upper_tail(sigma: f64) -> f64 {
    Normal::standard().sf(sigma)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn deviates_are_those_of_scipy() {
        // scipy.stats.norm.isf(scipy.stats.t.sf(t, m)), SciPy 1.17.1; incomplete beta functions to 10⁻¹².
        for (t, m, wanted) in [
            (0.5, 3.0, 0.4517515666164371),
            (-2.0, 7.5, -1.7341188628618627),
            (4.0, 30.0, 3.552323126199353),
            (10.0, 12.0, 5.08996353947355),
            (12.0, 500.0, 11.243731556257964),
        ] {
            let found = deviate_of_t(t, m);
            assert!((found - wanted).abs() < 1e-9 * f64::abs(wanted), "{t}, {m}: {found} {wanted}");
        }
        // By mpmath in 60 digits: tails of 10⁻⁴⁰³ and 10⁻⁴⁵⁰.
        for (t, m, wanted) in [(200.0, 400.0, 42.94775860210636), (60.0, 2000.0, 45.37364736765121)] {
            assert!((deviate_of_t(t, m) / wanted - 1.0).abs() < 1e-3);
        }
        assert!((deviate_of_p(0.022750131948179195) - 2.0).abs() < 1e-12);
        assert_eq!(deviate_of_p(0.0), 38.0);
        // SciPy too, to what the crate's complementary error function promises.
        assert!((upper_tail(2.0) / 0.022750131948179195 - 1.0).abs() < 1e-9);
    }
}
