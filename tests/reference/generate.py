"""Reference values for the distributions in src/numerics, from their definitions in high-precision arithmetic.

Needs only mpmath.  Run `python3 tests/reference/generate.py` in the project's root; it rewrites the tables

    central_tails.tsv  noncentral_tails.tsv  densities.tsv

Every row holds a function name of examples/tabulate.rs, its arguments and the value; the oracle stands in the head of
the table, the tolerance in tests/numerics/tables.rs.  A row is added by adding its arguments to one of the `*_cases`
functions below.

None of the oracles shares a method with the program under test: tails are integrals of the density over panels
(Gauss-Legendre on 40 nodes, in the logarithm of the variable), noncentral tails are mixtures summed term by term with
at least 50 digits, noncentral t tails are panel integrals over the scale variable.  All arguments are taken as the
doubles that the printed decimals denote.
"""

import itertools
import random
import sys
from multiprocessing import Pool
from pathlib import Path

import mpmath
from mpmath import mp, mpf

mp.dps = 50
HERE = Path(__file__).parent
NODES = None


def gauss_nodes(count=40):
    """Gauss-Legendre nodes and weights on [-1, 1] by Newton's method."""
    global NODES
    if NODES is None:
        NODES = []
        for i in range(1, count + 1):
            x = mpmath.cos(mpmath.pi * (i - mpf(1) / 4) / (count + mpf(1) / 2))
            for _ in range(8):
                before, here = mpf(1), x
                for k in range(2, count + 1):
                    before, here = here, ((2 * k - 1) * x * here - (k - 1) * before) / k
                slope = count * (x * here - before) / (x * x - 1)
                x -= here / slope
            NODES.append((x, 2 / ((1 - x * x) * slope * slope)))
    return NODES


def panel(f, low, high):
    half, middle = (high - low) / 2, (high + low) / 2
    return half * sum(w * f(middle + half * x) for x, w in gauss_nodes())


def outward(log_f, start, direction, width):
    """Integral of exp(log_f) from `start` to infinity in `direction`, by panels until they no longer count.

    The width of a panel is adapted so that the exponent changes by a moderate amount within it.
    """
    total, at = mpf(0), mpf(start)
    step = mpf(width)
    for _ in range(4000):
        here = log_f(at)
        for _ in range(200):
            change = abs(log_f(at + direction * step) - here)
            middle = abs(log_f(at + direction * step / 2) - here)
            if max(change, middle) <= 6:
                break
            step /= 2
        end = at + direction * step
        part = panel(lambda u: mpmath.exp(log_f(u)), min(at, end), max(at, end))
        total += part
        at = end
        if part < total * mpf(10) ** -30 and log_f(at) < here:
            return total
        if max(change, middle) < 3 and step < 2:
            step *= 2
    raise ArithmeticError("panels do not settle")


def tail_of_density(log_f, start, upper, width):
    """One tail of a unimodal density, integrated downhill only; the uphill one is the complement."""
    eps = mpf(10) ** -20
    uphill = log_f(start + eps) > log_f(start)
    if uphill == upper:
        return 1 - outward(log_f, start, -1 if upper else 1, width)
    return outward(log_f, start, 1 if upper else -1, width)


def gamma_tail(a, x, upper):
    """Regularised incomplete gamma function from its integral over ln t."""
    a, x = mpf(a), mpf(x)
    norm = -mpmath.loggamma(a)
    width = 1 / (1 + mpmath.sqrt(a))
    return tail_of_density(lambda u: a * u - mpmath.exp(u) + norm, mpmath.log(x), upper, width)


def beta_tail_odds(a, b, odds, upper):
    """Regularised incomplete beta function at x = odds/(1 + odds) from its integral over the log odds."""
    a, b, odds = mpf(a), mpf(b), mpf(odds)
    norm = mpmath.loggamma(a + b) - mpmath.loggamma(a) - mpmath.loggamma(b)
    width = mpmath.sqrt(1 / a + 1 / b) / 4
    log_f = lambda u: a * u - (a + b) * mpmath.log1p(mpmath.exp(u)) + norm
    return tail_of_density(log_f, mpmath.log(odds), upper, min(width, 1))


def mixture(tail_at, step_at, growth, w, peak, upper):
    """Poisson mixture of tails that differ by steps; 60 digits, summed from an exact start at one end."""
    with mp.workdps(70):
        reach = 40 * mpmath.sqrt(peak + 20) + 100
        low, high = max(0, int(peak - reach)), int(peak + reach)
        if upper:
            tail, step = tail_at(low), step_at(low)
            p = mpmath.exp(-w + low * mpmath.log(w) - mpmath.loggamma(low + 1)) if w else mpf(low == 0)
            total = mpf(0)
            for j in range(low, high):
                total += p * tail
                tail += step
                step *= growth(j)
                p *= w / (j + 1)
            return total
        tail, step = tail_at(high), step_at(high)
        p = mpmath.exp(-w + high * mpmath.log(w) - mpmath.loggamma(high + 1)) if w else mpf(0)
        if not w:
            return tail_at(0)
        total = p * tail
        for j in range(high - 1, low - 1, -1):
            step /= growth(j)
            tail += step
            p *= (j + 1) / w
            total += p * tail
        return total


def peak_of_products(w, shape, growth_scale):
    """Where p_j times the step is largest: (j + 1)(shape + j + 1) = w * growth_scale(j)."""
    low, high = mpf(0), w + growth_scale(0) + 10
    for _ in range(200):
        j = (low + high) / 2
        if w * growth_scale(j) > j * (shape + j):
            low = j
        else:
            high = j
    return low


def noncentral_chi2(df, ncp, x, upper):
    a, w, x = mpf(df) / 2, mpf(ncp) / 2, mpf(x) / 2
    peak = peak_of_products(w, a, lambda j: x)
    if upper:
        peak = max(peak, w)  # where the upper tail is saturated the weights alone decide
        low_peak = peak_of_products(w, a, lambda j: x)
        peak = low_peak if a + w < x else w
    else:
        peak = peak if a + w > x else w
    step = lambda j: mpmath.exp((a + j) * mpmath.log(x) - x - mpmath.loggamma(a + j + 1))
    return mixture(lambda j: gamma_tail(a + j, x, upper), step, lambda j: x / (a + j + 1), w, peak, upper)


def noncentral_beta_odds(a, b, w, odds, upper):
    a, b, w, odds = mpf(a), mpf(b), mpf(w), mpf(odds)
    x, y = odds / (1 + odds), 1 / (1 + odds)
    peak = peak_of_products(w, a, lambda j: x * (a + b + j))
    below = odds * b < a + w
    if below == upper:
        peak = w
    norm = lambda s: mpmath.loggamma(s + b) - mpmath.loggamma(s + 1) - mpmath.loggamma(b)
    step = lambda j: mpmath.exp((a + j) * mpmath.log(x) + b * mpmath.log(y) + norm(a + j))
    growth = lambda j: x * (a + j + b) / (a + j + 1)
    return mixture(lambda j: beta_tail_odds(a + j, b, odds, upper), step, growth, w, peak, upper)


def noncentral_f(df1, df2, ncp, x, upper):
    df1, df2 = mpf(df1), mpf(df2)
    return noncentral_beta_odds(df1 / 2, df2 / 2, mpf(ncp) / 2, df1 * mpf(x) / df2, upper)


def log_normal_sf(g):
    if g < 200:
        return mpmath.log(mpmath.erfc(g / mpmath.sqrt(2)) / 2)
    with mp.workdps(80):
        series = mpf(1)
        term = mpf(1)
        for k in range(1, 60):
            term *= -(2 * k - 1) / (g * g)
            if abs(term) < mpf(10) ** -60:
                break
            series += term
        return -g * g / 2 - mpmath.log(g * mpmath.sqrt(2 * mpmath.pi)) + mpmath.log(series)


def over_scale(df, log_g):
    """Integral of exp(log_g(s)) times the density of s = sqrt(chi2/df), over ln s by panels."""
    df = mpf(df)
    k = df / 2
    norm = mpmath.log(2) + k * mpmath.log(k) - mpmath.loggamma(k)

    def log_f(u):
        s = mpmath.exp(u)
        return norm + df * u - k * s * s + log_g(s)

    # Climb to the peak by a bracketing search on the slope.
    low, high = mpf(-60), mpf(60)
    eps = mpf(10) ** -20
    for _ in range(150):
        middle = (low + high) / 2
        if log_f(middle + eps) > log_f(middle):
            low = middle
        else:
            high = middle
    width = 1 / mpmath.sqrt(2 * df) / 4
    return outward(log_f, low, 1, min(width, mpf(1) / 4)) + outward(log_f, low, -1, min(width, mpf(1) / 4))


def over_normal(df, ncp, x, upper):
    """Tail for ncp >= 40 and x > 0 as an integral over the normal variable of the chi-squared tail, by fixed panels."""
    with mp.workdps(30):
        k, scale = mpf(df) / 2, mpf(df) / 2 / mpf(x) ** 2

        def f(z):
            root = z + mpf(ncp)
            if root <= 0:
                return mpf(0) if upper else mpmath.npdf(z)
            x = scale * root * root
            if k > 1000:
                return mpmath.npdf(z) * gamma_tail(k, x, not upper)
            limits = (x, mpmath.inf) if not upper else (0, x)
            return mpmath.npdf(z) * mpmath.gammainc(k, *limits, regularized=True)

        # The tail of the chi variable can pull the weight of the integrand far to one side.
        grid = [mpf(i) / 2 for i in range(-80, 81)]
        heights = [f(z) for z in grid]
        top = max(heights)
        return sum(panel(f, z, z + mpf(1) / 2) for z, h in zip(grid, heights) if h > top * mpf(10) ** -24)


def noncentral_t(df, ncp, x, upper):
    if ncp * x > 0 and abs(ncp) >= 40 and x * x > 2 * df:
        return over_normal(df, abs(ncp), abs(x), upper == (x > 0))
    with mp.workdps(60):
        ncp, x = mpf(ncp), mpf(x)
        sign = 1 if upper else -1
        return over_scale(df, lambda s: log_normal_sf(sign * (x * s - ncp)))


def noncentral_t_density(df, ncp, x):
    with mp.workdps(60):
        ncp, x = mpf(ncp), mpf(x)
        half = mpmath.log(2 * mpmath.pi) / 2
        return over_scale(df, lambda s: mpmath.log(s) - (x * s - ncp) ** 2 / 2 - half)


def noncentral_chi2_density(df, ncp, x):
    """The closed form with a modified Bessel function."""
    df, ncp, x = mpf(df), mpf(ncp), mpf(x)
    order = df / 2 - 1
    bessel = mpmath.besseli(order, mpmath.sqrt(ncp * x))
    return mpmath.exp(-(x + ncp) / 2) * (x / ncp) ** (order / 2) * bessel / 2


def noncentral_f_density(df1, df2, ncp, x):
    """The closed form with Kummer's function."""
    a, b, w, x = mpf(df1) / 2, mpf(df2) / 2, mpf(ncp) / 2, mpf(x)
    odds = a * x / b
    front = mpmath.exp(-w) * odds ** a / (1 + odds) ** (a + b) / (x * mpmath.beta(a, b))
    return front * mpmath.hyp1f1(a + b, a, w * odds / (1 + odds))


TAILS = {
    "chi2": lambda df, x, upper: gamma_tail(mpf(df) / 2, mpf(x) / 2, upper),
    "f": lambda df1, df2, x, upper: beta_tail_odds(mpf(df1) / 2, mpf(df2) / 2, mpf(df1) * mpf(x) / mpf(df2), upper),
    "beta": lambda a, b, x, upper: beta_tail_odds(a, b, mpf(x) / (1 - mpf(x)), upper),
    "t": lambda df, x, upper: (
        beta_tail_odds(mpf(1) / 2, mpf(df) / 2, mpf(x) ** 2 / mpf(df), True) / 2
        if (x > 0) == upper
        else 1 - beta_tail_odds(mpf(1) / 2, mpf(df) / 2, mpf(x) ** 2 / mpf(df), True) / 2
    ),
    "noncentral_t": noncentral_t,
    "noncentral_chi2": noncentral_chi2,
    "noncentral_f": noncentral_f,
    "noncentral_beta": lambda a, b, ncp, x, upper: noncentral_beta_odds(a, b, mpf(ncp) / 2, mpf(x) / (1 - mpf(x)), upper),
}

DENSITIES = {
    "noncentral_t": noncentral_t_density,
    "noncentral_chi2": noncentral_chi2_density,
    "noncentral_f": noncentral_f_density,
}


def rounded(x, digits=7):
    """The double that `digits` significant decimals denote."""
    return float(f"{x:.{digits - 1}e}")


POINTS = [-34, -20, -8, -4, -2, -0.7, 0, 0.7, 2, 4, 8, 20, 34]


def central_cases(pick):
    shapes = [0.5, 1, 2, 3.7, 10, 31, 150, 420.5, 1e3, 1e4, 2e5, 1e7, 1e9, 1e12]
    cases = []
    for df, z in itertools.product(shapes, POINTS):
        root = 1 - 2 / (9 * df) + z * (2 / (9 * df)) ** 0.5
        x = df * root**3 if root > 0.02 else df * 10.0**z
        cases.append(("chi2", rounded(x, 13), df))
    for (df1, df2), z in itertools.product(itertools.product(shapes, shapes), POINTS):
        spread = (2 / df1 + 2 / df2) ** 0.5
        cases.append(("f", rounded(2.718281828459045 ** (z * spread), 13), df1, df2))
        mean = df1 / (df1 + df2)
        odds = df1 / df2 * 2.718281828459045 ** (z * spread)
        if 1e-300 < odds < 1e3:
            cases.append(("beta", rounded(odds / (1 + odds), 15), df1, df2))
    for df, z in itertools.product(shapes, POINTS):
        if z:
            cases.append(("t", rounded(z * (1 + z * z / df) ** 0.5 if df < 50 else z, 13), df))
    return [(name, tuple(p) + (x,)) for name, x, *p in pick(cases)]


def noncentral_cases(pick):
    cases = []
    dfs = [0.5, 1, 2, 3.7, 10, 38, 61, 200, 5e3, 1e6, 1e9, 1e12]
    deltas = [-1e3, -40, -12.5, -7, -1, -1e-3, 1e-9, 0.3, 2.8, 8, 11.9, 12.1, 15, 60, 1000]
    for df, delta, z in itertools.product(dfs, deltas, POINTS):
        x = delta + z * (1 + delta * delta / (2 * df)) ** 0.5
        if df < 30:
            x = delta * 2.718281828459045 ** (z / (2 * df) ** 0.5) + z
        cases.append(("noncentral_t", (df, delta, rounded(x))))
    lambdas = [1e-6, 0.5, 7.849, 30, 200, 1500, 5000, 7000, 1e5, 1e6]
    for df, ncp, z in itertools.product([0.5, 1, 2, 3.7, 10, 38, 200, 5e3, 1e6, 1e9], lambdas, POINTS):
        spread, mean = (2 * (df + 2 * ncp)) ** 0.5, df + ncp
        x = mean + z * spread if mean + z * spread > 0 else mean * 10.0 ** (z / 4)
        cases.append(("noncentral_chi2", (df, ncp, rounded(x, 12))))
    for df1, df2, ncp, z in itertools.product(
        [0.5, 1, 2, 5, 12, 200, 1e4, 1e7], [0.5, 1, 3, 10, 38, 200, 1e4, 1e6, 1e12], lambdas, POINTS
    ):
        mean = (df1 + ncp) / df1
        relative = (2 * (df1 + 2 * ncp)) ** 0.5 / (df1 + ncp)
        x = mean * 2.718281828459045 ** (z * (relative * relative + 2 / df2) ** 0.5)
        if x < 1e250:
            cases.append(("noncentral_f", (df1, df2, ncp, rounded(x))))
            odds = df1 / df2 * x
            if odds < 1e3:
                cases.append(("noncentral_beta", (df1, df2, ncp, rounded(odds / (1 + odds), 12))))
    return pick(cases)


def density_cases(pick):
    cases = []
    for name, parameters in [(n, p) for n, p in noncentral_cases(lambda all_cases: all_cases) if n in DENSITIES]:
        if name == "noncentral_t" or max(parameters[:-1]) <= 1500:
            cases.append((name, parameters))
    return pick(cases)


def tail_rows(case):
    name, arguments = case
    rows = []
    for upper in (False, True):
        try:
            value = TAILS[name](*arguments, upper)
        except (ArithmeticError, ValueError) as error:
            print(f"left out: {name} {arguments} {upper}: {error}", file=sys.stderr)
            continue
        if value < mpf("1e-290") or value > 1 - mpf("1e-17"):
            continue
        rows.append((f"{name}_{'sf' if upper else 'cdf'}", arguments, value))
    return rows


def density_rows(case):
    name, arguments = case
    value = DENSITIES[name](*arguments)
    if value < mpf("1e-290"):
        return []
    return [(f"{name}_density", arguments, value)]


def write(file, oracle, rows):
    with open(HERE / file, "w") as out:
        out.write("# Written by tests/reference/generate.py; mpmath " + mpmath.__version__ + ", 50 digits or more.\n")
        out.write(f"# Oracle: {oracle}.\n")
        out.write("function\targuments\texpected\n")
        for function, arguments, value in rows:
            out.write(f"{function}\t{','.join(repr(a) for a in arguments)}\t{mpmath.nstr(value, 20)}\n")


def sample(count, seed):
    def pick(cases):
        return random.Random(seed).sample(cases, min(count, len(cases)))

    return pick


def main():
    wanted = sys.argv[1:] or ["central", "noncentral", "densities"]
    with Pool(2) as pool:
        if "central" in wanted:
            rows = pool.map(tail_rows, central_cases(sample(260, 1)), chunksize=4)
            write("central_tails.tsv", "panel integrals of the density over the log (odds) variable", sum(rows, []))
        if "noncentral" in wanted:
            rows = pool.map(tail_rows, noncentral_cases(sample(380, 2)), chunksize=4)
            write("noncentral_tails.tsv", "60-digit Poisson mixtures; panel integrals over the scale for t", sum(rows, []))
        if "densities" in wanted:
            rows = pool.map(density_rows, density_cases(sample(120, 3)), chunksize=4)
            write("densities.tsv", "Bessel and Kummer closed forms; panel integrals over the scale for t", sum(rows, []))


if __name__ == "__main__":
    main()
