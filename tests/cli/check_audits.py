#!/usr/bin/python3
# SPDX-License-Identifier: Apache-2.0
"""Holds audits against docs/audit.schema.json and tallies against docs/tally.schema.json (JSON Schema 2020-12), and sees
spoiled copies refused. tests/cli/audit_test.cpp makes the files.

usage: check_audits.py SOURCE_FOLDER FILES...        (.json: an audit; .tally: a tally)
"""
import copy
import json
import pathlib
import sys

import jsonschema

source = pathlib.Path(sys.argv[1])
files = [pathlib.Path(name) for name in sys.argv[2:]]
faults = []


def load(name):
    schema = json.loads((source / "docs" / name).read_text(encoding="utf-8"))
    jsonschema.Draft202012Validator.check_schema(schema)
    return schema


audit_schema = jsonschema.Draft202012Validator(load("audit.schema.json"))
tally = load("tally.schema.json")
head_schema = jsonschema.Draft202012Validator(tally)
cell_schema = jsonschema.Draft202012Validator({"$ref": "#/$defs/cell", "$defs": tally["$defs"]})


def hold(validator, value, name):
    for error in validator.iter_errors(value):
        faults.append(f"{name}: {error.json_path}: {error.message}")


audits = []
for file in files:
    if file.suffix == ".json":
        audits.append(json.loads(file.read_text(encoding="utf-8")))
        hold(audit_schema, audits[-1], file.name)
        continue
    for number, line in enumerate(file.read_text(encoding="utf-8").splitlines(), start=1):
        hold(head_schema if number == 1 else cell_schema, json.loads(line), f"{file.name}:{number}")

# The schema must be able to refuse: spoil a full audit in ways that matter and see each refused.
good = next(audit for audit in audits if audit["figures"] and audit["strata"] and audit["against"] and audit["dependence"])
spoiled = {
    "a share above 1": lambda a: a["figures"]["top"][0].__setitem__("value", 1.2),
    "no caution": lambda a: a.pop("caution"),
    "an unknown key": lambda a: a.__setitem__("score", 1),
    "an unknown verdict": lambda a: a["verdict"].__setitem__("word", "good"),
    "no limits": lambda a: a["verdict"].__setitem__("limits", []),
    "half a patient": lambda a: a["flow"].__setitem__("read", 1.5),
    "a count lost": lambda a: a["flow"].pop("undiagnosed"),
    "one cause only": lambda a: a.__setitem__("causes", a["causes"][:1]),
    "another format": lambda a: a.__setitem__("format", "steelyard.audit/2"),
    "an unknown key of a stratum": lambda a: a["strata"][0]["figures"].__setitem__("auc", 1),
    "a rho above 1": lambda a: a["dependence"][0].__setitem__("rho_now", 1.5),
    "no digest": lambda a: a["provenance"]["tables"].pop("digest"),
    "no seed": lambda a: a["settings"].pop("seed"),
}
for name, spoil in spoiled.items():
    bad = copy.deepcopy(good)
    spoil(bad)
    if audit_schema.is_valid(bad):
        faults.append(f"the schema accepts {name}")

if faults:
    sys.exit("\n".join(faults))
print(f"{len(files)} files hold, {len(spoiled)} spoiled audits are refused")
