"""Times scipy's vectorised calls on a table of inputs: scipy_times.py FUNCTION TABLE ROUNDS.

Prints nanoseconds a call (fastest round), then the values.
"""

import sys
import time

import numpy as np
from scipy import special, stats

FUNCTIONS = {
    "noncentral_t_sf": lambda df, ncp, x: stats.nct.sf(x, df, ncp),
    "noncentral_t_cdf_far_side": lambda df, ncp, x: special.nctdtr(df, ncp, x),
    "noncentral_f_sf": lambda df1, df2, ncp, x: stats.ncf.sf(x, df1, df2, ncp),
    "noncentral_chi2_sf": lambda df, ncp, x: stats.ncx2.sf(x, df, ncp),
    "noncentral_chi2_sf_large": lambda df, ncp, x: stats.ncx2.sf(x, df, ncp),
    "t_upper_quantile": lambda df, p: stats.t.isf(p, df),
}

name, table, rounds = sys.argv[1], sys.argv[2], int(sys.argv[3])
columns = np.loadtxt(table, delimiter=",").T
best = float("inf")
for _ in range(rounds):
    start = time.perf_counter()
    values = FUNCTIONS[name](*columns)
    best = min(best, time.perf_counter() - start)
print(best * 1e9 / len(values))
for value in values:
    print(repr(float(value)))
