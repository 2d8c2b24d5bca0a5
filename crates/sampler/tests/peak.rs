//! The peak search, on posteriors whose peak and curvature are known.

#![allow(clippy::unwrap_used, clippy::panic, reason = "test helpers may stop where they fail")]

mod common;

use common::{Gaussian, Simple, flat, rosenbrock};
use nalgebra::DMatrix;
use oddwell_sampler::{
    EvaluationFailure, JointNormal, PeakSettings, PriorSet, SamplerError, Target, build_prior, find_peak,
};

fn prior(key: &str, numbers: &[f64]) -> oddwell_sampler::SharedPrior {
    build_prior(key, numbers, None).unwrap()
}

/// Point within a hundredth of a standard deviation, log posterior within the promised 1e-6, covariance within 1 % of
/// √(Cᵢᵢ Cⱼⱼ): a quadratic has no truncation error, so rounding at a condition number of 1e4 is all there is.
#[test]
fn a_gaussian_is_found_exactly() {
    for dimension in [1, 2, 10, 30] {
        let gaussian = Gaussian::new(dimension, 1e4, 8);
        let target =
            Simple { priors: flat(dimension, -40.0, 40.0), likelihood: |x: &[f64]| gaussian.log_density(x) };
        let peak = find_peak(&target, &target.priors, &PeakSettings::default()).unwrap();
        assert!(peak.polished && !peak.bounded_by_prior && peak.at_edge.is_empty());
        assert!(peak.log_likelihood > -1e-6, "{}", peak.log_likelihood);
        for i in 0..dimension {
            let width = gaussian.covariance[(i, i)].sqrt();
            assert!((peak.point[i] - gaussian.mean[i]).abs() < 0.01 * width);
            for j in 0..dimension {
                let scale = width * gaussian.covariance[(j, j)].sqrt();
                let off = (peak.covariance[(i, j)] - gaussian.covariance[(i, j)]).abs() / scale;
                assert!(off < 0.01, "{i}, {j} of {dimension}: {off}");
            }
        }
    }
}

/// Along the curved valley from far away; the Hessian of x at the peak (1, 1) is known.
#[test]
fn a_curved_valley_is_followed() {
    let target = Simple { priors: flat(2, -200.0, 400.0), likelihood: rosenbrock };
    let peak = find_peak(&target, &target.priors, &PeakSettings::default()).unwrap();
    assert!((peak.point[0] - 1.0).abs() < 0.01 && (peak.point[1] - 1.0).abs() < 0.02, "{:?}", peak.point);
    // −∂²: [[0.1 + 40, −20], [−20, 10]], inverse [[10, 20], [20, 40.1]]. Steps of a tenth of a width see the fourth derivative.
    let wanted = DMatrix::from_row_slice(2, 2, &[10.0, 20.0, 20.0, 40.1]);
    assert!((&peak.covariance - &wanted).abs().max() < 0.05 * 40.1, "{}", peak.covariance);
}

/// Normal likelihoods under a correlated normal prior: C⁻¹ = C₀⁻¹ + S⁻¹.
#[test]
fn a_joint_prior_counts() {
    let joint = JointNormal::new(vec![0, 1], &[0.0, 0.0], &[vec![1.0, 0.9], vec![0.9, 1.0]]).unwrap();
    let target = Simple {
        priors: PriorSet::new(2, vec![], vec![joint]).unwrap(),
        likelihood: |x: &[f64]| -0.5 * (x[0] - 2.0).powi(2) / 0.25,
    };
    let peak = find_peak(&target, &target.priors, &PeakSettings::default()).unwrap();
    // Var x0 = 1/(1 + 4), ⟨x0⟩ = 8/5; x1 = 0.9 x0 ± √0.19.
    let wanted = DMatrix::from_row_slice(2, 2, &[0.2, 0.18, 0.18, 0.81 * 0.2 + 0.19]);
    assert!((peak.point[0] - 1.6).abs() < 1e-3 && (peak.point[1] - 1.44).abs() < 1e-3, "{:?}", peak.point);
    assert!((&peak.covariance - wanted).abs().max() < 1e-3);
    assert!(
        (peak.log_posterior - target.priors.log_density(&peak.point) - peak.log_likelihood).abs() < 1e-12
    );
}

/// The likelihood pulls two coordinates over their edges: both are pinned there, the third is free.
#[test]
fn an_edge_is_touched() {
    let priors = PriorSet::from_independent(vec![
        prior("uniform", &[0.0, 1.0]),
        prior("half_normal", &[1.0]),
        prior("normal", &[0.0, 1.0]),
    ]);
    let likelihood = |x: &[f64]| {
        -0.5 * ((x[0] - 1.3) / 0.1).powi(2) - 0.5 * ((x[1] + 0.5) / 0.5).powi(2) - 0.5 * (x[2] - 1.0).powi(2)
    };
    let target = Simple { priors, likelihood };
    let peak = find_peak(&target, &target.priors, &PeakSettings::default()).unwrap();
    assert_eq!(peak.at_edge, vec![0, 1]);
    assert_eq!(&peak.point[..2], [1.0, 0.0]);
    assert!((peak.point[2] - 0.5).abs() < 1e-3);
    assert!((peak.covariance[(2, 2)] - 0.5).abs() < 0.005);
    // The log posterior falls by ½ where 30 d + 50 d² = ½ and 2 d + 2.5 d² = ½; found to a tenth.
    for (at, wanted) in [(0, 0.016_23), (1, 0.2)] {
        let width = peak.covariance[(at, at)].sqrt();
        assert!((width / wanted - 1.0).abs() < 0.1, "{at}: {width}");
    }
}

/// A direction that neither prior nor likelihood curve gets the prior's spread, and is reported.
#[test]
fn a_flat_direction_is_bounded_by_the_prior() {
    let target = Simple { priors: flat(2, -1.0, 1.0), likelihood: |x: &[f64]| -0.5 * (x[0] / 0.01).powi(2) };
    let peak = find_peak(&target, &target.priors, &PeakSettings::default()).unwrap();
    assert!(peak.bounded_by_prior);
    assert!((peak.covariance[(0, 0)].sqrt() - 0.01).abs() < 1e-4);
    let width = peak.covariance[(1, 1)].sqrt();
    assert!(width > 0.5 && width < 3.0, "{width}");
}

struct Broken(fn(&[f64]) -> Result<f64, EvaluationFailure>);

impl Target for Broken {
    type Scratch = ();
    fn dimension(&self) -> usize {
        1
    }
    fn scratch(&self) {}
    fn log_prior(&self, point: &[f64]) -> f64 {
        flat(1, 0.0, 1.0).log_density(point)
    }
    fn log_likelihood(&self, point: &[f64], _: &mut ()) -> Result<f64, EvaluationFailure> {
        self.0(point)
    }
}

#[test]
fn half_of_the_prior_may_have_no_answer() {
    let target = Broken(|x| {
        if x[0] > 0.4 {
            Err(EvaluationFailure::Rejected { reason: "no distance".to_owned() })
        } else {
            Ok(-0.5 * ((x[0] - 0.3) / 0.05).powi(2))
        }
    });
    let peak = find_peak(&target, &flat(1, 0.0, 1.0), &PeakSettings::default()).unwrap();
    assert!((peak.point[0] - 0.3).abs() < 1e-4, "{:?}", peak.point);
    assert!((peak.covariance[(0, 0)].sqrt() - 0.05).abs() < 5e-4);
}

#[test]
fn a_target_without_an_answer_is_refused() {
    let target = Broken(|_| Err(EvaluationFailure::Rejected { reason: "no distance".to_owned() }));
    let error = find_peak(&target, &flat(1, 0.0, 1.0), &PeakSettings::default()).unwrap_err();
    assert_eq!(
        error.to_string(),
        "sampling: none of 1001 draws of the prior has a finite likelihood (no distance); move the priors to where the model has an answer"
    );
    let target = Broken(|_| Err(EvaluationFailure::Fatal { reason: "table lost".to_owned() }));
    let error = find_peak(&target, &flat(1, 0.0, 1.0), &PeakSettings::default()).unwrap_err();
    assert!(
        matches!(error, SamplerError::Evaluation { reason, partial: None, .. } if reason == "table lost")
    );
    let error = find_peak(&target, &flat(2, 0.0, 1.0), &PeakSettings::default()).unwrap_err();
    assert!(matches!(error, SamplerError::Dimension { target: 1, prior: 2 }));
}
