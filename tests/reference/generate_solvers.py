"""Writes the reference tables of the solvers' own functions from their definitions, with mpmath in 30 to 50 digits
where nothing else is said.

Usage: python3 generate_solvers.py [table ...]     (needs mpmath, numpy, scipy; all tables take several minutes)

binomial.csv, poisson.csv   sums of exact probabilities outward from the count
hypergeometric.csv          sums of exact whole-number weights, the odds ratio being the double printed
bivariate_normal.csv        integral of the conditional normal tail over the first variable
multivariate.csv            studentised range and comparisons with a control in double precision, by Gauss-Legendre
                            panels over the common normal and the root of the spread, with two numbers of panels;
                            their relative difference stands in the row
"""

import csv
import sys
from pathlib import Path

import mpmath as mp
import numpy
from scipy import special

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


def panels(low, high, count, nodes=20):
    """Gauss-Legendre nodes and weights on equal panels."""
    x, w = numpy.polynomial.legendre.leggauss(nodes)
    half = (high - low) / count / 2
    middles = low + half * (2 * numpy.arange(count) + 1)
    return (middles[:, None] + half * x).ravel(), numpy.tile(half * w, count)


def over_spread(inner, critical, df, count):
    """E[inner(critical * s)], s = sqrt(chi2_df / df), over t = sqrt(s)."""
    spread = 7 / numpy.sqrt(df)
    t, weight = panels(numpy.sqrt(max(0.0, 1 - spread)), numpy.sqrt(1 + 1.3 * spread), count)
    log_constant = numpy.log(2.0) + df / 2 * numpy.log(df / 2) - special.gammaln(df / 2)
    density = numpy.exp(log_constant + (2 * df - 2) * numpy.log(t) - df * t**4 / 2) * 2 * t
    return float(numpy.sum(weight * density * inner(critical * t * t)))


def range_cdf(k, count):
    z, weight = panels(-9.0, 9.0, count)
    inside = lambda w: special.ndtr(z + w[:, None]) - special.ndtr(z)
    return lambda w: k * numpy.sum(weight * numpy.exp(-z * z / 2) * inside(w) ** (k - 1), axis=1) / numpy.sqrt(2 * numpy.pi)


def control_cdf(loadings, sides, count):
    z, weight = panels(-9.0, 9.0, count)

    def inner(w):
        product = weight * numpy.exp(-z * z / 2) / numpy.sqrt(2 * numpy.pi)
        for loading in loadings:
            own = numpy.sqrt((1 - loading) * (1 + loading))
            upper = special.ndtr((w[:, None] - loading * z) / own)
            product = product * (upper - (special.ndtr((-w[:, None] - loading * z) / own) if sides == 2 else 0))
        return numpy.sum(product, axis=1)

    return inner


def multivariate_rows():
    for k, df, q in ((3, 1, 10), (5, 2.5, 4), (12, 7, 3), (40, 30, 5.5), (100, 10, 6.5), (4, 400, 0.8)):
        values = [over_spread(range_cdf(k, n), q, df, n) for n in (30, 47)]
        yield "range", "", k, repr(float(df)), repr(float(q)), repr(values[1]), f"{abs(values[0] / values[1] - 1):.1e}"
    unequal = (
        ((0.6, 0.7, 0.8), 2, 12, 2.4), ((0.2, 0.9), 1, 5, 1.9), ((0.95, 0.5, 0.5, 0.3), 2, 60, 2.7),
        ((-0.6, 0.5, 0.8), 1, 20, -0.4), ((0.3, 0.4, 0.5), 1, 3, 0.5), ((0.9, 0.99), 2, 8, 3.0),
    )
    for loadings, sides, df, c in unequal:
        values = [over_spread(control_cdf(loadings, sides, n), c, df, n) for n in (30, 47)]
        joined = ";".join(map(repr, loadings))
        check = f"{abs(values[0] / values[1] - 1):.1e}"
        yield "control", joined, sides, repr(float(df)), repr(float(c)), repr(values[1]), check


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
