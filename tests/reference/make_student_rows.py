#!/usr/bin/env python3
# SPDX-License-Identifier: Apache-2.0
"""Makes student_rows.csv: band probabilities of Student-t predictive rows, with mpmath at 50 digits.

    python3 make_student_rows.py > student_rows.csv

Reads student_rows_inputs.csv (case,mean,sd,n,scale,edges; edges separated by blanks). The numbers there are taken as the
binary64 values nearest to them, as the program reads them. A tail is the regularised incomplete beta function
P(T > t) = I_x(nu/2, 1/2) / 2, x = nu / (nu + t^2), t >= 0; each is computed at 50 and at 80 digits and must agree.
"""
import csv
import os
import sys

import mpmath
from mpmath import mp, mpf

HERE = os.path.dirname(os.path.abspath(__file__))
INFINITY = mpf("inf")


def tail(t, nu):
    """P(T > t) for t >= 0."""
    if t == INFINITY:
        return mpf(0)
    return mpmath.betainc(nu / 2, mpf(1) / 2, 0, nu / (nu + t * t), regularized=True) / 2


def between(low, high, nu):
    if low >= 0:
        return tail(low, nu) - tail(high, nu)
    if high <= 0:
        return tail(-high, nu) - tail(-low, nu)
    return 1 - tail(-low, nu) - tail(high, nu)


def bands(mean, sd, n, scale, edges):
    mean, sd, n = mpf(mean), mpf(sd), mpf(n)
    x = [mpmath.log(mpf(e)) if scale == "log" else mpf(e) for e in edges]
    t = [-INFINITY] + [(v - mean) / (sd * mpmath.sqrt(1 + 1 / n)) for v in x] + [INFINITY]
    return [between(t[i], t[i + 1], n - 1) for i in range(len(t) - 1)]


out = csv.writer(sys.stdout, lineterminator="\n")
out.writerow(["case", "quantity", "value", "tol", "reference"])
with open(os.path.join(HERE, "student_rows_inputs.csv"), encoding="utf-8") as text:
    for row in csv.DictReader(line for line in text if not line.startswith("#")):
        given = (float(row["mean"]), float(row["sd"]), float(row["n"]), row["scale"],
                 [float(e) for e in row["edges"].split()])
        mp.dps = 80
        check = bands(*given)
        mp.dps = 50
        for i, p in enumerate(bands(*given)):
            assert abs(p - check[i]) <= mpf("1e-25") * check[i], (row["case"], i)
            out.writerow([row["case"], f"band[{i}]", mpmath.nstr(check[i], 20), "1e-12", f"mpmath {mpmath.__version__} at 50 and 80 digits"])
