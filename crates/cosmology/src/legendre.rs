//! Legendre polynomials.

/// The Legendre polynomial of the given order at `x`, meant for −1 ≤ x ≤ 1.
///
/// Bonnet's recurrence (n+1) P_(n+1) = (2n+1) x P_n − n P_(n−1) (DLMF 14.10.3 with μ = 0), which is stable on [−1,
/// 1], where all of its solutions stay of one size: the error is a few units in the last place of 1 for the orders
/// used here. Outside [−1, 1] it holds too, as a polynomial.
pub fn legendre(order: usize, x: f64) -> f64 {
    let (mut previous, mut current) = (1.0, x);
    if order == 0 {
        return previous;
    }
    for n in 1..order {
        let n_real = n as f64;
        (previous, current) =
            (current, ((2.0 * n_real + 1.0) * x * current - n_real * previous) / (n_real + 1.0));
    }
    current
}
