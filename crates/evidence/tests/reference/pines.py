"""Log evidences of the two regressions of pines.csv; see README.md."""
import pathlib

import numpy as np
from scipy.special import gammaln

TABLE = np.loadtxt(pathlib.Path(__file__).with_name("pines.csv"), delimiter=",", skiprows=1)
STRENGTH = TABLE[:, 0]
MEAN, COVARIANCE = np.array([3000.0, 185.0]), np.diag([1e6, 1e4])
SHAPE, RATE = 3.0, 2.0 * 300.0**2


def log_evidence(column):
    density = TABLE[:, column]
    design = np.column_stack([np.ones(len(density)), density - density.mean()])
    residual = STRENGTH - design @ MEAN
    spread = design @ COVARIANCE @ design.T

    def log_integrand(log_variance):
        variance = np.exp(log_variance)
        total = variance * np.eye(len(density)) + spread
        normal = -0.5 * residual @ np.linalg.solve(total, residual) - 0.5 * np.linalg.slogdet(2 * np.pi * total)[1]
        return normal + SHAPE * np.log(RATE) - gammaln(SHAPE) - SHAPE * log_variance - RATE / variance

    grid = np.linspace(np.log(2e4), np.log(1e6), 4001)
    values = np.array([log_integrand(point) for point in grid])
    return values.max() + np.log(np.trapezoid(np.exp(values - values.max()), grid))


first, second = log_evidence(1), log_evidence(2)
print("%.6f %.6f %.1f" % (first, second, np.exp(second - first)))
