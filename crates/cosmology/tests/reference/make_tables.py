"""Reference values for the tests of oddwell-cosmology, from libraries and from formulas written out again.

Run `python make_tables.py` in this folder (versions: README.md). It rewrites the CSV files beside it. Nothing here
shares code with the crate.
"""

import csv

import mpmath as mp
import numpy as np
from astropy.cosmology import w0waCDM
from scipy.integrate import quad, solve_ivp
from scipy.interpolate import CubicSpline
from scipy.special import hyp2f1

HUBBLE_DISTANCE = 2997.92458


def write(name, header, rows):
    with open(name, "w", newline="") as file:
        writer = csv.writer(file, lineterminator="\n")
        writer.writerow(header)
        for row in rows:
            writer.writerow([value if isinstance(value, str) else repr(float(value)) for value in row])


# Backgrounds: omega_m, omega_k, w0, wa.
BACKGROUNDS = [
    (1.0, 0.0, -1.0, 0.0),
    (0.31, 0.0, -1.0, 0.0),
    (0.27, 0.0, -0.9, 0.3),
    (0.35, 0.0, -1.1, -0.4),
    (0.30, 0.08, -1.0, 0.0),
    (0.32, -0.06, -0.95, 0.1),
    (0.25, 0.2, -0.8, -0.3),
]


def distances():
    """astropy: distances in Mpc for H0 = 100, that is, in Mpc/h; no radiation (Tcmb0 = 0)."""
    rows = []
    for omega_m, omega_k, w0, wa in BACKGROUNDS:
        cosmology = w0waCDM(
            H0=100.0, Om0=omega_m, Ode0=1.0 - omega_m - omega_k, w0=w0, wa=wa, Tcmb0=0.0, Neff=0.0
        )
        for z in (0.05, 0.35, 1.0, 2.5, 6.0, 10.0):
            rows.append((
                omega_m, omega_k, w0, wa, z,
                cosmology.comoving_distance(z).value,
                cosmology.comoving_transverse_distance(z).value,
                cosmology.efunc(z),
                cosmology.Om(z),
                cosmology.Ode(z),
            ))
    write("distances.csv",
          ["omega_m", "omega_k", "w0", "wa", "z", "comoving", "transverse", "expansion", "matter_fraction",
           "dark_energy_fraction"], rows)


def growth_closed_form():
    """Heath 1977 (Mon. Not. R. Astron. Soc. 179, 351): D = H ∫da/(aH)³ up to a factor. For matter and a cosmological constant
    and with D → a early this is a 2F1(1/3, 1; 11/6; -x), x = (1 - omega_m)/omega_m a³; f = 1 - (6x/11) F2/F, with
    F2 = 2F1(4/3, 2; 17/6; -x). The hypergeometric functions are SciPy's; Heath's integral checks them here."""
    rows = []
    for omega_m in (0.2, 0.31, 0.6):
        for a in (0.05, 0.2, 0.4, 0.5, 2.0 / 3.0, 0.8, 1.0):
            x = (1.0 - omega_m) / omega_m * a**3
            f0 = hyp2f1(1.0 / 3.0, 1.0, 11.0 / 6.0, -x)
            f2 = hyp2f1(4.0 / 3.0, 2.0, 17.0 / 6.0, -x)
            growth = a * f0
            hubble = lambda b: np.sqrt(omega_m / b**3 + 1.0 - omega_m)
            heath = 2.5 * omega_m * hubble(a) * quad(lambda b: (b * hubble(b)) ** -3, 0.0, a, epsabs=0, epsrel=1e-12)[0]
            assert abs(heath / growth - 1.0) < 1e-11, (heath, growth)
            rows.append((omega_m, a, growth, 1.0 - 6.0 * x / 11.0 * f2 / f0))
    write("growth_closed_form.csv", ["omega_m", "a", "growth", "rate"], rows)


def expansion(background, a):
    """E² and d ln E/d ln a."""
    omega_m, omega_k, w0, wa = background
    omega_de = 1.0 - omega_m - omega_k
    dark = omega_de * a ** (-3.0 * (1.0 + w0 + wa)) * np.exp(-3.0 * wa * (1.0 - a))
    square = omega_m * a**-3 + omega_k * a**-2 + dark
    slope = (-3.0 * omega_m * a**-3 - 2.0 * omega_k * a**-2
             - 3.0 * (1.0 + w0 + wa * (1.0 - a)) * dark) / (2.0 * square)
    return square, slope, dark


def growth_integrated():
    """The growth equation by SciPy's solve_ivp from D = D' = a at a = 0.001, in D itself, for
    G = 1 + tau * omega_de(a)/omega_de(1)."""
    rows = []
    for background in BACKGROUNDS[1:]:
        omega_m, omega_k = background[0], background[1]
        today = 1.0 - omega_m - omega_k
        for tau in (0.0, 0.3, -0.5):
            def slope(x, y):
                a = np.exp(x)
                square, bend, dark = expansion(background, a)
                pull = 1.5 * omega_m * a**-3 / square * (1.0 + tau * dark / square / today)
                return [y[1], pull * y[0] - (2.0 + bend) * y[1]]
            points = np.array([0.02, 0.3, 0.5, 0.75, 1.0])
            solution = solve_ivp(slope, (np.log(1e-3), 0.0), [1e-3, 1e-3], method="DOP853", rtol=1e-12, atol=1e-20,
                                 max_step=0.05)
            # Ends of integrations, not interpolated values: the interpolation is of lower order.
            for a in points:
                end = solve_ivp(slope, (np.log(1e-3), np.log(a)), [1e-3, 1e-3], method="DOP853", rtol=1e-12,
                                atol=1e-20, max_step=0.05).y[:, -1]
                bent = slope(np.log(a), end)[1]
                rate = end[1] / end[0]
                rows.append((*background, tau, a, end[0], rate, bent / end[0] - rate**2))
            assert abs(solution.y[0, -1] / rows[-1][6] - 1.0) < 1e-12
    write("growth_integrated.csv", ["omega_m", "omega_k", "w0", "wa", "tau", "a", "growth", "rate", "rate_slope"], rows)


def bessel():
    """j_l(x) = sqrt(pi/2x) J_(l+1/2)(x) with 40 digits, by mpmath."""
    mp.mp.dps = 40
    rows = []
    for text in ("1e-6", "0.001", "0.03", "0.3", "1", "1.7", "2.5", "2.99", "3", "3.01", "4.2", "5", "7.7", "10", "31.4",
                 "100", "1234.5"):
        x = mp.mpf(float(text))  # the double that the test will read
        rows.append([text] + [mp.nstr(mp.sqrt(mp.pi / (2 * x)) * mp.besselj(order + mp.mpf(1) / 2, x), 20)
                              for order in range(5)])
    write("bessel.csv", ["x", "j0", "j1", "j2", "j3", "j4"], rows)


# Transfer functions: omega_m, omega_b, h.
DENSITIES = [(0.31, 0.049, 0.68), (0.26, 0.044, 0.72), (0.4, 0.12, 0.6), (0.9, 0.03, 0.5)]


def eisenstein_hu(omega_m, omega_b, h, wavenumber):
    """Eisenstein & Hu 1998, equations 2 to 24, with 30 digits, in the paper's order and its own names; k in 1/Mpc inside."""
    om, ob = omega_m * h**2, omega_b * h**2
    th = mp.mpf("2.7255") / mp.mpf("2.7")
    n = mp.mpf
    k = wavenumber * h
    z_eq = n("2.50e4") * om * th**-4
    k_eq = n("7.46e-2") * om * th**-2
    b1 = n("0.313") * om ** n("-0.419") * (1 + n("0.607") * om ** n("0.674"))
    b2 = n("0.238") * om ** n("0.223")
    z_d = 1291 * om ** n("0.251") / (1 + n("0.659") * om ** n("0.828")) * (1 + b1 * ob**b2)
    r_d = n("31.5") * ob * th**-4 * (z_d / 1000) ** -1
    r_eq = n("31.5") * ob * th**-4 * (z_eq / 1000) ** -1
    s = (2 / (3 * k_eq) * mp.sqrt(6 / r_eq)
         * mp.log((mp.sqrt(1 + r_d) + mp.sqrt(r_d + r_eq)) / (1 + mp.sqrt(r_eq))))
    k_silk = n("1.6") * ob ** n("0.52") * om ** n("0.73") * (1 + (n("10.4") * om) ** n("-0.95"))
    q = k / (n("13.41") * k_eq)
    a1 = (n("46.9") * om) ** n("0.670") * (1 + (n("32.1") * om) ** n("-0.532"))
    a2 = (n("12.0") * om) ** n("0.424") * (1 + (n("45.0") * om) ** n("-0.582"))
    share = omega_b / omega_m
    alpha_c = a1**-share * a2 ** -(share**3)
    b1 = n("0.944") * (1 + (458 * om) ** n("-0.708")) ** -1
    b2 = (n("0.395") * om) ** n("-0.0266")
    beta_c = 1 / (1 + b1 * ((1 - share) ** b2 - 1))

    def t0(alpha, beta):
        c = n("14.2") / alpha + 386 / (1 + n("69.9") * q ** n("1.08"))
        log = mp.log(mp.e + n("1.8") * beta * q)
        return log / (log + c * q**2)

    f = 1 / (1 + (k * s / n("5.4")) ** 4)
    t_c = f * t0(1, beta_c) + (1 - f) * t0(alpha_c, beta_c)
    y = (1 + z_eq) / (1 + z_d)
    g = y * (-6 * mp.sqrt(1 + y) + (2 + 3 * y) * mp.log((mp.sqrt(1 + y) + 1) / (mp.sqrt(1 + y) - 1)))
    alpha_b = n("2.07") * k_eq * s * (1 + r_d) ** n("-0.75") * g
    beta_node = n("8.41") * om ** n("0.435")
    beta_b = n("0.5") + share + (3 - 2 * share) * mp.sqrt((n("17.2") * om) ** 2 + 1)
    s_tilde = s / (1 + (beta_node / (k * s)) ** 3) ** (n(1) / 3)
    t_b = (t0(1, 1) / (1 + (k * s / n("5.2")) ** 2)
           + alpha_b / (1 + (beta_b / (k * s)) ** 3) * mp.exp(-((k / k_silk) ** n("1.4"))))
    t_b *= mp.sin(k * s_tilde) / (k * s_tilde)
    return share * t_b + (1 - share) * t_c


def eisenstein_hu_smooth(omega_m, omega_b, h, wavenumber):
    """Eisenstein & Hu 1998, equations 26 and 28 to 31."""
    n = mp.mpf
    om, ob, share = omega_m * h**2, omega_b * h**2, omega_b / omega_m
    th = n("2.7255") / n("2.7")
    s = n("44.5") * mp.log(n("9.83") / om) / mp.sqrt(1 + 10 * ob ** n("0.75"))
    alpha = 1 - n("0.328") * mp.log(431 * om) * share + n("0.38") * mp.log(n("22.3") * om) * share**2
    gamma = omega_m * h * (alpha + (1 - alpha) / (1 + (n("0.43") * wavenumber * h * s) ** 4))
    q = wavenumber * th**2 / gamma
    log = mp.log(2 * mp.e + n("1.8") * q)
    return log / (log + (n("14.2") + 731 / (1 + n("62.5") * q)) * q**2)


def transfer():
    mp.mp.dps = 30
    rows = []
    for densities in DENSITIES:
        exact = [mp.mpf(value) for value in densities]
        for k in (1e-5, 1e-3, 0.01, 0.03, 0.07, 0.12, 0.2, 0.5, 1.0, 5.0, 40.0):
            rows.append([repr(value) for value in densities] + [repr(k)]
                        + [mp.nstr(fit(*exact, mp.mpf(k)), 18) for fit in (eisenstein_hu, eisenstein_hu_smooth)])
    write("transfer.csv", ["omega_m", "omega_b", "h", "k", "wiggles", "smooth"], rows)


def window_square(x):
    if x < 0.05:
        return (1.0 - x**2 / 10.0 + x**4 / 280.0) ** 2
    return (3.0 * (np.sin(x) - x * np.cos(x)) / x**3) ** 2


def pieces(low, high):
    """Edges between which an integrand with wiggles of the sound horizon and of the window is tame."""
    edges = [low]
    while edges[-1] < high:
        edges.append(min(edges[-1] * 1.5, edges[-1] + 0.04, high))
    return edges


def integrate(function, low, high):
    edges = pieces(low, high)
    return sum(quad(function, a, b, epsabs=0, epsrel=1e-11)[0] for a, b in zip(edges, edges[1:]))


def variance(power, low, high):
    return integrate(lambda k: k**2 / (2 * np.pi**2) * power(k) * window_square(8.0 * k), low, high)


def numpy_fit(fit, densities):
    """The formulas above in double precision, through mpmath's own fast context."""
    context = mp.fp
    names = dict(fit.__globals__)

    class Double:
        mpf = staticmethod(float)
        sqrt, log, exp, sin, e = context.sqrt, context.log, context.exp, context.sin, context.e

    names["mp"] = Double
    clone = type(fit)(fit.__code__, names)
    return lambda k: clone(*densities, k)


def power():
    """P(k) normalised to sigma8 by SciPy's adaptive quadrature over 1e-6 to 60 h/Mpc."""
    rows = []
    for densities, n_s, sigma8 in ((DENSITIES[0], 0.965, 0.81), (DENSITIES[1], 1.0, 0.75), (DENSITIES[2], 0.93, 0.9)):
        for name, fit in (("wiggles", eisenstein_hu), ("smooth", eisenstein_hu_smooth)):
            transfer_of = numpy_fit(fit, densities)
            shape = lambda k: k**n_s * transfer_of(k) ** 2
            scale = sigma8**2 / variance(shape, 1e-6, 60.0)
            for k in (1e-4, 0.02, 0.1, 0.7, 6.0):
                rows.append((name, *densities, n_s, sigma8, k, scale * shape(k)))
    write("power.csv", ["shape", "omega_m", "omega_b", "h", "n_s", "sigma8", "k", "power"], rows)


def table():
    """A table of the power, splined by SciPy's CubicSpline (not-a-knot, its default) in logarithms, rescaled to sigma8 over
    the table's own range."""
    k = np.concatenate([np.geomspace(2e-4, 0.01, 9), np.geomspace(0.013, 0.6, 40), np.geomspace(0.8, 25.0, 12)])
    transfer_of = numpy_fit(eisenstein_hu, DENSITIES[0])
    p = np.array([3e6 * value**0.97 * transfer_of(value) ** 2 for value in k])
    write("table.csv", ["k", "power"], zip(k, p))
    spline = CubicSpline(np.log(k), np.log(p))
    shape = lambda value: np.exp(spline(np.log(value)))
    edges = np.unique(np.concatenate([k] + [np.linspace(a, b, 2 + int((b - a) / 0.2)) for a, b in zip(k, k[1:])]))
    total = sum(quad(lambda v: v**2 / (2 * np.pi**2) * shape(v) * window_square(8.0 * v), a, b, epsabs=0, epsrel=1e-11)[0]
                for a, b in zip(edges, edges[1:]))
    scale = 0.81**2 / total
    points = [2e-4, 2.3e-4, 1e-3, 0.0095, 0.05, 0.11, 0.3, 0.9, 3.0, 20.0, 25.0]
    write("table_power.csv", ["k", "raw", "normalised"], [(v, shape(v), scale * shape(v)) for v in points])


def clocks():
    """The clock contrast for T = 1, matter growing as in general relativity, by SciPy's adaptive quadrature."""
    omega_m, omega_b, h, n_s, sigma8, damping = 0.31, 0.049, 0.68, 0.965, 0.81, 0.5
    transfer_of = numpy_fit(eisenstein_hu, (omega_m, omega_b, h))
    shape = lambda k: k**n_s * transfer_of(k) ** 2
    scale = sigma8**2 / variance(shape, 1e-6, 60.0)

    def growth(a):
        x = (1.0 - omega_m) / omega_m * a**3
        return a * hyp2f1(1.0 / 3.0, 1.0, 11.0 / 6.0, -x)

    rows = []
    for distance, z, low, high in ((50.0, 0.5, 0.01, 0.2), (50.0, 0.0, 0.02, 0.15), (34.0, 1.0, 0.005, 0.3)):
        a = 1.0 / (1.0 + z)
        square = omega_m / a**3 + 1.0 - omega_m
        potential = 1.5 * omega_m / a**3 / square * (a / HUBBLE_DISTANCE) ** 2 * square
        amplitude = scale * (growth(a) / growth(1.0)) ** 2

        def integrand(k):
            x = k * distance
            apart = x**2 / 6 - x**4 / 120 + x**6 / 5040 if x < 0.03 else 1.0 - np.sin(x) / x
            return potential**2 / np.pi**2 / k**2 * amplitude * shape(k) * np.exp(-((k * damping) ** 2)) * apart

        whole = integrate(integrand, 1e-8, 20.0)
        rows.append((distance, z, low, high, np.sqrt(whole), integrate(integrand, low, high) / whole))
    write("clocks.csv", ["distance", "z", "low", "high", "ratio", "share"], rows)


if __name__ == "__main__":
    for make in (distances, growth_closed_form, growth_integrated, bessel, transfer, power, table, clocks):
        make()
        print(make.__name__)
