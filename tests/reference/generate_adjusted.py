"""Writes reference tables for the analysis of covariance over several groups and for randomised blocks.

Usage: python3 generate_adjusted.py     (needs numpy, scipy.special and mpmath; half a minute)

adjusted_pairs.csv  power of the comparison of the first two groups after adjustment for a normal covariate: triple
                    trapezoidal sum over the standardised difference of the covariate's means (normal), its sum of
                    squares within all groups (chi-squared, N - k) and the residual sum of squares (chi-squared,
                    N - k - 1), repeated with all steps a third smaller; the larger difference stands in the row
blocks.csv          power of one comparison in randomised blocks: 30-digit integral of the normal tails over the
                    residual chi variable; the critical value from the incomplete beta function
"""

import csv
from pathlib import Path

import mpmath as mp
import numpy as np
from scipy.special import gammaln, ndtr, stdtrit

TARGET = Path(__file__).parent


def write(name, header, rows):
    with open(TARGET / name, "w", newline="") as file:
        writer = csv.writer(file, lineterminator="\n")
        writer.writerow(header)
        writer.writerows(rows)


def log_chi_squared_grid(df, step):
    """Points of a chi-squared variable, evenly spaced in the logarithm, with their probabilities."""
    logs = np.arange(np.log(df) - 40 / np.sqrt(df) - 30 / df, np.log(df) + 14 / np.sqrt(df), step)
    values = np.exp(logs)
    weights = np.exp(df / 2 * logs - values / 2 - df / 2 * np.log(2) - gammaln(df / 2)) * step
    return values, weights


def adjusted(sizes, delta, sd, rho, alpha, sides, fineness):
    n, k = sum(sizes), len(sizes)
    df = n - k - 1
    critical = -stdtrit(df, alpha / sides)
    factor = np.sqrt(1 / sizes[0] + 1 / sizes[1])
    noncentrality = delta / (sd * np.sqrt(1 - rho**2) * factor)
    step = 0.15 / fineness
    z = np.arange(0, 10, step)
    z_weights = np.exp(-z**2 / 2) * 2 * step / np.sqrt(2 * np.pi)
    z_weights[0] /= 2
    s, s_weights = log_chi_squared_grid(n - k, 0.5 / np.sqrt(n - k) / fineness)
    r, r_weights = log_chi_squared_grid(df, 0.5 / np.sqrt(df) / fineness)
    limit = critical * np.sqrt(r / df)
    total = 0.0
    for z_value, z_weight in zip(z, z_weights):
        shrunk = noncentrality / np.sqrt(1 + z_value**2 / s)
        power = ndtr(shrunk[:, None] - limit)
        if sides == 2:
            power = power + ndtr(-limit - shrunk[:, None])
        total += z_weight * (s_weights @ power @ r_weights)
    return total


def adjusted_pairs():
    cases = [
        ([4, 3, 4], 2.0, 1.0, 0.5, 0.05, 2),
        ([3, 4, 3], 1.8, 1.2, 0.7, 0.05, 2),
        ([5, 3, 4, 4], 1.4, 1.0, -0.6, 0.05, 1),
        ([6, 6, 6], 1.1, 0.9, 0.4, 0.01, 2),
        ([10, 5, 5, 5, 5], 2.0, 1.9, 0.6, 0.05, 2),
        ([12, 12, 12], 1.0, 1.0, 0.3, 0.05, 2),
        ([20, 20, 20, 20], 0.7, 1.0, 0.6, 0.05, 2),
        ([40, 40, 40], 0.5, 1.0, 0.8, 0.025, 1),
    ]
    rows = []
    for sizes, delta, sd, rho, alpha, sides in cases:
        coarse, fine = (adjusted(sizes, delta, sd, rho, alpha, sides, f) for f in (1.0, 1.5))
        listed = ";".join(map(str, sizes))
        rows.append([listed, delta, sd, rho, alpha, sides, repr(float(fine)), f"{abs(fine - coarse):.1e}",
                     "triple trapezoidal sum, double precision"])
    header = ["n_per_group", "delta", "sd", "rho", "alpha", "sides", "power", "difference", "source"]
    write("adjusted_pairs.csv", header, rows)


def noncentral_t_power(df, noncentrality, critical, sides):
    log_constant = (1 - df / 2) * mp.log(2) - mp.loggamma(df / 2)

    def integrand(chi):
        density = mp.exp(log_constant + (df - 1) * mp.log(chi) - chi**2 / 2)
        limit = critical * chi / mp.sqrt(df)
        tails = mp.ncdf(noncentrality - limit)
        if sides == 2:
            tails += mp.ncdf(-limit - noncentrality)
        return density * tails

    middle = mp.sqrt(df)
    knots = [max(middle + d, 0) for d in (-12, -6, -3, -1, 0, 1, 3, 6, 12, 20)]
    return mp.quad(integrand, sorted(set(knots)))


def upper_t_quantile(df, tail):
    def gap(t):
        return mp.betainc(df / 2, mp.mpf(1) / 2, 0, df / (df + t * t), regularized=True) / 2 - tail

    return mp.findroot(gap, float(-stdtrit(float(df), float(tail))))


def blocks():
    mp.mp.dps = 30
    cases = [
        (3, 2, "all_pairs", "bonferroni", 3.0, 1.0, 0.05, 2),
        (3, 4, "all_pairs", "sidak", 2.5, 1.2, 0.05, 2),
        (3, 8, "all_pairs", "each-at-alpha", 1.5, 1.0, 0.05, 2),
        (4, 5, "vs_control", "bonferroni", 2.0, 1.1, 0.05, 2),
        (4, 9, "vs_control", "sidak", 1.2, 0.9, 0.01, 2),
        (4, 12, "vs_control", "bonferroni", 1.0, 1.0, 0.05, 1),
        (5, 6, "all_pairs", "bonferroni", 1.9, 1.3, 0.05, 2),
        (6, 3, "vs_control", "each-at-alpha", 2.2, 1.0, 0.025, 1),
        (8, 10, "all_pairs", "sidak", 1.6, 1.4, 0.05, 2),
        (12, 4, "vs_control", "sidak", 2.4, 1.0, 0.05, 2),
    ]
    rows = []
    for k, b, family, method, delta, sd, alpha, sides in cases:
        count = k * (k - 1) // 2 if family == "all_pairs" else k - 1
        level = mp.mpf(alpha)
        each = {"each-at-alpha": level, "bonferroni": level / count,
                "sidak": 1 - (1 - level) ** (mp.mpf(1) / count)}[method]
        df = mp.mpf((b - 1) * (k - 1))
        critical = upper_t_quantile(df, each / sides)
        noncentrality = mp.mpf(delta) / (mp.mpf(sd) * mp.sqrt(mp.mpf(2) / b))
        power = noncentral_t_power(df, noncentrality, critical, sides)
        rows.append([k, b, family, method, delta, sd, alpha, sides, int(df), mp.nstr(critical, 17),
                     mp.nstr(power, 17), "mpmath, 30 digits"])
    header = ["treatments", "blocks", "family", "method", "delta", "sd_within", "alpha", "sides", "df",
              "critical_t", "power", "source"]
    write("blocks.csv", header, rows)


if __name__ == "__main__":
    adjusted_pairs()
    blocks()
