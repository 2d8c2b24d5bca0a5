//! Effective sample sizes and the Monte Carlo error of a mean.

use super::quantiles::{quantile_of_sorted, sorted};
use super::ranks::{Chains, Order, ScoreTable, mean, squares_about};

/// Effective samples of the rank-normalised draws: how well the bulk is known (Vehtari et al. 2021, §4).
///
/// `chains`: one slice a chain, equal lengths of at least 4. NaN where that does not hold or a value is not finite; the
/// number of draws for constant draws.
pub fn ess_bulk<C: AsRef<[f64]>>(chains: &[C]) -> f64 {
    valid(chains).map_or(f64::NAN, |gathered| {
        let split = gathered.split();
        let scores = Order::new(&split.values).scores(&ScoreTable::new(split.values.len()));
        effective_samples(&split.with(scores))
    })
}

/// Smaller of the effective samples of the 5 % and the 95 % quantile (Vehtari et al. 2021, §4.3). Otherwise as [`ess_bulk`].
pub fn ess_tail<C: AsRef<[f64]>>(chains: &[C]) -> f64 {
    valid(chains).map_or(f64::NAN, |gathered| {
        let sorted = sorted(&gathered.values);
        let low = indicator_ess(&gathered, quantile_of_sorted(&sorted, 0.05));
        low.min(indicator_ess(&gathered, quantile_of_sorted(&sorted, 0.95)))
    })
}

/// Effective samples of the quantile at `p`: those of the indicator x ≤ quantile. Otherwise as [`ess_bulk`].
pub fn ess_quantile<C: AsRef<[f64]>>(chains: &[C], p: f64) -> f64 {
    valid(chains).map_or(f64::NAN, |gathered| {
        let level = quantile_of_sorted(&sorted(&gathered.values), p);
        indicator_ess(&gathered, level)
    })
}

/// Effective samples of the mean: those of the draws as they are. Otherwise as [`ess_bulk`].
pub fn ess_mean<C: AsRef<[f64]>>(chains: &[C]) -> f64 {
    valid(chains).map_or(f64::NAN, |gathered| effective_samples(&gathered.split()))
}

/// Monte Carlo standard error of the mean: standard deviation over √[`ess_mean`].
pub fn mcse_mean<C: AsRef<[f64]>>(chains: &[C]) -> f64 {
    valid(chains).map_or(f64::NAN, |gathered| {
        let values = &gathered.values;
        let variance = squares_about(values, mean(values)) / (values.len() as f64 - 1.0);
        (variance / effective_samples(&gathered.split())).sqrt()
    })
}

fn valid<C: AsRef<[f64]>>(chains: &[C]) -> Option<Chains> {
    Chains::gather(chains).filter(|gathered| gathered.length >= 4)
}

/// Effective samples of the indicator x ≤ `level`.
pub(crate) fn indicator_ess(chains: &Chains, level: f64) -> f64 {
    let indicator = chains.values.iter().map(|value| f64::from(u8::from(*value <= level))).collect();
    effective_samples(&chains.with(indicator).split())
}

/// Effective samples S/τ of chains that are split already (Vehtari et al. 2021, eqs. 10–13).
pub(crate) fn effective_samples(chains: &Chains) -> f64 {
    let (length, count) = (chains.length, chains.count());
    if length < 2 || chains.is_constant() {
        return (length * count) as f64;
    }
    let draws = length as f64;
    let means = chains.means();
    let centred = chains.centred(&means);
    let covariance = |lag: usize| centred.autocovariance(lag);
    let within = covariance(0) * draws / (draws - 1.0);
    let mut variance = within * (draws - 1.0) / draws;
    if count > 1 {
        variance += squares_about(&means, mean(&means)) / (count as f64 - 1.0);
    }
    initial_monotone(length, length * count, |lag| 1.0 - (within - covariance(lag)) / variance)
}

/// Effective samples S/τ of many chains about their common mean, with autocovariances divided by their number of terms.
///
/// Vehtari's estimator takes each chain about its own mean, which lowers every autocorrelation by about 1/n for chains of n
/// draws; with hundreds of walkers of thirty steps that overstates the effective samples by 15 %. About the common mean
/// there is no such loss, and chains that have not met show as a memory that does not end.
pub(crate) fn pooled_effective_samples(chains: &Chains) -> f64 {
    let (length, count) = (chains.length, chains.count());
    if length < 2 || chains.is_constant() {
        return (length * count) as f64;
    }
    let centred = chains.centred(&vec![mean(&chains.values); count]);
    let variance = centred.autocovariance(0);
    let unbiased = |lag: usize| length as f64 / (length - lag) as f64;
    initial_monotone(length, length * count, |lag| centred.autocovariance(lag) * unbiased(lag) / variance)
}

/// Effective samples from autocorrelations, with Geyer's (1992, Stat. Sci. 7, 473, §3.3) initial monotone sequence of pairs.
///
/// τ is not let below 1/log10 S, which bounds what antithetic chains may claim. Lags are asked for one after the other, as
/// far as the sequence stays positive.
fn initial_monotone(length: usize, total: usize, correlation: impl Fn(usize) -> f64) -> f64 {
    // rho[t] up to where a pair's sum turns negative; a negative pair stays out, its even member may count once.
    let (mut even, mut odd) = (1.0, correlation(1));
    let mut rho = vec![even, odd];
    let mut t = 1;
    while t + 3 < length && even + odd > 0.0 {
        even = correlation(t + 1);
        odd = correlation(t + 2);
        if even + odd >= 0.0 {
            rho.extend([even, odd]);
        } else {
            rho.extend([0.0, 0.0]);
        }
        t += 2;
    }
    rho.resize(rho.len() + 2, 0.0);
    let last = t as isize - 2;
    if even > 0.0 {
        rho[(last + 1) as usize] = even;
    }
    let mut t = 1;
    while (t as isize) <= last - 2 {
        if rho[t + 1] + rho[t + 2] > rho[t - 1] + rho[t] {
            rho[t + 1] = 0.5 * (rho[t - 1] + rho[t]);
            rho[t + 2] = rho[t + 1];
        }
        t += 2;
    }
    let cut = (last + 1) as usize;
    let time = -1.0 + 2.0 * rho[..cut].iter().sum::<f64>() + rho[cut];
    let total = total as f64;
    total / time.max(total.log10().recip())
}
