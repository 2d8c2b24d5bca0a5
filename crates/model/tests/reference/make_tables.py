"""Hankel transforms of a matter spectrum by SciPy's FFTLog, for the tests of oddwell-model.

Run `python make_tables.py` in this folder (versions: README.md). It rewrites hankel.csv. Nothing here shares code with
the crates: the transfer function of Eisenstein & Hu 1998 (equations 2 to 24) is written out again.
"""

import csv

import numpy as np
from scipy.fft import fht

OMEGA_M, OMEGA_B, H, N_S, SIGMA8, DAMPING = 0.31, 0.049, 0.68, 0.965, 0.81, 1.0


def transfer(wavenumber):
    k = wavenumber * H
    m, b, share, th = OMEGA_M * H**2, OMEGA_B * H**2, OMEGA_B / OMEGA_M, 2.7255 / 2.7
    z_eq, k_eq = 2.50e4 * m * th**-4, 7.46e-2 * m * th**-2
    b1, b2 = 0.313 * m**-0.419 * (1 + 0.607 * m**0.674), 0.238 * m**0.223
    z_d = 1291 * m**0.251 / (1 + 0.659 * m**0.828) * (1 + b1 * b**b2)
    r_d, r_eq = (31.5 * b * th**-4 * (z / 1000) ** -1 for z in (z_d, z_eq))
    s = 2 / (3 * k_eq) * np.sqrt(6 / r_eq) * np.log((np.sqrt(1 + r_d) + np.sqrt(r_d + r_eq)) / (1 + np.sqrt(r_eq)))
    k_silk = 1.6 * b**0.52 * m**0.73 * (1 + (10.4 * m) ** -0.95)
    q = k / (13.41 * k_eq)
    alpha_c = ((46.9 * m) ** 0.670 * (1 + (32.1 * m) ** -0.532)) ** -share
    alpha_c *= ((12.0 * m) ** 0.424 * (1 + (45.0 * m) ** -0.582)) ** -(share**3)
    b1, b2 = 0.944 / (1 + (458 * m) ** -0.708), (0.395 * m) ** -0.0266
    beta_c = 1 / (1 + b1 * ((1 - share) ** b2 - 1))

    def t0(alpha, beta):
        log = np.log(np.e + 1.8 * beta * q)
        return log / (log + (14.2 / alpha + 386 / (1 + 69.9 * q**1.08)) * q**2)

    f = 1 / (1 + (k * s / 5.4) ** 4)
    dark = f * t0(1, beta_c) + (1 - f) * t0(alpha_c, beta_c)
    y = (1 + z_eq) / (1 + z_d)
    g = y * (-6 * np.sqrt(1 + y) + (2 + 3 * y) * np.log((np.sqrt(1 + y) + 1) / (np.sqrt(1 + y) - 1)))
    alpha_b = 2.07 * k_eq * s * (1 + r_d) ** -0.75 * g
    beta_node, beta_b = 8.41 * m**0.435, 0.5 + share + (3 - 2 * share) * np.sqrt((17.2 * m) ** 2 + 1)
    s_tilde = s / (1 + (beta_node / (k * s)) ** 3) ** (1 / 3)
    baryon = t0(1, 1) / (1 + (k * s / 5.2) ** 2)
    baryon = baryon + alpha_b / (1 + (beta_b / (k * s)) ** 3) * np.exp(-((k / k_silk) ** 1.4))
    return share * baryon * np.sinc(k * s_tilde / np.pi) + (1 - share) * dark


def spectrum(k):
    """P(k) for sigma8, by the trapezium rule in ln k over 1e-6 to 1e3 h/Mpc."""
    log = np.linspace(np.log(1e-6), np.log(1e3), 2_000_001)
    x = 8 * np.exp(log)
    window = np.where(x < 0.05, 1 - x**2 / 10 + x**4 / 280, 3 * (np.sin(x) - x * np.cos(x)) / x**3)
    shape = np.exp(N_S * log) * transfer(np.exp(log)) ** 2
    variance = np.trapezoid(np.exp(3 * log) / (2 * np.pi**2) * shape * window**2, log)
    return SIGMA8**2 / variance * k**N_S * transfer(k) ** 2


def transform(power, order, size):
    """Separations and the integral of k^2 dk/2pi^2 k^power P exp(-k^2 damping^2) j_order(ks), size points from 1e-7 to 1e3."""
    k = np.geomspace(1e-7, 1e3, size)
    step = np.log(k[1] / k[0])
    # Reciprocal grids whatever the number of points, so that a finer one shares the separations of a coarser one. (A
    # shift against ringing at the ends is not needed: the integrand vanishes there.)
    s = 1 / k[::-1]
    damped = spectrum(k) * np.exp(-((k * DAMPING) ** 2))
    # j = sqrt(pi/2x) J, and fht is the integral of a(k) J(ks) s dk.
    image = fht(k ** (1.5 + power) * damped, step, order + 0.5, offset=0.0, bias=0.0)
    return s, np.sqrt(np.pi / 2) * s**-1.5 * image / (2 * np.pi**2)


def main():
    rows = []
    for power, order in ((0, 0), (0, 2), (0, 4), (-1, 1), (-1, 3)):
        s, fine = transform(power, order, 65537)
        # Half the points: every second separation is shared.
        half, coarse = transform(power, order, 32769)
        inside = np.flatnonzero((half > 20) & (half < 150))
        chosen = inside[np.linspace(0, len(inside) - 1, 14).astype(int)]
        scale = abs(coarse[inside]).max()
        for index in chosen:
            other = np.argmin(abs(s / half[index] - 1))
            assert abs(s[other] / half[index] - 1) < 1e-9, "the grids share these separations"
            assert abs(fine[other] - coarse[index]) < 1e-8 * scale, (power, order, half[index])
            rows.append((power, order, repr(float(s[other])), repr(float(fine[other]))))
    with open("hankel.csv", "w", newline="") as file:
        writer = csv.writer(file, lineterminator="\n")
        writer.writerow(("power", "order", "separation", "transform"))
        writer.writerows(rows)


main()
