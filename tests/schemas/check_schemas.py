#!/usr/bin/env python3
# SPDX-License-Identifier: Apache-2.0
"""Holds the JSON Schemas of docs/ against good files and against spoiled copies.

Every schema must be valid JSON Schema 2020-12; every file the program ships and every case of docs/ must pass;
every spoiled copy must fail, and fail at the place that was spoiled.
"""
import copy
import json
import pathlib
import re
import sys

import yaml
from jsonschema import Draft202012Validator


class Loader(yaml.SafeLoader):
    """YAML with numbers, true, false and null only: `1:3` is text here, as in the program."""


Loader.yaml_implicit_resolvers = {}
for tag, pattern, first in [
    ("null", r"^(~|null|)$", ["~", "n", ""]),
    ("bool", r"^(true|false)$", "tf"),
    ("int", r"^[-+]?[0-9]+$", "-+0123456789"),
    ("float", r"^[-+]?([0-9]+\.?[0-9]*|\.[0-9]+)([eE][-+]?[0-9]+)?$", "-+.0123456789"),
]:
    Loader.add_implicit_resolver(f"tag:yaml.org,2002:{tag}", re.compile(pattern), list(first))


def load(path):
    text = path.read_text(encoding="utf-8")
    return json.loads(text) if path.suffix == ".json" else yaml.load(text, Loader)


root = pathlib.Path(sys.argv[1])
here = root / "tests" / "schemas"
faults = []
checks = 0


def check(holds, message):
    global checks
    checks += 1
    if not holds:
        faults.append(message)


def places(error):
    """The place of an error and of those behind it (anyOf, oneOf, then)."""
    found = ["/".join(str(step) for step in error.absolute_path)]
    for inner in error.context or []:
        found += places(inner)
    return found


validators = {}
for path in sorted((root / "docs").glob("*.schema.json")):
    schema = load(path)
    Draft202012Validator.check_schema(schema)
    checks += 1
    validators[path.name.removesuffix(".schema.json")] = Draft202012Validator(schema)
check(set(validators) >= {"case", "evidence-table", "prior-set", "audit", "report", "table-set", "tally"}, "a schema is missing from docs/")


def accept(kind, value, name):
    error = next(validators[kind].iter_errors(value), None)
    check(error is None, f"{name}: refused at {places(error) if error else ''}: {error.message if error else ''}")


def refuse(kind, value, place, name):
    errors = list(validators[kind].iter_errors(value))
    check(errors, f"{name}: accepted")
    if errors:
        check(place in [p for e in errors for p in places(e)], f"{name}: refused, but at {[places(e) for e in errors]} and not at '{place}'")


def spoil(kind, good, changes):
    """Each change is (place, new value or `gone`, place of the error); applied to a fresh copy."""
    accept(kind, good, f"{kind}: the copy before spoiling")
    for place, value, at in changes:
        bad = copy.deepcopy(good)
        steps = [int(s) if s.isdigit() else s for s in place.split("/")]
        inner = bad
        for step in steps[:-1]:
            inner = inner[step]
        if value is gone:
            del inner[steps[-1]]
        else:
            inner[steps[-1]] = value
        refuse(kind, bad, at, f"{kind}: {place} = {'gone' if value is gone else json.dumps(value)}")


gone = object()

# What ships.
prior_sets = sorted((root / "priors" / "sets").glob("*.yaml"))
check(len(prior_sets) >= 5, "no prior sets were found")
for path in prior_sets:
    accept("prior-set", load(path), path.name)
for folder in sorted((root / "likelihoods" / "tables").iterdir()):
    for path in sorted(folder.glob("*.yaml")):
        accept("table-set" if path.name == "set.yaml" else "evidence-table", load(path), path.name)
for path in sorted((root / "docs" / "cases").glob("*.yaml")):
    accept("case", load(path), path.name)

# Prior sets.
odds = {
    "format": "steelyard.prior-set/1", "title": "Larkmoor adult ward", "given_as": "odds_against_rest",
    "causes": {"classic_distal": {"odds": "1:3", "range": ["1:6", "1:2"], "basis": "elicited", "source": "larkmoor-2026"},
               "renal_failure": {"odds": 3, "note": "seen often"}},
    "sources": {"larkmoor-2026": "Agreed by three physicians"}}
spoil("prior-set", odds, [
    ("format", "steelyard.prior-set/2", "format"), ("title", "", "title"), ("title", gone, ""), ("colour", "red", ""),
    ("given_as", "percentages", "given_as"), ("worth", 10, "worth"), ("causes/renal_failure", gone, "causes"),
    ("causes/classic_distal/odds", "one to three", "causes/classic_distal/odds"),
    ("causes/classic_distal/odds", "1:2:3", "causes/classic_distal/odds"),
    ("causes/classic_distal/odds", -1, "causes/classic_distal/odds"),
    ("causes/classic_distal/range", ["1:6"], "causes/classic_distal/range"),
    ("causes/classic_distal/weight", 4, "causes/classic_distal"),
    ("causes/classic_distal/basis", "practice", "causes/classic_distal/basis"),
    ("causes/classic_distal/basis", gone, "causes/classic_distal"),
    ("causes/renal_failure/basis", "study", "causes/renal_failure"),
    ("causes/Renal", {"odds": 1}, "causes"),
    ("sources/larkmoor-2026", {"doi": "10.1000/1"}, "sources/larkmoor-2026")])
weights = {"format": "steelyard.prior-set/1", "title": "t", "given_as": "weights", "worth": 10,
           "causes": {"a": {"weight": 4, "range": [2, 8]}, "b": {"weight": 45.5}}}
spoil("prior-set", weights, [
    ("causes/a/weight", 0, "causes/a/weight"), ("causes/a/weight", "1:3", "causes/a/weight"), ("worth", 0, "worth"),
    ("causes/a", {"odds": 1}, "causes/a"), ("causes/a/range", [0, 8], "causes/a/range/0")])
counts = {"format": "steelyard.prior-set/1", "title": "t", "given_as": "counts", "causes": {"a": {"count": 0}, "b": {"count": 7}}}
spoil("prior-set", counts, [
    ("causes/a/count", 4.5, "causes/a/count"), ("causes/a/count", -1, "causes/a/count"),
    ("causes/a/range", [0, 1], "causes/a"), ("worth", 7, "worth")])

# Evidence tables, one for each form of row.
table = {
    "format": "steelyard.evidence-table/1", "finding": "urine_anion_gap", "unit": "mmol/L", "edges": [-20, 0, 20], "burden": "routine",
    "usable_when": [{"quantity": "urine_sodium", "at_least": "25 mmol/L", "else": "too little sodium"},
                    {"feature": "alkali_therapy", "is": "absent", "else": "alkali is given", "when_unknown": "set_aside"}],
    "rows": {"a": {"mean": 23, "sem": 4.1, "n": 11, "basis": "study", "source": "batlle-1988"},
             "b": {"counts": [1, 0, 3, 4], "basis": "memory"},
             "c": {"share": [0.1, 0.2, 0.3, 0.4], "worth": 6, "basis": "elicited", "note": "why"},
             "d": {"ratio": [0.5, 1, 2, 3], "range": [[0.2, 1], [0.5, 2], [1, 4], [1, 9]], "against": "a", "basis": "elicited"}},
    "least": 0.005, "sources": {"batlle-1988": {"cite": "N Engl J Med 1988;318:594", "doi": "10.1056/NEJM198803103181002", "seen": "abstract"}}}
spoil("evidence-table", table, [
    ("finding", "Urine gap", "finding"), ("edges", gone, ""), ("edges", [1, 1], "edges"), ("edges", [], "edges"), ("burden", "high", "burden"),
    ("rows", gone, ""), ("least", 0.3, "least"), ("least", 0, "least"), ("cutoffs", [1], ""),
    ("usable_when/0/else", gone, "usable_when/0"), ("usable_when/0/at_least", gone, "usable_when/0"),
    ("usable_when/0/above", "3 mmol/L", "usable_when/0"), ("usable_when/0/feature", "x", "usable_when/0"),
    ("usable_when/1/is", gone, "usable_when/1"), ("usable_when/1/when_unknown", "guess", "usable_when/1/when_unknown"),
    ("rows/a/sd", 3, "rows/a"), ("rows/a/sem", gone, "rows/a"), ("rows/a/n", 1, "rows/a/n"), ("rows/a/source", gone, "rows/a"),
    ("rows/a/basis", gone, "rows/a"), ("rows/a/basis", "practice", "rows/a/basis"), ("rows/a/counts", [1, 2, 3, 4], "rows/a"),
    ("rows/b/counts", [1, 2.5], "rows/b/counts/1"), ("rows/b/counts", [1, -1], "rows/b/counts/1"), ("rows/b/worth", 3, "rows/b"),
    ("rows/c/worth", gone, "rows/c"), ("rows/c/share", [0, 1], "rows/c/share/0"), ("rows/d/against", gone, "rows/d"),
    ("rows/d/range/0", [1], "rows/d/range/0"), ("levels", ["present", "absent"], "edges")])
feature = {"format": "steelyard.evidence-table/1", "finding": "nephrocalcinosis", "title": "Nephrocalcinosis", "levels": ["present", "absent"],
           "rows": {"a": {"counts": [7, 3], "basis": "elicited"}, "b": {"share": [0.1, 0.9], "worth": 6, "basis": "elicited"}}}
spoil("evidence-table", feature, [
    ("levels", ["present"], "levels"), ("title", gone, ""), ("unit", "mmol/L", "unit"),
    ("rows/a", {"mean": 1, "sd": 1, "n": 9, "basis": "elicited"}, "rows/a")])
joint = {"format": "steelyard.evidence-table/1", "finding": "ph_and_stones", "title": "Both", "joint_of": ["urine_ph", "nephrocalcinosis"],
         "edges": [[5.5], ["present", "absent"]],
         "rows": {"a": {"joint": [[1, 2], [3, 4]], "basis": "elicited"}, "b": {"joint": [[4, 3], [2, 1]], "basis": "elicited"}}}
spoil("evidence-table", joint, [
    ("joint_of", ["urine_ph"], "joint_of"), ("edges", [[5.5]], "edges"), ("rows/a", {"counts": [1, 2, 3, 4], "basis": "elicited"}, "rows/a"),
    ("unit", "[pH]", "unit")])
mixed = {"format": "steelyard.evidence-table/1", "finding": "ttkg", "edges": [7], "study_mix": {"a": 0.4, "b": 0.6},
         "rows": {"a": {"ratio_to_rest": [0.5, 2], "basis": "elicited"}, "b": {"ratio_to_rest": [2, 0.5], "basis": "elicited"}}}
spoil("evidence-table", mixed, [
    ("study_mix", gone, "rows/a"), ("study_mix/a", 1, "study_mix/a"), ("rows/a/ratio_to_rest", [0, 2], "rows/a/ratio_to_rest/0"),
    ("rows/b", {"counts": [1, 2], "basis": "elicited"}, "rows/b")])

# Table sets: the shipped one, spoiled.
shipped = root / "likelihoods" / "tables" / "adult" / "set.yaml"
spoil("table-set", load(shipped), [
    ("format", "steelyard.table-set/9", "format"), ("gate/ph_low", gone, "gate"), ("gate/ph_least", {"value": 7}, "gate"),
    ("gate/ph_low/basis", gone, "gate/ph_low"), ("gate/ph_low/basis", "guess", "gate/ph_low/basis"),
    ("gate/alkali_feature", gone, "gate"), ("findings", gone, ""), ("findings", ["urine_ph", "urine_ph"], "findings"),
    ("causes/proximal/title", gone, "causes/proximal"), ("causes/proximal/icd10cm", "acidosis", "causes/proximal/icd10cm"),
    ("causes/proximal/takes", {"gfr": "proximal"}, "causes/proximal"),
    ("groups/0/rho", 1.5, "groups/0/rho"), ("groups/0/findings", ["urine_ph"], "groups/0/findings"),
    ("urgent/0/basis", gone, "urgent/0"), ("urgent/0", {"quantity": "serum_potassium", "basis": "practice"}, "urgent/0"),
    ("variation/urine_dilution/value", "20 mmol/L", "variation/urine_dilution/value"),
    ("variation/urine_dilution/basis", gone, "variation/urine_dilution"),
    ("variation/serum_sodium/within/basis", gone, "variation/serum_sodium/within"),
    ("variation/serum_sodium/within/value", "much", "variation/serum_sodium/within/value"),
    ("variation/serum_creatinine/within/source", gone, "variation/serum_creatinine/within"),
    ("variation/serum_sodium/between", {"value": "1 %", "basis": "memory"}, "variation/serum_sodium"),
    ("variation/serum_sodium", {}, "variation/serum_sodium"),
    ("variation/urine_ph/methods/eye", {"within": {"value": 1, "basis": "elicited"}}, "variation/urine_ph/methods"),
    ("variation/urine_ph/methods/dipstick", {}, "variation/urine_ph/methods/dipstick")])

# Cases.
case = {
    "case": "larkmoor-017", "sex": "female", "age": "47 a",
    "serum": {"sodium": "139 mmol/L", "potassium": "2.8mmol/L", "urea_nitrogen": "20 mg/dL"}, "plasma": {"renin_activity": "<0.2 ng/mL/h"},
    "arterial": {"ph": 7.28, "pco2": "30 mm[Hg]"}, "urine": {"ph": "6.9", "sodium": "<20 mmol/L", "method": "dipstick"},
    "derived": {"gfr": "82 mL/min/{1.73_m2}", "ttkg": 5}, "observed": {"nephrocalcinosis": "present"}, "final_cause": "classic_distal"}
accept("case", [case, {"case": 18}], "case: a list")
refuse("case", [], "", "case: an empty list")
spoil("case", case, [
    ("case", gone, ""), ("case", "", "case"), ("sex", "f", "sex"), ("age", 47, "age"), ("serum/sodium", 139, "serum/sodium"),
    ("serum/sodium", "139", "serum/sodium"), ("serum/sodium", "139,5 mmol/L", "serum/sodium"), ("serum/natrium", "139 mmol/L", "serum"),
    ("serum/sodium", None, "serum/sodium"), ("serum/sodium", [139], "serum/sodium"), ("arterial/ph", "seven", "arterial/ph"),
    ("urine/method", "eye", "urine/method"), ("observed/nephrocalcinosis", True, "observed/nephrocalcinosis"),
    ("derived/egfr", "82 mL/min", "derived"), ("blood", {}, ""), ("final_cause", "Distal", "final_cause")])

# Reports.
report = load(here / "report.json")
spoil("report", report, [(key, gone, "") for key in
                         ["format", "case", "urgent", "gate", "causes", "ledger", "missing", "provenance", "caution"]] + [
    ("format", "steelyard.report/2", "format"), ("extra", 1, ""), ("causes", [], "causes"), ("causes/0/posterior", 1.2, "causes/0/posterior"),
    ("causes/0/posterior", None, "causes/0/posterior"), ("causes/0/high", gone, "causes/0"), ("causes/0/rank", 1, "causes/0"),
    ("causes/1/parts", ["low_aldosterone"], "causes/1/parts"),
    ("gate/status", "maybe", "gate/status"), ("gate/reasons", [], "gate/reasons"), ("gate/quantities/anion_gap", "10", "gate/quantities/anion_gap"),
    ("urgent/0/side", "up", "urgent/0/side"), ("urgent/0/limit", gone, "urgent/0"), ("urgent/0/source", "key", "urgent/0/source"),
    ("ledger/0/weight", 0, "ledger/0/weight"), ("ledger/0/weight", None, "ledger/0/weight"),
    ("ledger/0/why_not", "because", "ledger/0/why_not"), ("ledger/1/why_not", None, "ledger/1/why_not"),
    ("ledger/1/decibans", 3, "ledger/1/decibans"), ("ledger/0/log_likelihood", None, "ledger/0/log_likelihood"),
    ("ledger/0/log_likelihood/classic_distal", 0.5, "ledger/0/log_likelihood/classic_distal"),
    ("ledger/0/basis/classic_distal", "guess", "ledger/0/basis/classic_distal"), ("ledger/0/band_index", 0.5, "ledger/0/band_index"),
    ("ledger/0/note", "x", "ledger/0"), ("left_out/0/why", gone, "left_out/0"), ("summary/separation", 1, "summary/separation"),
    ("weight_by_basis/guess", 0.1, "weight_by_basis"), ("missing/0", {"id": "x"}, "missing/0"), ("unread", "x", "unread"),
    ("sensitivity/whatever", [], "sensitivity"), ("sensitivity/range/0/low", -0.1, "sensitivity/range/0/low"),
    ("fit/explained", gone, "fit"), ("next/0/burden", "heavy", "next/0/burden"),
    ("provenance/tables/digest", "sha256:00", "provenance/tables/digest"), ("provenance/priors/digest", gone, "provenance/priors"),
    ("provenance/seed", gone, "provenance"), ("caution", "careful", "caution")])
for status in ("in_scope", "caution"):
    changed = copy.deepcopy(report)
    changed["gate"]["status"] = status
    accept("report", changed, f"report: {status}")
refused = copy.deepcopy(report)
refused["gate"]["status"] = "out_of_scope"
accept("report", refused, "report: out of scope, weighed anyway")
for key in ("causes", "ledger"):
    refused[key] = []
for key in ("sensitivity", "fit", "next"):
    del refused[key]
spoil("report", refused, [
    ("gate/status", "in_scope", "causes"), ("ledger", report["ledger"], "ledger"), ("causes", report["causes"][:1], "causes"),
    ("sensitivity", {}, "sensitivity")])

# Tallies: the head, then cells.
head = {
    "format": "steelyard.tally/1", "versions": ["0.1.0"], "tables": {"title": "t", "digest": "sha256:" + "a" * 64}, "reading": "sha256:" + "b" * 64,
    "causes": ["wet", "dry"], "findings": [{"id": "rain", "states": 4}], "by": ["ward"], "over": "month", "least_cell": 5,
    "lost": {"cells": 1, "patients": 3},
    "flow": {"read": 20, "weighed": 13, "out_of_scope": 6, "set_aside": 1, "diagnosed": 10, "outside": 0, "undiagnosed": 3},
    "out_of_scope": [{"final_cause": "", "patients": 6}], "cells": 1}
spoil("tally", head, [
    ("format", "steelyard.tally/2", "format"), ("flow/read", -1, "flow/read"), ("flow/read", 1.5, "flow/read"), ("flow/seen", 1, "flow"),
    ("lost", gone, ""), ("patient", "a", ""), ("least_cell", 0, "least_cell"), ("over", "day", "over"), ("causes", ["wet", "wet"], "causes"),
    ("findings/0/states", 2, "findings/0/states"), ("out_of_scope/0/patients", 0, "out_of_scope/0/patients"), ("reading", "b", "reading"),
    ("by", "ward", "by"), ("cells", gone, "")])
cells = json.loads((root / "docs" / "tally.schema.json").read_text(encoding="utf-8"))
validators["cell"] = Draft202012Validator({"$ref": "#/$defs/cell", "$defs": cells["$defs"]})
spoil("cell", ["3.0x", "in_scope", "wet", "", "2025-03", 4], [
    ("0", "3 0", "0"), ("1", "out_of_scope", "1"), ("2", "x" * 201, "2"), ("4", "2025-13", "4"), ("5", 0, "5"), ("5", "4", "5")])

for fault in faults:
    print(fault, file=sys.stderr)
print(f"{checks} checks, {len(faults)} faults")
sys.exit(1 if faults else 0)
