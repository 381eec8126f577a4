#!/usr/bin/env python3
# SPDX-License-Identifier: Apache-2.0
"""The peer of draws_bench: the same draws with numpy, as one would write them there."""
import sys
import time

import numpy

CAUSES, FINDINGS, BANDS = 6, 12, 5
draws = int(sys.argv[1])

start = time.perf_counter()
random = numpy.random.Generator(numpy.random.Philox(1))
scores = numpy.zeros((CAUSES, draws))
for f in range(FINDINGS):
    for k in range(CAUSES):
        alpha = numpy.array([5.5 + (7 * f + 3 * k + 5 * b) % 11 for b in range(BANDS)])
        seen = alpha[f % BANDS]
        scores[k] += numpy.log(random.beta(seen, alpha.sum() - seen, draws))
share = numpy.exp(scores - scores.max(axis=0))
share /= share.sum(axis=0)
low, high = numpy.quantile(share, [0.025, 0.975], axis=1)
leads = numpy.bincount(share.argmax(axis=0), minlength=CAUSES) / draws
took = 1e3 * (time.perf_counter() - start)
print(f"numpy      {numpy.__version__}    {took:8.1f} ms                   {draws / took:8.0f} draws/ms  "
      f"cause 0: {low[0]:.4f} to {high[0]:.4f}")
