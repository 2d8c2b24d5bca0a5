"""Freezes sample covariances (numpy.cov) and shrinkage weights, written out as in Pope & Szapudi (2008), sum by sum.

Writes mocks.csv beside itself.
"""

from pathlib import Path

import numpy as np

FOLDER = Path(__file__).parent
NUMBERS = lambda values: " ".join(repr(float(value)) for value in np.ravel(values))


def share(mocks, model):
    """lambda of Pope & Szapudi, Eq. 12, of rows in units of the model's standard deviations; plain sums."""
    scale = np.sqrt(np.diag(model))
    x = mocks / scale
    target = model / np.outer(scale, scale)
    count, size = x.shape
    mean = x.mean(axis=0)
    numerator = denominator = 0.0
    for i in range(size):
        for j in range(size):
            w = np.array([(x[k, i] - mean[i]) * (x[k, j] - mean[j]) for k in range(count)])
            s = count / (count - 1) * w.mean()
            numerator += count / (count - 1) ** 3 * ((w - w.mean()) ** 2).sum()
            denominator += (target[i, j] - s) ** 2
    return min(1.0, numerator / denominator)


def main():
    rng = np.random.default_rng(11)
    lines = []
    for rows, count, error in [(3, 5, 0.3), (6, 40, 0.5), (12, 9, 0.2), (5, 200, 0.0)]:
        root = rng.normal(size=(rows, rows + 4)) * np.exp(rng.normal(size=(rows, 1)))
        truth = root @ root.T / (rows + 4)
        mocks = 100.0 + rng.normal(size=(count, rows)) @ np.linalg.cholesky(truth).T
        model = truth + error * np.diag(np.diag(truth))
        name = f"{rows} rows {count} mocks"
        add = lambda quantity, values: lines.append(f"{name},{quantity},{NUMBERS(values)}")
        add("mocks", mocks)
        add("mean", mocks.mean(axis=0))
        add("covariance", np.cov(mocks, rowvar=False))
        add("model", model)
        add("share", [share(mocks, model)])
    (FOLDER / "mocks.csv").write_text("case,quantity,numbers\n" + "\n".join(lines) + "\n")


if __name__ == "__main__":
    main()
