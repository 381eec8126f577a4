#!/usr/bin/env python3
# SPDX-License-Identifier: Apache-2.0
"""The peer of audit_bench: the same bootstrap with numpy, on rows (one per patient) and on the tally.

On rows: patients drawn with replacement, means of their scores, and the area under the curve of each cause from ranks.
Forecasts take few distinct values, so ranks come from counting them instead of from sorting a million rows: the
quickest way known to the author of this file, and many times quicker than argsort."""
import sys
import time

import numpy

PATTERNS, CAUSES = 1700, 6
patients, replicates = float(sys.argv[1]), int(sys.argv[2])

g, k = numpy.arange(PATTERNS)[:, None], numpy.arange(CAUSES)[None, :]
forecast = numpy.exp((7 * g + 13 * k + g * k) % 101 / 25.0)
forecast /= forecast.sum(axis=1, keepdims=True)
count = numpy.rint((1 + g % 7) * patients / (4.0 * PATTERNS) * (0.7 * forecast + 0.05)).astype(int)
pattern, cause = numpy.nonzero(count)
cells = count[pattern, cause]
log_score = -numpy.log(forecast[pattern, cause])
brier = (forecast**2).sum(axis=1)[pattern] - 2 * forecast[pattern, cause] + 1
hit = (forecast.argmax(axis=1)[pattern] == cause).astype(float)
level = numpy.empty((CAUSES, PATTERNS), dtype=int)
for c in range(CAUSES):
    level[c] = numpy.unique(forecast[:, c].round(12), return_inverse=True)[1]
random = numpy.random.Generator(numpy.random.Philox(1))


def area(at, own, weight, size):
    wins = numpy.bincount(at[own], None if weight is None else weight[own], size)
    losses = numpy.bincount(at[~own], None if weight is None else weight[~own], size)
    below = numpy.cumsum(losses) - losses
    return (wins * (below + losses / 2)).sum() / (wins.sum() * losses.sum())


def interval(rows):
    low, high = numpy.quantile(numpy.array(rows), [0.025, 0.975], axis=0)
    return f"log score {low[0]:.5f} to {high[0]:.5f}, area of cause 0 {low[3]:.5f} to {high[3]:.5f}"


# Rows, as a data frame of patients would hold them.
row_log, row_brier, row_hit = (numpy.repeat(x, cells) for x in (log_score, brier, hit))
row_cause = numpy.repeat(cause, cells)
row_level = [numpy.repeat(level[c][pattern], cells) for c in range(CAUSES)]
n = len(row_cause)
start = time.perf_counter()
drawn = []
for _ in range(replicates):
    who = random.integers(0, n, n)
    y = row_cause[who]
    areas = [area(row_level[c][who], y == c, None, PATTERNS) for c in range(CAUSES)]
    drawn.append([row_log[who].mean(), row_brier[who].mean(), row_hit[who].mean(), *areas])
took = 1e3 * (time.perf_counter() - start) / replicates
print(f"numpy {numpy.__version__} on {n} rows   {took:9.2f} ms a replicate ({replicates} made)   {interval(drawn)}")

# The tally, as ours does it.
start = time.perf_counter()
drawn = []
tries = 20 * replicates
for _ in range(tries):
    weight = random.multinomial(n, cells / n)
    areas = [area(level[c][pattern], cause == c, weight, PATTERNS) for c in range(CAUSES)]
    drawn.append([weight @ log_score / n, weight @ brier / n, weight @ hit / n, *areas])
took = 1e3 * (time.perf_counter() - start) / tries
print(f"numpy {numpy.__version__} on the tally   {took:9.2f} ms a replicate ({tries} made)   {interval(drawn)}")
