"""Writes priors.csv: densities, probabilities, quantiles and moments of every family, from SciPy; of truncated ones from
mpmath quadrature at 40 digits. Run: python priors.py > priors.csv"""
import mpmath as mp
import numpy as np
from scipy import stats

mp.mp.dps = 40

FAMILIES = {
    "normal": lambda m, s: stats.norm(m, s),
    "uniform": lambda a, b: stats.uniform(a, b - a),
    "log_uniform": lambda a, b: stats.loguniform(a, b),
    "half_normal": lambda s: stats.halfnorm(0, s),
    "beta": lambda a, b: stats.beta(a, b),
    "gamma": lambda k, t: stats.gamma(k, scale=t),
    "student_t": lambda m, s, n: stats.t(n, m, s),
}

CASES = [
    ("normal", [0.0, 1.0]), ("normal", [-2.5, 0.03]), ("normal", [100.0, 20.0]),
    ("uniform", [-30.0, 30.0]), ("uniform", [0.2, 0.25]),
    ("log_uniform", [1e-7, 1e-4]), ("log_uniform", [1.0, 1.5]), ("log_uniform", [2.0, 2000.0]),
    ("half_normal", [1.0]), ("half_normal", [0.02]),
    ("beta", [2.0, 5.0]), ("beta", [0.5, 0.5]), ("beta", [1.0, 1.0]), ("beta", [40.0, 3.0]), ("beta", [0.7, 12.0]),
    ("gamma", [2.0, 3.0]), ("gamma", [0.5, 1.0]), ("gamma", [1.0, 0.1]), ("gamma", [30.0, 0.05]),
    ("student_t", [0.0, 1.0, 3.0]), ("student_t", [1.5, 0.2, 1.0]), ("student_t", [-4.0, 10.0, 7.5]), ("student_t", [0.0, 2.0, 40.0]),
]

PROBABILITIES = [1e-12, 1e-6, 0.001, 0.05, 0.3, 0.5, 0.77, 0.95, 0.999]

TRUNCATED = [
    ("normal", [0.0, 1.0], (-1.0, 2.0)), ("normal", [0.0, 1.0], (5.0, 7.0)), ("normal", [0.0, 1.0], (-20.0, -10.0)),
    ("normal", [0.81, 0.01], (0.8, 0.85)), ("normal", [0.0, 1.0], (0.3, float("inf"))), ("normal", [1.0, 1e-3], (0.0, 2.0)),
    ("normal", [0.0, 1.0], (1.0, 1.00001)),
    ("uniform", [-30.0, 30.0], (-5.0, 12.0)), ("log_uniform", [1e-3, 10.0], (0.1, 100.0)),
    ("half_normal", [2.0], (1.0, 3.0)), ("half_normal", [1.0], (6.0, 9.0)),
    ("beta", [2.0, 5.0], (0.3, 0.9)), ("beta", [0.5, 0.5], (0.0, 0.4)), ("gamma", [2.0, 3.0], (10.0, 60.0)),
    ("student_t", [0.0, 1.0, 3.0], (-2.0, 50.0)), ("student_t", [0.0, 1.0, 1.0], (3.0, 9.0)), ("student_t", [0.0, 1.0, 5.0], (0.0, float("inf"))),
]


def density(family, a):
    f = [mp.mpf(v) for v in a]
    if family == "normal":
        return lambda x: mp.npdf(x, f[0], f[1])
    if family == "uniform":
        return lambda x: 1 / (f[1] - f[0])
    if family == "log_uniform":
        return lambda x: 1 / (x * mp.log(f[1] / f[0]))
    if family == "half_normal":
        return lambda x: 2 * mp.npdf(x, 0, f[0])
    if family == "beta":
        return lambda x: x ** (f[0] - 1) * (1 - x) ** (f[1] - 1) / mp.beta(f[0], f[1])
    if family == "gamma":
        return lambda x: (x / f[1]) ** (f[0] - 1) * mp.exp(-x / f[1]) / (f[1] * mp.gamma(f[0]))
    n = f[2]
    return lambda x: mp.gamma((n + 1) / 2) / (mp.sqrt(n * mp.pi) * mp.gamma(n / 2) * f[1]) * (1 + ((x - f[0]) / f[1]) ** 2 / n) ** (-(n + 1) / 2)


def line(kind, family, arguments, within, at, value):
    print(",".join([kind, family, " ".join(repr(float(a)) for a in arguments), " ".join(repr(float(w)) for w in within), repr(float(at)), repr(float(value))]))


print("kind,family,arguments,within,at,value")
for family, arguments in CASES:
    made = FAMILIES[family](*arguments)
    for p in PROBABILITIES:
        x = float(made.ppf(p))
        line("quantile", family, arguments, [], p, x)
        line("upper_quantile", family, arguments, [], p, made.isf(p))
        line("log_density", family, arguments, [], x, made.logpdf(x))
        line("cdf", family, arguments, [], x, made.cdf(x))
        line("survival", family, arguments, [], x, made.sf(x))
    line("mean", family, arguments, [], 0, made.mean())
    line("sd", family, arguments, [], 0, made.std())
for family, arguments, within in TRUNCATED:
    p = density(family, arguments)
    low, high = FAMILIES[family](*arguments).support()
    low, high = max(low, within[0]), min(high, within[1])
    centre = arguments[0] if family in ("normal", "student_t") else None
    width = arguments[0 if family == "half_normal" else 1]
    if high == float("inf"):
        cuts = [low, low + width, low + 5 * width, low + 20 * width, low + 100 * width, mp.inf]
    elif centre is not None:
        marks = [centre + k * width for k in (-100, -20, -8, -4, -1, 0, 1, 4, 8, 20, 100)]
        cuts = [low, *[m for m in marks if low < m < high], high]
    else:
        cuts = list(mp.linspace(low, high, 9))
    integral = lambda f, upto=None: mp.quad(f, [c for c in cuts if upto is None or c < upto] + ([upto] if upto is not None else []))
    mass = integral(p)
    mean = integral(lambda x: x * p(x)) / mass
    sd = mp.sqrt(integral(lambda x: (x - mean) ** 2 * p(x)) / mass)
    line("mean", family, arguments, within, 0, mean)
    line("sd", family, arguments, within, 0, sd)
    span = (high if high != float("inf") else low + 6 * width) - low
    for share in (0.02, 0.3, 0.5, 0.9):
        x = float(low + share * span)
        line("log_density", family, arguments, within, x, mp.log(p(mp.mpf(x)) / mass))
        below = integral(p, mp.mpf(x)) / mass
        line("cdf", family, arguments, within, x, below)
        line("survival", family, arguments, within, x, 1 - below)
