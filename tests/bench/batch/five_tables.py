# SPDX-License-Identifier: Apache-2.0
"""A table set of five of the shipped findings, without conditions of use, groups and alternatives.

usage: five_tables.py SHIPPED_FOLDER OUT_FOLDER
What is left can be computed by any naive Bayes program, so that peers can be asked for the same posteriors.
"""
import pathlib
import sys

import yaml

FINDINGS = ["serum_potassium", "serum_bicarbonate", "gfr", "urine_ph", "urine_anion_gap"]


def main(shipped, out):
    out = pathlib.Path(out)
    out.mkdir(parents=True, exist_ok=True)
    read = lambda name: yaml.load((pathlib.Path(shipped) / name).read_text(), Loader=yaml.BaseLoader)
    whole = read("set.yaml")
    few = {key: whole[key] for key in ("format", "title", "caution", "gate", "urgent", "sources")}
    few["title"] = "Five findings"
    few["causes"] = {id: cause for id, cause in whole["causes"].items() if "parts" not in cause}
    few["findings"] = FINDINGS
    few["features"] = {few["gate"][key]: whole["features"][few["gate"][key]]
                       for key in ("alkali_feature", "pregnancy_feature") if key in few["gate"]}
    cited = yaml.dump([few["gate"], few["urgent"]])
    few["sources"] = {key: source for key, source in whole["sources"].items() if key in cited}
    (out / "set.yaml").write_text(yaml.dump(few, sort_keys=False))
    for finding in FINDINGS:
        table = read(finding + ".yaml")
        table.pop("usable_when", None)
        cited = yaml.dump(table["rows"])
        table["sources"] = {key: source for key, source in table.get("sources", {}).items() if key in cited}
        (out / (finding + ".yaml")).write_text(yaml.dump(table, sort_keys=False))


if __name__ == "__main__":
    main(*sys.argv[1:])
