# SPDX-License-Identifier: Apache-2.0
"""The same posteriors with pandas and scikit-learn's CategoricalNB, from file to file.

usage: peer_pandas.py ROWS.csv TABLES.json PRIORS.json OUT.csv
TABLES and PRIORS are `steelyard tables show --as json` and `steelyard priors show --as json`. Gate, urgent
values, units and faulty rows are not looked at.
"""
import json
import sys
import time

import numpy as np
import pandas as pd
from sklearn.naive_bayes import CategoricalNB


def model(tables, priors):
    causes = [cause["id"] for cause in priors["causes"]]
    bayes = CategoricalNB()
    bayes.classes_ = np.array(causes)
    bayes.class_log_prior_ = np.log([cause["prior"] for cause in priors["causes"]])
    bayes.feature_log_prob_ = [
        np.log(np.array([row["probability"]
                         for cause in causes for row in table["rows"] if row["cause"] == cause]))
        for table in tables["findings"]]
    bayes.n_features_in_ = len(tables["findings"])
    bayes.n_categories_ = np.array([len(table["bands"]) for table in tables["findings"]])
    return bayes


def quantities(frame):
    female = frame["sex"].to_numpy() == "female"
    ratio = frame["serum_creatinine [umol/L]"] * 113.12 / 1e4 / np.where(female, 0.7, 0.9)
    gfr = (142 * np.minimum(ratio, 1) ** np.where(female, -0.241, -0.302) * np.maximum(ratio, 1) ** -1.2
           * 0.9938 ** frame["age [a]"] * np.where(female, 1.012, 1.0))
    gap = frame["urine_sodium [mmol/L]"] + frame["urine_potassium [mmol/L]"] - frame["urine_chloride [mmol/L]"]
    return {"serum_potassium": frame["serum_potassium [mmol/L]"], "gfr": gfr, "urine_ph": frame["urine_ph"],
            "serum_bicarbonate": frame["serum_bicarbonate [mmol/L]"], "urine_anion_gap": gap}


def main(rows, tables_file, priors_file, out):
    tables, priors = json.load(open(tables_file)), json.load(open(priors_file))
    bayes = model(tables, priors)
    start = time.perf_counter()
    frame = pd.read_csv(rows)
    values = quantities(frame)
    bands = np.column_stack([np.digitize(values[table["finding"]], table["edges"]) for table in tables["findings"]])
    posterior = pd.DataFrame(bayes.predict_proba(bands), columns=bayes.classes_)
    posterior.insert(0, "case", frame["case"])
    posterior["leader"] = bayes.classes_[np.argmax(posterior[bayes.classes_].to_numpy(), axis=1)]
    posterior.to_csv(out, index=False)
    print(f"{time.perf_counter() - start:.3f}")


if __name__ == "__main__":
    main(*sys.argv[1:])
