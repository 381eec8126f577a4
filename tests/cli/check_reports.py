#!/usr/bin/python3
# SPDX-License-Identifier: Apache-2.0
"""Holds the reports of the program against docs/report.schema.json (JSON Schema 2020-12).

usage: check_reports.py PROGRAM SOURCE_FOLDER
"""
import copy
import json
import pathlib
import subprocess
import sys

import jsonschema


def validator(path):
    schema = json.loads(path.read_text(encoding="utf-8"))
    jsonschema.Draft202012Validator.check_schema(schema)
    return jsonschema.Draft202012Validator(schema)


def reports(program, cases, *options):
    done = subprocess.run([program, "weigh", "--as", "json", "--draws", "1000", *options, *map(str, cases)], capture_output=True, text=True)
    if done.returncode not in (0, 4):
        sys.exit(f"weigh failed: {done.stderr}")
    return json.loads(done.stdout)


def main():
    program, source = sys.argv[1], pathlib.Path(sys.argv[2])
    report_schema = validator(source / "docs/report.schema.json")
    cases = sorted((source / "docs/cases").glob("*.yaml"))
    checked = 0
    faults = []
    for options in ([], ["--weigh-anyway"], ["--priors", "renal-clinic-overlap"], ["--priors", "renal-causes"],
                    ["--until", "0.97", "--epsilon", "0.1", "--burden", "bedside"]):
        for report in reports(program, cases, *options):
            for error in report_schema.iter_errors(report):
                faults.append(f"{report['case']} {options}: {error.json_path}: {error.message}")
            checked += 1

    # The schema must be able to refuse: spoil a good report in ways that matter and see each refused.
    good = next(report for report in reports(program, cases) if report["causes"])
    spoiled = {
        "a probability above 1": lambda r: r["causes"][0].__setitem__("posterior", 1.2),
        "no caution": lambda r: r.pop("caution"),
        "an unknown key": lambda r: r.__setitem__("verdict", "classic distal"),
        "another format": lambda r: r.__setitem__("format", "steelyard.report/2"),
        "a finding neither used nor explained": lambda r: r["ledger"][0].__setitem__("used", "yes"),
        "one cause only": lambda r: r.__setitem__("causes", r["causes"][:1]),
        "a chance above 1": lambda r: r["next"][0]["after"][0].__setitem__("probability", 1.5),
        "an unknown key of the fit": lambda r: r["fit"].__setitem__("verdict", "good"),
        "a negative number of bits": lambda r: r["next"][0].__setitem__("bits", -0.1),
        "no digest": lambda r: r["provenance"]["tables"].pop("digest"),
    }
    for name, spoil in spoiled.items():
        bad = copy.deepcopy(good)
        spoil(bad)
        if report_schema.is_valid(bad):
            faults.append(f"the schema accepts {name}")

    if faults:
        sys.exit("\n".join(faults))
    print(f"{checked} reports hold, {len(spoiled)} spoiled ones are refused")


main()
