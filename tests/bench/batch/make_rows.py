# SPDX-License-Identifier: Apache-2.0
"""A CSV file of panels: sex, age and ten measured columns, none missing; the same for the same count.

usage: make_rows.py COUNT > FILE
The values are spread as a laboratory's might be (invented); nobody's results.
"""
import sys

import numpy as np

HEADER = ("case,sex,age [a],serum_sodium [mmol/L],serum_potassium [mmol/L],serum_chloride [mmol/L],"
          "serum_bicarbonate [mmol/L],serum_albumin [g/L],serum_creatinine [umol/L],urine_ph,"
          "urine_sodium [mmol/L],urine_potassium [mmol/L],urine_chloride [mmol/L]\n")


def main(count):
    random = np.random.default_rng(7)
    out = sys.stdout
    out.write(HEADER)
    made = 0
    while made < count:
        n = min(100_000, count - made)
        draw = lambda mean, sd, low, high: np.clip(random.normal(mean, sd, n), low, high)
        sodium, potassium = draw(139, 3, 125, 150), draw(3.9, 1.1, 1.6, 8.0)
        bicarbonate, albumin = draw(16, 3, 5, 23), draw(38, 5, 15, 55)
        chloride = sodium - bicarbonate - draw(11, 2.5, 3, 25) + 0.25 * (40 - albumin)
        creatinine = np.clip(np.exp(random.normal(4.7, 0.6, n)), 30, 1500)
        urine_ph = draw(6.1, 0.8, 4.5, 8.5)
        urine_sodium, urine_potassium = draw(60, 30, 2, 250), draw(35, 15, 3, 150)
        urine_chloride = np.clip(urine_sodium + urine_potassium - random.normal(5, 40, n), 0, 400)
        sex = np.array(["female", "male"])[random.integers(0, 2, n)]
        age = random.integers(18, 90, n)
        for i in range(n):
            out.write(f"p{made + i},{sex[i]},{age[i]},{sodium[i]:.0f},{potassium[i]:.1f},{chloride[i]:.0f},"
                      f"{bicarbonate[i]:.0f},{albumin[i]:.0f},{creatinine[i]:.0f},{urine_ph[i]:.1f},"
                      f"{urine_sodium[i]:.0f},{urine_potassium[i]:.0f},{urine_chloride[i]:.0f}\n")
        made += n


if __name__ == "__main__":
    main(int(sys.argv[1]))
