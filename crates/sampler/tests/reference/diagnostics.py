"""Writes diagnostics.csv: R-hat, effective sample sizes and Monte Carlo errors of made chains, from arviz-stats.
The chains follow from a recipe in exact arithmetic that the Rust test repeats. Run: python diagnostics.py > diagnostics.csv"""
import warnings

import numpy as np
from arviz_stats.base import array_stats

warnings.simplefilter("ignore")
MASK = (1 << 64) - 1


class Stream:
    """SplitMix64; uniform numbers are the upper 53 bits, noise the sum of twelve of them minus six."""

    def __init__(self, seed):
        self.state = seed

    def uniform(self):
        self.state = (self.state + 0x9E3779B97F4A7C15) & MASK
        z = self.state
        z = ((z ^ (z >> 30)) * 0xBF58476D1CE4E5B9) & MASK
        z = ((z ^ (z >> 27)) * 0x94D049BB133111EB) & MASK
        z ^= z >> 31
        return (z >> 11) * 2.0**-53

    def noise(self):
        total = 0.0
        for _ in range(12):
            total += self.uniform()
        return total - 6.0


def autoregressive(seed, chains, draws, memory, offset):
    out = []
    for chain in range(chains):
        stream = Stream(seed * 1000 + chain)
        x, values = 0.0, []
        for _ in range(draws):
            x = memory * x + stream.noise()
            values.append(x + offset * chain)
        out.append(values)
    return np.array(out)


def heavy(seed, chains, draws):
    out = []
    for chain in range(chains):
        stream = Stream(seed * 1000 + chain)
        out.append([stream.noise() / (stream.uniform() + 1e-6) for _ in range(draws)])
    return np.array(out)


CASES = {
    "white": autoregressive(1, 4, 250, 0.0, 0.0),
    "memory": autoregressive(2, 4, 500, 0.9, 0.0),
    "antithetic": autoregressive(3, 4, 400, -0.6, 0.0),
    "apart": autoregressive(4, 4, 300, 0.5, 0.4),
    "odd": autoregressive(5, 3, 101, 0.3, 0.0),
    "single": autoregressive(6, 1, 600, 0.7, 0.0),
    "short": autoregressive(7, 8, 11, 0.5, 0.0),
    "slow": autoregressive(8, 4, 200, 0.99, 0.0),
    "heavy": heavy(9, 4, 300),
    "ties": np.floor(autoregressive(10, 4, 200, 0.6, 0.0)),
    "constant": np.full((4, 100), 1.5),
}

print("case,function,value")
for name, array in CASES.items():
    figures = {
        "rhat": array_stats.rhat(array, chain_axis=0, draw_axis=1, method="rank"),
        "bulk": array_stats.ess(array, chain_axis=0, draw_axis=1, method="bulk"),
        "tail": array_stats.ess(array, chain_axis=0, draw_axis=1, method="tail", prob=(0.05, 0.95)),
        "mean": array_stats.ess(array, chain_axis=0, draw_axis=1, method="mean"),
        "quantile30": array_stats.ess(array, chain_axis=0, draw_axis=1, method="quantile", prob=0.3),
        "mcse": array_stats.mcse(array, chain_axis=0, draw_axis=1, method="mean"),
        "q10": np.quantile(array, 0.1),
    }
    for function, value in figures.items():
        print(f"{name},{function},{float(value)!r}")
