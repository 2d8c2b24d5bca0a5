//! One separation or shell, one wavenumber or wavenumber bin.

use crate::rows::{Row, Space};
use oddwell_cosmology::{gauss_legendre, spherical_bessel_all};

/// Where a row stands, shared by all rows that stand there.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(crate) struct Abscissa {
    pub(crate) space: Space,
    pub(crate) at: f64,
    pub(crate) edges: Option<(f64, f64)>,
}

impl Abscissa {
    pub(crate) fn of(row: &Row) -> Abscissa {
        Abscissa { space: row.space, at: row.at, edges: row.edges }
    }

    /// The largest separation or wavenumber it reaches.
    pub(crate) fn end(&self) -> f64 {
        self.edges.map_or(self.at, |(_, high)| high)
    }

    /// The smallest separation or wavenumber it reaches, if that is above 0 (else a hundredth of the largest).
    pub(crate) fn start(&self) -> f64 {
        self.edges.map_or(self.at, |(low, high)| if low > 0.0 { low } else { 0.01 * high })
    }

    /// Points and weights of the average: weight x²dx over the shell, 3/(hi³−lo³) in front; `n` Gauss–Legendre points.
    fn average(&self, n: usize) -> Vec<(f64, f64)> {
        let Some((low, high)) = self.edges else {
            return vec![(self.at, 1.0)];
        };
        let rule = gauss_legendre(n);
        let (centre, half) = (0.5 * (low + high), 0.5 * (high - low));
        let norm = 3.0 * half / (high.powi(3) - low.powi(3));
        let points = rule.nodes.iter().zip(&rule.weights);
        points
            .map(|(node, weight)| (centre + half * node, weight))
            .map(|(x, w)| (x, norm * w * x * x))
            .collect()
    }

    /// The wavenumbers and weights over which a Fourier row is averaged. Twenty-four points resolve the acoustic
    /// feature over a bin as wide as 0.3 h/Mpc.
    pub(crate) fn wavenumbers(&self) -> Vec<(f64, f64)> {
        self.average(24)
    }

    /// What averages Bessel functions over the shell.
    pub(crate) fn shell(&self) -> Shell {
        Shell { abscissa: *self, rules: Vec::new().into() }
    }
}

/// jₗ(ks) and s·jₗ(ks), averaged over a shell.
#[derive(Clone, Debug)]
pub(crate) struct Shell {
    abscissa: Abscissa,
    /// Points and weights, by their number over eight; made when first asked for.
    rules: std::cell::RefCell<Vec<Vec<(f64, f64)>>>,
}

impl Shell {
    /// By separation power (0, 1), then order 0–4. With enough points for the phase k·(hi − lo) that the shell spans: n
    /// points integrate a polynomial of degree 2n − 1, and cos(φx/2) on [−1, 1] to 1e-11 once n > φ/4 + 10.
    pub(crate) fn bessel(&self, k: f64) -> [[f64; 5]; 2] {
        let width = self.abscissa.edges.map_or(0.0, |(low, high)| high - low);
        // Multiples of eight points, so that a rule serves many wavenumbers.
        let eights = if width == 0.0 { 1 } else { ((0.3 * k * width) as usize + 10) / 8 + 1 };
        let mut rules = self.rules.borrow_mut();
        while rules.len() <= eights {
            rules.push(Vec::new());
        }
        if rules[eights].is_empty() {
            rules[eights] = self.abscissa.average(8 * eights);
        }
        let mut sums = [[0.0; 5]; 2];
        for &(s, share) in &rules[eights] {
            for (order, bessel) in spherical_bessel_all(k * s).into_iter().enumerate() {
                sums[0][order] += share * bessel;
                sums[1][order] += share * s * bessel;
            }
        }
        sums
    }
}
