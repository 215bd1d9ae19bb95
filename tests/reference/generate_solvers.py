"""Writes the reference tables of the solvers' own functions: from the definitions, with mpmath, in 50 digits.

Usage: python3 generate_solvers.py [table ...]     (needs mpmath; all tables take several minutes)

binomial.csv, poisson.csv   sums of exact probabilities outward from the count
hypergeometric.csv          sums of exact whole-number weights, the odds ratio being the double printed
bivariate_normal.csv        integral of the conditional normal tail over the first variable
multivariate.csv            double trapezoidal sums for the studentised range and for comparisons with a control,
                            repeated with both steps a third smaller; the larger relative difference stands in the row
"""

import csv
import sys
from pathlib import Path

import mpmath as mp

mp.mp.dps = 50
SMALLEST = mp.mpf(10) ** -290
TARGET = Path(__file__).parent


def text(value):
    return mp.nstr(value, 20, strip_zeros=True)


def write(name, header, rows):
    with open(TARGET / name, "w", newline="") as file:
        writer = csv.writer(file, lineterminator="\n")
        writer.writerow(header)
        writer.writerows(rows)


def tail(first, ratio, step, stop):
    """Sum of first, first * ratio(k), ... until the terms no longer count or the range ends."""
    total, term, k = mp.mpf(0), mp.mpf(1), stop[0]
    while True:
        total += term
        if k == stop[1]:
            break
        term *= ratio(k)
        k += step
        if term < total * mp.mpf(10) ** -45:
            break
    return first * total


def binomial_rows():
    cases = []
    for n in (1, 2, 10, 25, 100, 1000, 20000, 1000000):
        for p in (1e-9, 0.001, 0.05, 0.3, 0.5, 0.77, 0.99, 1 - 1e-9):
            mean, sd = n * p, (n * p * (1 - p)) ** 0.5
            ks = {0, n, int(mean)} | {int(mean + z * sd) for z in (-25, -9, -3, -1, 1, 3, 9, 25)}
            cases += [(n, p, k) for k in sorted(ks) if 0 <= k <= n]
    for n, p, k in cases:
        q, r = mp.mpf(p), 1 - mp.mpf(p)
        pmf = mp.binomial(n, k) * q**k * r ** (n - k)
        if pmf < SMALLEST:
            continue
        down = tail(pmf, lambda j: mp.mpf(j) / (n - j + 1) * r / q, -1, (k, 0))
        up = mp.mpf(0)
        if k < n:
            above = pmf * (n - k) / mp.mpf(k + 1) * q / r
            up = tail(above, lambda j: mp.mpf(n - j) / (j + 1) * q / r, 1, (k + 1, n))
        yield n, repr(p), k, text(pmf), text(down), text(up)


def poisson_rows():
    for mean in (1e-6, 0.1, 1.0, 3.7, 20.0, 333.3, 1e4, 1e6):
        sd = mean**0.5
        ks = {0, 1, int(mean)} | {int(mean + z * sd) for z in (-25, -9, -3, -1, 1, 3, 9, 25)}
        for k in sorted(k for k in ks if k >= 0):
            m = mp.mpf(mean)
            pmf = mp.exp(k * mp.log(m) - m - mp.loggamma(k + 1))
            if pmf < SMALLEST:
                continue
            down = tail(pmf, lambda j: j / m, -1, (k, 0))
            up = tail(pmf * m / (k + 1), lambda j: m / (j + 1), 1, (k + 1, None))
            yield repr(mean), k, text(pmf), text(down), text(up)


def hypergeometric_rows():
    for n1, n2, m in ((5, 5, 5), (10, 3, 6), (40, 60, 30), (40, 60, 95), (500, 500, 400), (2000, 100, 1500)):
        for odds in (1e-12, 0.1, 1.0, 2.5, 40.0, 1e9):
            low, high = max(0, m - n2), min(n1, m)
            weights = [mp.mpf(1)]
            for x in range(low, high):
                ratio = mp.mpf(n1 - x) * (m - x) / ((x + 1) * mp.mpf(n2 - m + x + 1)) * mp.mpf(odds)
                weights.append(weights[-1] * ratio)
            total = mp.fsum(weights)
            mean = mp.fsum(w * x for x, w in zip(range(low, high + 1), weights)) / total
            picks = sorted({low, high} | {low + (high - low) * i // 7 for i in range(8)} | {int(mean)})
            for x in picks:
                pmf = weights[x - low] / total
                down = mp.fsum(weights[: x - low + 1]) / total
                up = mp.fsum(weights[x - low + 1 :]) / total
                if pmf < SMALLEST:
                    continue
                yield n1, n2, m, repr(odds), x, text(pmf), text(down), text(up), text(mean)


def upper_orthant(h, k, rho):
    """P(X > h, Y > k) as the integral over x of the conditional tail of Y, twice with different nodes."""
    h, k, rho = mp.mpf(h), mp.mpf(k), mp.mpf(rho)
    own = mp.sqrt((1 - rho) * (1 + rho))
    integrand = lambda x: mp.npdf(x) * mp.ncdf((rho * x - k) / own)
    if own < abs(rho) / 20:
        # The conditional tail turns within a short way: panels around that place and everywhere else.
        turn, width = k / rho, own / abs(rho)
        cuts = {h + mp.mpf(j) / 8 for j in range(160)} | {turn + width * j for j in range(-30, 31)}
        cuts = sorted(cut for cut in cuts if h <= cut)
        sums = []
        for degree in (4, 5):
            quad = lambda pair: mp.quad(integrand, pair, method="gauss-legendre", maxdegree=degree)
            sums.append(mp.fsum(quad(pair) for pair in zip(cuts, cuts[1:])))
    else:
        sums = [double_exponential(integrand, h, steps) for steps in (500, 750)]
    assert abs(sums[0] / sums[1] - 1) < mp.mpf(10) ** -16, (h, k, rho, sums)
    return sums[1]


def double_exponential(integrand, low, steps):
    """Integral from low upward with x = low + exp(t - exp(-t)), by the trapezoidal rule in t."""
    total, step = mp.mpf(0), mp.mpf(11) / steps
    for i in range(steps + 1):
        t = -6 + step * i
        inner = mp.exp(-t)
        distance = mp.exp(t - inner)
        total += integrand(low + distance) * distance * (1 + inner)
    return total * step


def bivariate_rows():
    with mp.workdps(30):
        for h, k in ((0.0, 0.0), (1.0, 1.0), (-1.0, 0.5), (2.5, -3.0), (-4.0, -4.5), (6.0, 5.5), (12.0, 11.0), (8.0, 8.0)):
            for rho in (-0.9999, -0.95, -0.5, -0.01, 0.0, 0.1, 0.5, 0.8, 0.95, 0.9999, 1 - 2.0**-40):
                value = upper_orthant(h, k, rho)
                if value < mp.mpf(10) ** -250:
                    continue
                yield repr(h), repr(k), repr(rho), text(value)


def over_spread(inner, critical, df, step):
    """E[inner(critical * s)], s = sqrt(chi2_df / df), by the trapezoidal rule in log s."""
    df = mp.mpf(df)
    constant = 2 * (df / 2) ** (df / 2) / mp.gamma(df / 2)
    total = mp.mpf(0)
    for direction in (1, -1):
        j = 0 if direction == 1 else -1
        while True:
            u = j * step
            weight = constant * mp.exp(df * u - df * mp.exp(2 * u) / 2)
            if weight < mp.mpf(10) ** -21 and abs(u) > 6 * step:
                break
            total += weight * inner(critical * mp.exp(u))
            j += direction
    return total * step


def range_cdf(k, w, step):
    total, z = mp.mpf(0), mp.mpf(-12)
    while z < 9:
        total += mp.npdf(z) * (mp.ncdf(z + w) - mp.ncdf(z)) ** (k - 1)
        z += step
    return k * total * step


def control_cdf(loadings, sides, w, step):
    total, z = mp.mpf(0), mp.mpf(-12)
    while z < 12:
        product = mp.npdf(z)
        for loading in loadings:
            own = mp.sqrt(1 - mp.mpf(loading) ** 2)
            upper = mp.ncdf((w - loading * z) / own)
            lower = mp.ncdf((-w - loading * z) / own) if sides == 2 else 0
            product *= upper - lower
        total += product
        z += step
    return total * step


def multivariate_rows():
    with mp.workdps(20):
        fine, third = mp.mpf(1) / 8, mp.mpf(2) / 3
        ranges = ((3, 1, 10), (5, 2.5, 4), (12, 7, 3), (40, 30, 5.5), (100, 10, 6.5), (4, 400, 0.8))
        for k, df, q in ranges:
            step = min(mp.mpf(1) / 20, mp.mpf(1) / 2 / mp.sqrt(df)) / (1 + mp.log(k) / 3)
            inner = lambda h: lambda w: range_cdf(k, w, h)
            value = over_spread(inner(fine), q, df, step)
            again = over_spread(inner(fine * third), q, df, step * third)
            yield "range", "", k, repr(float(df)), repr(float(q)), text(again), mp.nstr(abs(value / again - 1), 2)
        unequal = (
            ((0.6, 0.7, 0.8), 2, 12, 2.4), ((0.2, 0.9), 1, 5, 1.9), ((0.95, 0.5, 0.5, 0.3), 2, 60, 2.7),
            ((-0.6, 0.5, 0.8), 1, 20, -0.4), ((0.3, 0.4, 0.5), 1, 3, 0.5), ((0.9, 0.99), 2, 8, 3.0),
        )
        for loadings, sides, df, c in unequal:
            step = min(mp.mpf(1) / 20, mp.mpf(1) / 2 / mp.sqrt(df))
            inner = lambda h: lambda w: control_cdf(loadings, sides, w, h)
            value = over_spread(inner(fine / 2), c, df, step)
            again = over_spread(inner(fine / 2 * third), c, df, step * third)
            joined = ";".join(map(repr, loadings))
            yield "control", joined, sides, repr(float(df)), repr(float(c)), text(again), mp.nstr(abs(value / again - 1), 2)


if __name__ == "__main__":
    tables = {
        "binomial.csv": (["n", "p", "k", "pmf", "cdf", "sf"], binomial_rows),
        "poisson.csv": (["mean", "k", "pmf", "cdf", "sf"], poisson_rows),
        "hypergeometric.csv": (["n1", "n2", "m", "odds_ratio", "x", "pmf", "cdf", "sf", "mean"], hypergeometric_rows),
        "bivariate_normal.csv": (["h", "k", "rho", "upper_orthant"], bivariate_rows),
        "multivariate.csv": (["kind", "loadings", "k_or_sides", "df", "critical", "cdf", "step_check"], multivariate_rows),
    }
    for name in sys.argv[1:] or tables:
        header, rows = tables[name]
        write(name, header, rows())
