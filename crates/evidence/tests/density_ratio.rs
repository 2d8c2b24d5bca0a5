//! The density ratio, where the evidences of both hypotheses are known.

#![allow(clippy::unwrap_used, clippy::panic, reason = "a test stops at the first surprise")]

use oddwell_evidence::comparison::width_curve;
use oddwell_evidence::{
    ClosedForm, Contained, DensityRatio, Estimator, EvidenceError, Nested, Problem, SteppingStones, Watch,
    conditional_densities,
};
use oddwell_sampler::{
    Chain, Control, EnsembleSettings, EvaluationFailure, PriorSet, SharedPrior, Target, build_prior, sample,
};

/// Data that two amplitudes and two nuisances share, correlated; some coordinates may be held at 0. With a number of mocks the
/// noise is a multivariate t, else normal.
struct Shared {
    priors: PriorSet,
    free: Vec<usize>,
    mocks: Option<f64>,
}

const DESIGN: [[f64; 4]; 5] = [
    [1.0, 0.2, 0.5, 0.0],
    [0.3, 1.0, 0.0, 0.6],
    [0.5, 0.5, 0.4, 0.4],
    [0.0, 0.0, 1.0, 0.3],
    [0.2, -0.4, 0.0, 1.0],
];
const DATA: [f64; 5] = [2.1, -0.4, 1.2, 0.7, 0.3];

fn prior(width: f64) -> SharedPrior {
    build_prior("normal", &[0.0, width], None).unwrap()
}

impl Shared {
    fn new(free: &[usize], mocks: Option<f64>) -> Self {
        let widths = [3.0, 2.0, 1.0, 1.0];
        let priors = free.iter().map(|at| prior(widths[*at])).collect();
        Self { priors: PriorSet::from_independent(priors), free: free.to_vec(), mocks }
    }
}

impl Target for Shared {
    type Scratch = ();
    fn dimension(&self) -> usize {
        self.free.len()
    }
    fn scratch(&self) {}
    fn log_prior(&self, point: &[f64]) -> f64 {
        self.priors.log_density(point)
    }
    fn log_likelihood(&self, point: &[f64], _: &mut ()) -> Result<f64, EvaluationFailure> {
        let residual = |(row, datum): (&[f64; 4], &f64)| {
            let model: f64 = self.free.iter().zip(point).map(|(at, x)| row[*at] * x).sum();
            ((datum - model) / 0.7).powi(2)
        };
        let square: f64 = DESIGN.iter().zip(&DATA).map(residual).sum();
        Ok(match self.mocks {
            Some(mocks) => -0.5 * mocks * (square / (mocks - 1.0)).ln_1p(),
            None => -0.5 * square,
        })
    }
}

fn problem<'a>(
    target: &'a Shared,
    chain: Option<&'a Chain>,
    contained: Option<&'a Contained>,
) -> Problem<'a, Shared> {
    Problem { target, priors: &target.priors, seed: 1, peak: None, chain, contained }
}

fn chain(target: &Shared) -> Chain {
    let settings = EnsembleSettings { effective_samples: 4000.0, ..EnsembleSettings::default() };
    sample(target, &target.priors, &settings, &mut |_| Control::Continue).unwrap()
}

fn closed(target: &Shared) -> f64 {
    ClosedForm.estimate(&problem(target, None, None), &Watch::new()).unwrap().log_evidence
}

#[test]
fn one_and_two_amplitudes_under_normal_noise() {
    let whole = Shared::new(&[0, 1, 2, 3], None);
    let chain = chain(&whole);
    for (parameters, left) in [(vec![0], vec![1, 2, 3]), (vec![0, 1], vec![2, 3])] {
        let smaller = closed(&Shared::new(&left, None));
        let values = vec![0.0; parameters.len()];
        let contained = Contained { parameters, values, log_evidence: smaller, error: 0.0 };
        let found = DensityRatio::default()
            .estimate(&problem(&whole, Some(&chain), Some(&contained)), &Watch::new())
            .unwrap();
        let off = found.log_evidence - closed(&whole);
        assert!(off.abs() < 3.0 * found.error && found.error < 0.1, "{off} {found:?}");
        assert!(found.votes);
    }
}

/// No closed form: against the weighted mean of two other routes.
#[test]
fn one_and_two_amplitudes_under_t_noise() {
    let by_others = |target: &Shared| {
        let settings = Nested { live_points: 600, ..Nested::default() };
        let nested = settings.estimate(&problem(target, None, None), &Watch::new()).unwrap();
        let stepping =
            SteppingStones::default().estimate(&problem(target, None, None), &Watch::new()).unwrap();
        oddwell_evidence::comparison::chosen(&[("nested", &nested), ("stepping", &stepping)]).unwrap()
    };
    let whole = Shared::new(&[0, 1, 2, 3], Some(12.0));
    let chain = chain(&whole);
    let expected = by_others(&whole);
    for (parameters, left) in [(vec![0], vec![1, 2, 3]), (vec![0, 1], vec![2, 3])] {
        let (log_evidence, error) = by_others(&Shared::new(&left, Some(12.0)));
        let values = vec![0.0; parameters.len()];
        let contained = Contained { parameters, values, log_evidence, error };
        let found = DensityRatio::default()
            .estimate(&problem(&whole, Some(&chain), Some(&contained)), &Watch::new())
            .unwrap();
        let off = found.log_evidence - expected.0;
        assert!(off.abs() < 3.0 * found.error.hypot(expected.1), "{off} {found:?}");
    }
}

/// Other widths of the prior, from the same draws, against the closed form with that prior.
#[test]
fn odds_at_other_widths() {
    let whole = Shared::new(&[0, 1, 2, 3], None);
    let chain = chain(&whole);
    let contained = Contained { parameters: vec![0, 1], values: vec![0.0; 2], log_evidence: 0.0, error: 0.0 };
    let densities = conditional_densities(
        &problem(&whole, Some(&chain), Some(&contained)),
        &contained,
        1000,
        &Watch::new(),
    )
    .unwrap();
    let curve = width_curve(&densities);
    let smaller = closed(&Shared::new(&[2, 3], None));
    for factor in [0.1f64, 1.0, 10.0] {
        let mut wider = Shared::new(&[0, 1, 2, 3], None);
        wider.priors = PriorSet::from_independent(vec![
            prior(3.0 * factor),
            prior(2.0 * factor),
            prior(1.0),
            prior(1.0),
        ]);
        let expected = closed(&wider) - smaller;
        let at = curve.factors.iter().position(|each| (each / factor - 1.0).abs() < 1e-9).unwrap();
        // The draws' own error at the width used is 0.02; far from it the weights of the nuisances vary a little more.
        assert!((curve.log_odds[at] - expected).abs() < 0.15, "{factor}: {} {expected}", curve.log_odds[at]);
    }
    // A vanishing width is the contained hypothesis, whatever the draws.
    assert!(curve.log_odds[0].abs() < 1e-3, "{}", curve.log_odds[0]);
}

#[test]
fn it_says_why_it_does_not_apply() {
    let whole = Shared::new(&[0, 1, 2, 3], None);
    let chain = chain(&whole);
    let reason = |chain: Option<&Chain>, contained: Option<&Contained>| match DensityRatio::default()
        .estimate(&problem(&whole, chain, contained), &Watch::new())
    {
        Err(EvidenceError::NotApplicable { estimator: "density_ratio", reason }) => reason,
        other => panic!("{other:?}"),
    };
    let contained = Contained { parameters: vec![0], values: vec![0.0], log_evidence: 0.0, error: 0.0 };
    assert!(reason(Some(&chain), None).contains("contains no hypothesis"));
    assert!(reason(None, Some(&contained)).contains("was not sampled"));
    // A point far out: 60 standard deviations of the posterior from where it lies, so no draw carries it.
    let far = Contained { values: vec![20.0], ..contained };
    let found =
        DensityRatio::default().estimate(&problem(&whole, Some(&chain), Some(&far)), &Watch::new()).unwrap();
    assert!(!found.votes && found.doubt.is_some(), "{found:?}");
}
