"""Writes joint.csv: log densities of multivariate normals, from SciPy. Run: python joint.py > joint.csv"""
import numpy as np
from scipy import stats

CASES = [
    ([0.5, -1.0], [[1.0, 0.9], [0.9, 1.0]]),
    ([2.0, 0.0, 100.0], [[4.0, 1.0, -3.0], [1.0, 2.0, 0.5], [-3.0, 0.5, 25.0]]),
    ([0.81, 0.31], [[1e-4, -3e-5], [-3e-5, 1.44e-4]]),
]
random = np.random.default_rng(5)
print("mean,covariance,at,value")
for mean, covariance in CASES:
    made = stats.multivariate_normal(mean, covariance)
    for width in (0.3, 1.0, 4.0):
        at = np.asarray(mean) + width * np.sqrt(np.diag(covariance)) * random.standard_normal(len(mean))
        text = [" ".join(repr(float(v)) for v in np.ravel(part)) for part in (mean, covariance, at)]
        print(",".join([*text, repr(float(made.logpdf(at)))]))
