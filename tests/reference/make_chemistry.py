#!/usr/bin/env python3
# SPDX-License-Identifier: Apache-2.0
"""Writes chemistry.csv: check values of the formulas, worked out in 50-digit decimal arithmetic from the published
formulas and independently of the program. Published figures are entered as printed, with half their last digit (or the
stated spread) as tolerance. Run from any folder: python3 make_chemistry.py"""
import os
from decimal import Decimal as D, getcontext

getcontext().prec = 50
rows = []
A, PK = D("0.0307"), D("6.1")


def computed(case, quantity, value, rounded, why="computed from the formula; decimal 50 digits"):
    """`rounded` is the figure worked out by hand beforehand: the two must agree to its last digit."""
    half = D(1).scaleb(D(rounded).as_tuple().exponent) / 2
    assert abs(value - D(rounded)) <= half * D("1.02"), (case, value, rounded)
    rows.append((case, quantity, f"{value:.17g}", "1e-13", why))


def published(case, quantity, value, tolerance, source):
    rows.append((case, quantity, value, f"abs:{tolerance}", source))


def pow10(x):
    return D(10) ** x


BRANDIS = "published: Brandis; Acid-base Physiology (online textbook); clinical case 31"
published("case31", "anion_gap", "10.5", "1e-12", BRANDIS + "; Na 143 Cl 120 HCO3 12.5")
published("case31", "delta_ratio", "-0.13", "0.005", BRANDIS + "; gap reference 12 and bicarbonate 24")
published("case31", "ph", "7.20", "0.02", BRANDIS + "; measured pH; HCO3 12.5 pCO2 31")
published("case31", "urine_anion_gap", "30", "1e-12", BRANDIS + "; Na 70 K 25 Cl 65")
published("normal", "ph", "7.40", "0.01", "published in textbooks with a solubility of 0.03; HCO3 24 pCO2 40")
published("citrate", "mmol", "1.67", "0.005", "published: ZUCKERMAN2009 (Rev Urol 2009); 320 mg of citrate")

ag = D("10.5")
computed("albumin21", "reference40", ag + D("0.25") * (40 - 21), "15.25")
computed("albumin21", "reference44", ag + D("0.25") * (44 - 21), "16.25")
computed("gap20", "delta_ratio", D(20 - 12) / D(24 - 16), "1.0")
computed("worked", "anion_gap_corrected", D(139 - 115 - 14) + D("0.25") * (40 - 38), "10.5")
computed("worked", "delta_ratio", (D("10.5") - 10) / D(24 - 14), "0.05")
for bicarbonate, fine, rough in (("15", "31.46", "30.5"), ("12.5", "27.61", "26.75")):
    computed("winters_" + bicarbonate, "fine", D("1.54") * D(bicarbonate) + D("8.36"), fine)
    computed("winters_" + bicarbonate, "rounded", D("1.5") * D(bicarbonate) + 8, rough)
computed("hh_24_40", "ph", PK + (D(24) / (A * 40)).log10(), "7.3910")
computed("hh_12.5_31", "ph", PK + (D("12.5") / (A * 31)).log10(), "7.2184")
computed("hh_7.20_31", "bicarbonate", A * 31 * pow10(D("7.20") - PK), "11.98")
computed("henderson", "hydrogen_ion", D(24) * 31 / D("12.5"), "59.52")

computed("uag", "negative", D(40 + 20 - 80), "-20")
for gap, ammonium in (("-20", "98"), ("0", "82"), ("30", "58")):
    computed("goldstein_" + gap, "ammonium", 82 - D("0.8") * D(gap), ammonium)
computed("uog", "gap", D(500) - (2 * D(40 + 30) + 250), "110")
computed("uog", "ammonium", (D(500) - (2 * D(40 + 30) + 250)) / 2, "55")
computed("uog", "with_glucose", D(550) - (2 * D(40 + 30) + 250 + 50), "110")
computed("uog", "glucose_left_out", D(550) - (2 * D(40 + 30) + 250), "160")


def fe(u, p, ucr, pcr):
    return 100 * D(u) * D(pcr) / (D(p) * D(ucr))


computed("fe", "sodium", fe("40", "140", "5304", "88.42"), "0.476")
computed("fe", "bicarbonate", fe("120", "25", "24", "1.0"), "20.0")
computed("fe", "potassium", fe("40", "6.0", "80", "2.0"), "16.67")
computed("fe", "urate", fe("30", "3.0", "80", "1.0"), "12.5")


def urine_bicarbonate(ph, pco2, na, k):
    pk = D("6.33") - D("0.5") * ((D(na) + D(k)) / 1000).sqrt()
    return D("0.0309") * D(pco2) * pow10(D(ph) - pk)


computed("urine_bicarbonate", "alkaline", urine_bicarbonate("7.5", "60", "100", "50"), "42.83")
computed("urine_bicarbonate", "acid", urine_bicarbonate("6.0", "45", "60", "40"), "0.936")
computed("ttkg", "high_potassium", (D(40) / 6) / (D(600) / 290), "3.22")
computed("ttkg", "low_potassium", (D(20) / 3) / (D(400) / 285), "4.75")


def tmp(pu, pp, crp, cru):
    trp = 1 - D(pu) * D(crp) / (D(pp) * D(cru))
    per = trp if trp <= D("0.86") else D("0.3") * trp / (1 - D("0.8") * trp)
    return trp, per * D(pp)


trp, threshold = tmp("20", "0.70", "0.08", "6.0")
computed("tmp_low", "trp", trp, "0.6190")
computed("tmp_low", "tmp_gfr", threshold, "0.4333")
trp, threshold = tmp("15", "1.00", "0.07", "10.0")
computed("tmp_high", "trp", trp, "0.8950")
computed("tmp_high", "tmp_gfr", threshold, "0.9454")


def ckd_epi(scr, age, female):
    k, a = (D("0.7"), D("-0.241")) if female else (D("0.9"), D("-0.302"))
    r = D(scr) / k
    low, high = min(r, D(1)), max(r, D(1))
    return 142 * low**a * high ** D("-1.200") * D("0.9938") ** age * (D("1.012") if female else 1)


for scr, age, sex, gfr in (("0.60", 30, "F", "123.76"), ("0.80", 50, "F", "89.71"), ("3.00", 70, "F", "16.22"),
                           ("0.80", 30, "M", "122.10"), ("0.90", 50, "M", "104.05"), ("1.00", 40, "M", "97.58"),
                           ("2.00", 55, "M", "38.69"), ("4.00", 55, "M", "16.84")):
    computed(f"gfr_{scr}_{age}_{sex}", "gfr", ckd_epi(scr, age, sex == "F"), gfr,
             "computed from the equation of INKER2021 (coefficients as printed); decimal 50 digits")

# Glucose 600 mg/dL is 6 x 5.55 mmol/L in the SI form of the formula.
computed("katz", "slope1.6", 130 + D("1.6") * 5, "138.0")
computed("katz", "slope2.4", 130 + D("2.4") * 5, "142.0")
computed("katz", "two_slopes", 130 + D("1.6") * 3 + D("4.0") * 2, "142.8")
computed("osmolality", "calculated", D(2 * 140 + 5 + 5), "290")
computed("cl_na", "high", D(120) / 143, "0.839")
computed("cl_na", "normal", D(104) / 140, "0.743")

with open(os.path.join(os.path.dirname(os.path.abspath(__file__)), "chemistry.csv"), "w", encoding="utf-8") as out:
    out.write("case,quantity,value,tol,reference\n")
    for row in rows:
        out.write(",".join(row) + "\n")
