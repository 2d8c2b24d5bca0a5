//! Chain diagnostics against a general-purpose diagnostics library.

#![allow(clippy::unwrap_used, clippy::panic, reason = "test helpers may stop where they fail")]

use oddwell_sampler::diagnostics::{
    ess_bulk, ess_mean, ess_quantile, ess_tail, integrated_autocorrelation_time, mcse_mean, quantile,
    rank_normalised_split_rhat,
};

const TABLE: &str = include_str!("reference/diagnostics.csv");

/// SplitMix64, as in `reference/diagnostics.py`.
struct Stream(u64);

impl Stream {
    fn uniform(&mut self) -> f64 {
        self.0 = self.0.wrapping_add(0x9E37_79B9_7F4A_7C15);
        let mut z = self.0;
        z = (z ^ (z >> 30)).wrapping_mul(0xBF58_476D_1CE4_E5B9);
        z = (z ^ (z >> 27)).wrapping_mul(0x94D0_49BB_1331_11EB);
        z ^= z >> 31;
        (z >> 11) as f64 * 2f64.powi(-53)
    }

    fn noise(&mut self) -> f64 {
        let mut total = 0.0;
        for _ in 0..12 {
            total += self.uniform();
        }
        total - 6.0
    }
}

fn autoregressive(seed: u64, chains: u64, draws: usize, memory: f64, offset: f64) -> Vec<Vec<f64>> {
    let chain = |chain: u64| {
        let mut stream = Stream(seed * 1000 + chain);
        let mut x = 0.0;
        let mut next = || {
            x = memory * x + stream.noise();
            x + offset * chain as f64
        };
        (0..draws).map(|_| next()).collect()
    };
    (0..chains).map(chain).collect()
}

fn case(name: &str) -> Vec<Vec<f64>> {
    match name {
        "white" => autoregressive(1, 4, 250, 0.0, 0.0),
        "memory" => autoregressive(2, 4, 500, 0.9, 0.0),
        "antithetic" => autoregressive(3, 4, 400, -0.6, 0.0),
        "apart" => autoregressive(4, 4, 300, 0.5, 0.4),
        "odd" => autoregressive(5, 3, 101, 0.3, 0.0),
        "single" => autoregressive(6, 1, 600, 0.7, 0.0),
        "short" => autoregressive(7, 8, 11, 0.5, 0.0),
        "slow" => autoregressive(8, 4, 200, 0.99, 0.0),
        "heavy" => (0..4)
            .map(|chain| {
                let mut stream = Stream(9000 + chain);
                (0..300).map(|_| stream.noise() / (stream.uniform() + 1e-6)).collect()
            })
            .collect(),
        "ties" => autoregressive(10, 4, 200, 0.6, 0.0)
            .into_iter()
            .map(|chain| chain.into_iter().map(f64::floor).collect())
            .collect(),
        "constant" => vec![vec![1.5; 100]; 4],
        _ => panic!("{name}"),
    }
}

/// The library goes through Fourier transforms and another normal quantile function; that leaves 1e-12 or so of an
/// autocovariance, and a sum over lags of it: 1e-9 leaves room and would show any other definition.
#[test]
fn diagnostics_agree_with_the_frozen_table() {
    let mut compared = 0;
    for line in TABLE.lines().skip(1) {
        let fields: Vec<&str> = line.split(',').collect();
        let (name, function, wanted) = (fields[0], fields[1], fields[2].parse::<f64>().unwrap());
        let chains = case(name);
        let got = match function {
            "rhat" => rank_normalised_split_rhat(&chains),
            "bulk" => ess_bulk(&chains),
            "tail" => ess_tail(&chains),
            "mean" => ess_mean(&chains),
            "quantile30" => ess_quantile(&chains, 0.3),
            "mcse" => mcse_mean(&chains),
            "q10" => quantile(&chains.concat(), 0.1),
            _ => panic!("{line}"),
        };
        if wanted.is_nan() {
            assert!(name == "single" || got.is_nan(), "{line}: {got}");
            continue;
        }
        assert!((got - wanted).abs() <= 1e-9 * wanted.abs(), "{line}: got {got}");
        compared += 1;
    }
    assert_eq!(compared, 75);
}

#[test]
fn a_single_chain_is_compared_with_itself() {
    let still = autoregressive(6, 1, 600, 0.2, 0.0);
    let value = rank_normalised_split_rhat(&still);
    assert!(value > 0.99 && value < 1.02, "{value}");
    // A ramp has two halves that share nothing.
    let ramp = vec![(0..600).map(f64::from).collect::<Vec<_>>()];
    assert!(rank_normalised_split_rhat(&ramp) > 1.5);
}

/// τ of an autoregressive series is (1 + a)/(1 − a). With 200,000 draws and a window of 5τ its relative error is
/// √(2(2·5τ + 1)/n), 4 % at a = 0.9; three of those are allowed.
#[test]
fn autocorrelation_time_of_an_autoregressive_series() {
    for memory in [0.0, 0.5, 0.9] {
        let chains = autoregressive(11, 2, 100_000, memory, 0.0);
        let wanted = (1.0 + memory) / (1.0 - memory);
        let found = integrated_autocorrelation_time(&chains);
        let error = (2.0 * (10.0 * wanted + 1.0) / 200_000.0f64).sqrt();
        assert!(found.closed);
        assert!(
            (found.time / wanted - 1.0).abs() < 3.0 * error + 0.01,
            "{memory}: {found:?}, wanted {wanted}"
        );
    }
}

#[test]
fn what_cannot_be_computed_is_not_a_number() {
    assert!(ess_bulk::<Vec<f64>>(&[]).is_nan());
    assert!(ess_bulk(&[vec![1.0, 2.0, 3.0]]).is_nan());
    assert!(ess_tail(&[vec![1.0, 2.0, 3.0, f64::NAN]]).is_nan());
    assert!(rank_normalised_split_rhat(&[vec![1.0; 5], vec![1.0; 6]]).is_nan());
}
