# SPDX-License-Identifier: Apache-2.0
"""Table sets, prior sets, cases and expected posteriors of two open data sets.

usage: make_open_data.py            writes everything below tests/data and tests/reference
       make_open_data.py --check    says what differs from the files checked in, and writes nothing

The data, tests/data/open/urine.csv and wine.csv, are described in tests/data/open/README.md. The rule is the
discretised naive Bayes that e1071::naiveBayes(laplace = 1) and scikit-learn's CategoricalNB(alpha = 1) also follow:
a value belongs to the category whose number is the count of cut points not above it; a blank is a finding that is
not known; P(category | cause) = (count + 1) / (n + categories), n over the rows of the cause in which the finding is
known; priors are the shares of the causes. The expected posteriors are worked out here in exact fractions; the test
also compares with figures of e1071 itself, tests/reference/open_data.csv.
"""
import csv
import io
import pathlib
import sys
from fractions import Fraction

TESTS = pathlib.Path(__file__).resolve().parent.parent
LEVELS = ["low", "middle", "high"]
SPDX = "# SPDX-License-Identifier: Apache-2.0\n"
MADE = "# Made by tests/reference/make_open_data.py.\n"

URINE = dict(
    file="urine.csv", column="r", folder="urine_crystals", title="Urine with and without crystals",
    causes={"0": ("no_crystals", "No calcium oxalate crystals"), "1": ("crystals", "Calcium oxalate crystals")},
    source="andrews-herzberg-1985",
    cite="Andrews DF, Herzberg AM. Data. Springer 1985; data set urine of the R package boot 1.3-28.1",
    cuts={"gravity": ("Specific gravity", ["1.015", "1.021"]), "ph": ("Urine pH", ["5.65", "6.2"]),
          "osmo": ("Osmolarity", ["480", "740"]), "cond": ("Conductivity", ["17.4", "25.4"]),
          "urea": ("Urea", ["188", "325"]), "calc": ("Calcium", ["2.15", "4.75"])},
    learnt=lambda row: True, scored=lambda row: True)

WINE = dict(
    file="wine.csv", column="class", folder="wine", title="Wines of three cultivars",
    causes={"0": ("first", "First cultivar"), "1": ("second", "Second cultivar"), "2": ("third", "Third cultivar")},
    source="forina-1991",
    cite="Forina M and others. Wine recognition data, UCI Machine Learning Repository 1991; data set wine of "
         "scikit-learn 1.2.1",
    cuts={"alcohol": ("Alcohol", ["12.5", "13.5"]), "malic_acid": ("Malic acid", ["1.65", "2.55"]),
          "ash": ("Ash", ["2.28", "2.48"]), "alcalinity_of_ash": ("Alcalinity of ash", ["18", "21"]),
          "magnesium": ("Magnesium", ["92", "103"]), "total_phenols": ("Total phenols", ["1.95", "2.6"]),
          "flavanoids": ("Flavanoids", ["1.5", "2.65"]),
          "nonflavanoid_phenols": ("Nonflavanoid phenols", ["0.29", "0.42"]),
          "proanthocyanins": ("Proanthocyanins", ["1.35", "1.8"]),
          "color_intensity": ("Colour intensity", ["3.75", "5.65"]), "hue": ("Hue", ["0.87", "1.07"]),
          "od280_od315_of_diluted_wines": ("Absorbance at 280 to 315 nm", ["2.3", "3.0"]),
          "proline": ("Proline", ["560", "835"])},
    learnt=lambda row: row % 3 != 2, scored=lambda row: row % 3 == 2)

# First lines of the files of posteriors.
URINE_DATA = ("Forecasts of a naive Bayes with one added to each count, from urine of the R package boot (Andrews and Herzberg, "
              "Data, 1985), ")
URINE_SAME_ROWS = URINE_DATA + "tables and priors of the same rows."
URINE_NINE_TO_ONE = URINE_DATA + "tables of the same rows, prior odds 9 to 1 against crystals."
URINE_LOO = URINE_DATA + "each patient left out of the tables and priors in turn."
WINE_SPLIT = ("Forecasts of a naive Bayes with one added to each count, from wine of scikit-learn (Forina et al., UCI repository), "
              "every third row forecast from the others.")

# Every table set has a gate. This one has nothing to judge: the cases hold no analyte.
GATE = """gate:
  bicarbonate_low: {value: 22 mmol/L, basis: practice}
  ph_low: {value: "7.35", basis: practice}
  ph_high: {value: "7.45", basis: practice}
  gap_normal_to: {value: 12 mmol/L, basis: practice}
  gap_high_from: {value: 16 mmol/L, basis: practice}
  gfr_reduced_below: {value: "45 mL/min/{1.73_m2}", basis: practice}
  expected_pco2_band: {value: 2 mmHg, basis: practice}
  gas_bicarbonate: {value: 2 mmol/L, basis: practice}
  gas_ph: {value: 0.04, basis: practice}
  age_least: {value: 18 a, basis: practice}
  albumin_reference: {value: 40 g/L, basis: practice}
  albumin_slope: {value: 0.25, basis: practice}
  anion_gap_reference: {value: 10 mmol/L, basis: practice}
  bicarbonate_reference: {value: 24 mmol/L, basis: practice}
  expected_pco2_slope: {value: 1.5, basis: practice}
  expected_pco2_intercept: {value: 8, basis: practice}
  pco2_high: {value: 45 mmHg, basis: practice}
  lactate_high: {value: 4 mmol/L, basis: practice}
  ketones_high: {value: 3 mmol/L, basis: practice}
  alkali_feature: none
"""


def read(data):
    """Rows as (cause number, category of each finding or None)."""
    classes = list(data["causes"])
    rows = []
    with open(TESTS / "data/open" / data["file"], newline="") as file:
        for row in csv.DictReader(file):
            categories = [None if row[name] == "" else sum(Fraction(cut) <= Fraction(row[name]) for cut in cuts)
                          for name, (_, cuts) in data["cuts"].items()]
            rows.append((classes.index(row[data["column"]]), categories))
    return rows


def learn(rows, data):
    """Counts by cause, and for each finding and cause the counts of its categories."""
    causes = [sum(cause == k for cause, _ in rows) for k in range(len(data["causes"]))]
    tables = [[[sum(cause == k and found[f] == band for cause, found in rows) for band in range(len(LEVELS))]
               for k in range(len(causes))] for f in range(len(data["cuts"]))]
    return causes, tables


def share(counts):
    return [Fraction(count + 1, sum(counts) + len(LEVELS)) for count in counts]


def posterior(found, weights, tables):
    odds = [Fraction(weight) for weight in weights]
    for table, band in zip(tables, found):
        if band is not None:
            odds = [o * share(counts)[band] for o, counts in zip(odds, table)]
    return [o / sum(odds) for o in odds]


def set_file(data):
    text = SPDX + MADE
    text += "# The gate is asked of every set; cases of this one hold nothing that it could judge.\n"
    text += f"format: steelyard.table-set/1\ntitle: {data['title']}\ncaution: For tests only\ncauses:\n"
    for cause, title in data["causes"].values():
        text += f"  {cause}: {{title: {title}}}\n"
    return text + f"findings: [{', '.join(data['cuts'])}]\n" + GATE


def table_file(data, name, table):
    title, cuts = data["cuts"][name]
    text = SPDX + MADE + f"format: steelyard.evidence-table/1\nfinding: {name}\ntitle: {title}\n"
    text += f"levels: [{', '.join(LEVELS)}]\n"
    text += f"note: low below {cuts[0]}, high from {cuts[1]} in the units of the data; one patient added to each level.\n"
    text += "rows:\n"
    for (cause, _), counts in zip(data["causes"].values(), table):
        shares = ", ".join(repr(float(part)) for part in share(counts))
        text += f"  {cause}: {{share: [{shares}], worth: {sum(counts) + len(LEVELS)}, basis: study, source: {data['source']}}}\n"
    return text + f"sources:\n  {data['source']}: {{cite: {data['cite']!r}}}\n"


def prior_file(data, title, weights, basis):
    text = SPDX + MADE + f"format: steelyard.prior-set/1\ntitle: {title}\ngiven_as: weights\ncauses:\n"
    for (cause, _), weight in zip(data["causes"].values(), weights):
        text += f"  {cause}: {{weight: {weight}, {basis}}}\n"
    if "source" in basis:
        text += f"sources:\n  {data['source']}: {{cite: {data['cite']!r}}}\n"
    return text


def case_file(data, rows):
    out = io.StringIO()
    writer = csv.writer(out, lineterminator="\n")
    writer.writerow(["case", *data["cuts"], "final_cause"])
    causes = [cause for cause, _ in data["causes"].values()]
    for number, (cause, found) in enumerate(rows):
        if data["scored"](number):
            writer.writerow([f"{data['folder']}-{number}", *("" if band is None else LEVELS[band] for band in found),
                             causes[cause]])
    return out.getvalue()


def posterior_file(data, rows, of, comment):
    out = io.StringIO()
    out.write(f"# {comment}\n")
    writer = csv.writer(out, lineterminator="\n")
    writer.writerow(["truth", *(f"p_{label}" for label in data["causes"])])
    for number, (cause, found) in enumerate(rows):
        if data["scored"](number):
            writer.writerow([list(data["causes"])[cause], *(repr(float(p)) for p in of(number, found))])
    return out.getvalue()


def files():
    made = {}
    for data in (URINE, WINE):
        rows = read(data)
        weights, tables = learn([row for number, row in enumerate(rows) if data["learnt"](number)], data)
        folder = "data/tables/" + data["folder"]
        made[folder + "/set.yaml"] = set_file(data)
        for name, table in zip(data["cuts"], tables):
            made[f"{folder}/{name}.yaml"] = table_file(data, name, table)
        made[folder + "-priors.yaml"] = prior_file(data, "As common as in the data", weights,
                                                   f"basis: study, source: {data['source']}")
        made[f"data/open/{data['folder']}_cases.csv"] = case_file(data, rows)
        as_learnt = lambda number, found: posterior(found, weights, tables)
        if data is WINE:
            made["reference/audit_wine_split.csv"] = posterior_file(data, rows, as_learnt, WINE_SPLIT)
            continue
        made[folder + "-priors-9-to-1.yaml"] = prior_file(data, "Crystals in one of ten", [9, 1], "basis: elicited")
        nine_to_one = lambda number, found: posterior(found, [9, 1], tables)
        left_out = lambda number, found: posterior(found, *learn(rows[:number] + rows[number + 1:], data))
        made["reference/audit_urine_same_rows.csv"] = posterior_file(data, rows, as_learnt, URINE_SAME_ROWS)
        made["reference/audit_urine_nine_to_one.csv"] = posterior_file(data, rows, nine_to_one, URINE_NINE_TO_ONE)
        made["reference/audit_urine_loo.csv"] = posterior_file(data, rows, left_out, URINE_LOO)
    return made


def main(check):
    differ = 0
    for name, text in files().items():
        path = TESTS / name
        if check:
            if not path.exists() or path.read_text() != text:
                print(f"{path}: not what make_open_data.py makes")
                differ += 1
        else:
            path.parent.mkdir(parents=True, exist_ok=True)
            path.write_text(text)
    return 1 if differ else 0


if __name__ == "__main__":
    sys.exit(main("--check" in sys.argv[1:]))
