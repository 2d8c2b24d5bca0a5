//! Spherical Bessel functions j₀ … j₄.

/// Highest order that is offered.
pub const HIGHEST_ORDER: usize = 4;

/// Number of terms of the power series. At x = SERIES_BELOW the first one left out is below 10⁻¹⁷ of the first (for
/// order 1, the worst: 4.5¹⁴/(14! · 5·7·…·31) = 2.5·10⁻¹⁹).
const TERMS: usize = 14;

/// Below this argument orders 1 to 4 come from their power series.
const SERIES_BELOW: f64 = 3.0;

/// Coefficients of (x²)ᵐ in jₗ(x) (2l+1)!!/xˡ (DLMF 10.53.1): (−½)ᵐ / (m! (2l+3)(2l+5)…(2l+2m+1)).
const SERIES: [[f64; TERMS]; HIGHEST_ORDER + 1] = {
    let mut table = [[1.0; TERMS]; HIGHEST_ORDER + 1];
    let mut order = 0;
    while order <= HIGHEST_ORDER {
        let mut term = 1;
        while term < TERMS {
            table[order][term] =
                table[order][term - 1] * -0.5 / (term as f64 * (2 * order + 2 * term + 1) as f64);
            term += 1;
        }
        order += 1;
    }
    table
};

/// (2l+1)!!
const DOUBLE_FACTORIAL: [f64; HIGHEST_ORDER + 1] = [1.0, 3.0, 15.0, 105.0, 945.0];

fn series(order: usize, x: f64) -> f64 {
    let square = x * x;
    let sum = SERIES[order].iter().rev().fold(0.0, |sum, coefficient| sum * square + coefficient);
    x.powi(order as i32) / DOUBLE_FACTORIAL[order] * sum
}

/// jₗ(x) for one order l = 0 … 4 and x ≥ 0; NaN for a higher order. See [`spherical_bessel_all`] for the method.
pub fn spherical_bessel(order: usize, x: f64) -> f64 {
    match order {
        0 if x == 0.0 => 1.0,
        0 => x.sin() / x,
        1..=HIGHEST_ORDER if x.abs() < SERIES_BELOW => series(order, x),
        1..=HIGHEST_ORDER => spherical_bessel_all(x)[order],
        _ => f64::NAN,
    }
}

/// j₀(x) … j₄(x) at once, for x ≥ 0.
///
/// j₀ = sin x/x holds everywhere. The others, by the upward recurrence j_(l+1) = (2l+1)/x jₗ − j_(l−1) (DLMF 10.51.1)
/// from j₁ = (j₀ − cos x)/x, are differences of terms that grow like (2l−1)!!/x^(l+1) as x falls, while jₗ itself
/// falls like xˡ/(2l+1)!!: at x = 1 nine digits of j₄ are lost, at x = 0.1 all of them. So below x = 3, where j₄ would
/// soon lose digits, each order is summed from its power series, whose terms there never exceed the first.
///
/// Relative accuracy 1e-13 for x < 3 and, away from the zeros, above; near a zero, 1e-15 of 1/x.
pub fn spherical_bessel_all(x: f64) -> [f64; HIGHEST_ORDER + 1] {
    if x == 0.0 {
        return [1.0, 0.0, 0.0, 0.0, 0.0];
    }
    if x.abs() < SERIES_BELOW {
        return [x.sin() / x, series(1, x), series(2, x), series(3, x), series(4, x)];
    }
    let inverse = 1.0 / x;
    let (sine, cosine) = x.sin_cos();
    let j0 = sine * inverse;
    let j1 = (j0 - cosine) * inverse;
    let j2 = 3.0 * inverse * j1 - j0;
    let j3 = 5.0 * inverse * j2 - j1;
    let j4 = 7.0 * inverse * j3 - j2;
    [j0, j1, j2, j3, j4]
}
