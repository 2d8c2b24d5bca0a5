"""Recomputes the NIST StRD values of strd/certified.csv in exact rational arithmetic.

Fails unless each certified value agrees to all of its 15 significant digits (the exact value rounds to it).
"""

import csv
import sys
from fractions import Fraction
from pathlib import Path

from mpmath import mp, mpf, sqrt

mp.dps = 40
FOLDER = Path(__file__).parent / "strd"


def rows_of(name):
    lines = [line for line in (FOLDER / name).read_text().splitlines() if not line.startswith("#")]
    return list(csv.DictReader(lines))


def solve(matrix):
    """Inverse by Gauss-Jordan elimination over the rationals."""
    size = len(matrix)
    work = [row[:] + [Fraction(int(i == j)) for j in range(size)] for i, row in enumerate(matrix)]
    for pivot in range(size):
        swap = next(i for i in range(pivot, size) if work[i][pivot] != 0)
        work[pivot], work[swap] = work[swap], work[pivot]
        work[pivot] = [entry / work[pivot][pivot] for entry in work[pivot]]
        for i in range(size):
            if i != pivot and work[i][pivot] != 0:
                factor = work[i][pivot]
                work[i] = [a - factor * b for a, b in zip(work[i], work[pivot])]
    return [row[size:] for row in work]


def exact(name):
    table = rows_of(f"{name}.csv")
    y = [Fraction(row["y"]) for row in table]
    columns = [key for key in table[0] if key != "y"]
    design = [[Fraction(1)] + [Fraction(row[key]) for key in columns] for row in table]
    count = len(design[0])
    normal = [[sum(row[i] * row[j] for row in design) for j in range(count)] for i in range(count)]
    inverse = solve(normal)
    projected = [sum(row[i] * value for row, value in zip(design, y)) for i in range(count)]
    estimate = [sum(inverse[i][j] * projected[j] for j in range(count)) for i in range(count)]
    residual = sum((value - sum(b * x for b, x in zip(estimate, row))) ** 2 for row, value in zip(design, y))
    variance = residual / (len(y) - count)
    real = lambda fraction: mpf(fraction.numerator) / mpf(fraction.denominator)
    values = {str(i): (real(estimate[i]), sqrt(real(variance * inverse[i][i]))) for i in range(count)}
    values["residual"] = (sqrt(real(variance)), None)
    return values


def main():
    bad = 0
    for row in rows_of("certified.csv"):
        for text, value in zip((row["estimate"], row["standard_deviation"]), exact(row["dataset"])[row["quantity"]]):
            if text:
                agrees = mp.nstr(value, 15) == mp.nstr(mpf(text), 15)
                print(row["dataset"], row["quantity"], text, mp.nstr(value, 18), "agrees" if agrees else "DIFFERS")
                bad += not agrees
    sys.exit(bad)


if __name__ == "__main__":
    main()
