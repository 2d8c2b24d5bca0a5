//! Insertion indices: where new points land among the live ones.

use crate::level::Height;
use oddwell_sampler::moves::Random;
use rand::RngExt;

/// Places of new points, as numbers that are uniform on [0, 1] and independent if the points are independent draws of the
/// prior above the bound.
#[derive(Debug, Default)]
pub(super) struct Insertions {
    pub(super) uniforms: Vec<f64>,
}

impl Insertions {
    /// Adds the places of `new` points, one after the other, among the `survivors` and the new ones before them: the rank
    /// of the next of n + 1 exchangeable numbers is uniform over 0 … n, whatever the ranks before (Rényi 1962). A uniform
    /// number within the rank's interval makes it continuous.
    pub(super) fn add(&mut self, survivors: &[Height], new: &[Height], random: &mut Random) {
        let mut sorted = survivors.to_vec();
        sorted.sort_by(Height::order);
        for height in new {
            let rank = sorted.partition_point(|other| other.order(height).is_lt());
            self.uniforms.push((rank as f64 + random.random::<f64>()) / (sorted.len() + 1) as f64);
            sorted.insert(rank, *height);
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::numbers::kolmogorov_p_value;
    use rand::SeedableRng;

    fn heights(random: &mut Random, count: usize, power: f64) -> Vec<Height> {
        (0..count)
            .map(|_| Height {
                log_prior: 0.0,
                log_likelihood: random.random::<f64>().powf(power),
                label: random.random(),
            })
            .collect()
    }

    /// Exchangeable points pass; points that lie a little lower than the survivors do not. 4000 places see a shift of the
    /// distribution function by (power − 1)/(e power) ≈ 0.07 as √n·D ≈ 4.
    #[test]
    fn places_are_uniform_for_exchangeable_points_alone() {
        let p_value = |power: f64| {
            let mut random = Random::seed_from_u64(7);
            let mut insertions = Insertions::default();
            for _ in 0..40 {
                let survivors = heights(&mut random, 100, 1.0);
                let new = heights(&mut random, 100, power);
                insertions.add(&survivors, &new, &mut random);
            }
            kolmogorov_p_value(insertions.uniforms)
        };
        assert!(p_value(1.0) > 0.01);
        assert!(p_value(1.3) < 1e-4);
    }
}
