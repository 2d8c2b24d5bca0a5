"""Freezes log-densities, chi-squares, p-values and Fisher quantities from SciPy, NumPy and mpmath.

Writes densities.csv, p_values.csv and fisher.csv beside itself. Problems are drawn from a fixed seed and written with
17 significant digits, so that what Rust reads is what SciPy saw.
"""

from pathlib import Path

import numpy as np
from mpmath import matrix, mp, mpf
from scipy.stats import chi2, f, multivariate_normal, multivariate_t

mp.dps = 50
FOLDER = Path(__file__).parent
NUMBERS = lambda values: " ".join(repr(float(value)) for value in np.ravel(values))


def problem(rng, rows, condition):
    """Data, prediction and a covariance whose correlations have about this condition number."""
    rotation, _ = np.linalg.qr(rng.normal(size=(rows, rows)))
    eigenvalues = np.geomspace(1.0, 1.0 / condition, rows) if rows > 1 else np.ones(1)
    scale = np.exp(rng.normal(size=rows))
    covariance = (rotation * eigenvalues) @ rotation.T * np.outer(scale, scale)
    covariance = 0.5 * (covariance + covariance.T)
    prediction = rng.normal(size=rows)
    data = prediction + np.linalg.cholesky(covariance) @ rng.normal(size=rows)
    return data, prediction, covariance


def exact_chi_squared(data, prediction, covariance):
    """In 50 digits, from the very doubles that are written."""
    residual = matrix([mpf(float(a)) - mpf(float(b)) for a, b in zip(data, prediction)])
    exact = matrix([[mpf(float(entry)) for entry in row] for row in covariance])
    return (residual.T * mp.lu_solve(exact, residual))[0], mp.log(mp.det(exact))


def percival_exponent(mocks, rows, determined):
    spare = mpf(mocks - rows)
    b = (spare - 2) / ((spare - 1) * (spare - 4))
    return determined + 2 + (mocks - 1 + b * (rows - determined)) / (1 + b * (rows - determined))


def densities():
    rng = np.random.default_rng(20240229)
    lines = []
    for rows, condition, mocks, determined in [
        (1, 1.0, 9, 1), (2, 3.0, 12, 1), (5, 1e2, 40, 3), (12, 1e3, 60, 6), (26, 1e4, 600, 8), (26, 1e2, 40, 20),
        (40, 1e2, 46, 1),
    ]:
        name = f"{rows} rows, {mocks} mocks"
        data, prediction, covariance = problem(rng, rows, condition)
        chi_squared, log_determinant = exact_chi_squared(data, prediction, covariance)
        add = lambda quantity, values: lines.append(f"{name.replace(',', '')},{quantity},{NUMBERS(values)}")
        add("data", data)
        add("prediction", prediction)
        add("covariance", covariance)
        add("mocks", [mocks])
        add("determined", [determined])
        add("chi_squared", [chi_squared])
        add("log_determinant", [log_determinant])
        add("gaussian", [multivariate_normal.logpdf(data, prediction, covariance)])
        inflation = (mocks - 1) / (mocks - rows - 2)
        add("hartlap", [multivariate_normal.logpdf(data, prediction, covariance * inflation)])
        # Sellentin & Heavens' density is a multivariate t: nu = n_s - n_d, shape C (n_s - 1)/nu.
        nu = mocks - rows
        add("t", [multivariate_t.logpdf(data, prediction, covariance * (mocks - 1) / nu, nu)])
        p = percival_exponent(mocks, rows, determined)
        if p > rows:
            nu = float(p - rows)
            add("percival", [multivariate_t.logpdf(data, prediction, covariance * (mocks - 1) / nu, nu)])
        else:
            # No density: -(p/2) ln[1 + chi2/(n_s - 1)] alone.
            add("percival_without_constant", [-p / 2 * mp.log(1 + chi_squared / (mocks - 1))])
    (FOLDER / "densities.csv").write_text("case,quantity,numbers\n" + "\n".join(lines) + "\n")


def p_values():
    lines = []
    for chi_squared in [0.0, 1e-3, 0.7, 5.0, 26.0, 61.3, 180.0, 700.0]:
        for dof in [1.0, 2.0, 17.36, 26.0, 254.5]:
            lines.append((chi_squared, dof, "", chi2.sf(chi_squared, dof)))
            for mocks in [40, 300, 2000]:
                if mocks > dof:
                    # Hotelling: chi2 (n_s - nu)/[nu (n_s - 1)] ~ F(nu, n_s - nu).
                    ratio = chi_squared * (mocks - dof) / (dof * (mocks - 1))
                    lines.append((chi_squared, dof, mocks, f.sf(ratio, dof, mocks - dof)))
    text = "\n".join(f"{a!r},{b!r},{c},{float(d)!r}" for a, b, c, d in lines)
    (FOLDER / "p_values.csv").write_text("chi_squared,degrees_of_freedom,mocks,p_value\n" + text + "\n")


def fisher():
    """Information, effective number of parameters and expected sds of a problem with priors on some parameters."""
    rng = np.random.default_rng(7)
    rows, parameters = 14, 5
    _, _, covariance = problem(rng, rows, 50.0)
    jacobian = rng.normal(size=(rows, parameters)) * np.array([1.0, 1e3, 1e-3, 5.0, 0.2])
    information = jacobian.T @ np.linalg.solve(covariance, jacobian)
    root = rng.normal(size=(2, 2))
    prior = np.zeros((parameters, parameters))
    prior[:2, :2] = root @ root.T * np.sqrt(np.outer(np.diag(information)[:2], np.diag(information)[:2]))
    prior[3, 3] = 4.0
    posterior = np.linalg.inv(information + prior)
    entries = {
        "covariance": covariance,
        "jacobian": jacobian,
        "prior": prior,
        "information": information,
        "effective_parameters": [np.trace(information @ posterior)],
        "standard_deviations": np.sqrt(np.diag(posterior)),
        "projection": [jacobian[:, 0] @ np.linalg.solve(covariance, jacobian[:, 3])],
    }
    lines = [f"{quantity},{NUMBERS(values)}" for quantity, values in entries.items()]
    (FOLDER / "fisher.csv").write_text("quantity,numbers\n" + "\n".join(lines) + "\n")


if __name__ == "__main__":
    densities()
    p_values()
    fisher()
