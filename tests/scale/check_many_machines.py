# SPDX-License-Identifier: Apache-2.0
"""A file of cases in 1 to 16 parts, each tallied by one of three worker processes: the audit of the tallies must be that of
the whole file, byte for byte, and so must the tally of all of them.

usage: check_many_machines.py PROGRAM
Everything is on 127.0.0.1 and in one temporary folder.
"""
import logging
import os
import pathlib
import random
import subprocess
import sys
import tempfile

# Before distributed is imported, so that the worker processes are as quiet as this one.
os.environ["DASK_LOGGING__DISTRIBUTED"] = "critical"

import dask
from distributed import Client, LocalCluster

import many_machines

ROWS = 20_000
PARTS = (1, 3, 16)
OPTIONS = ["--by", "ward", "--over", "seen"]
CAUSES = ["proximal", "classic_distal", "voltage_distal", "low_aldosterone", "renal_failure", "extrarenal", "sea_sickness", ""]


def make_cases(path):
    """Invented panels of Larkmoor: two quoted cells, one of them now and then with a line end; some rows are out of scope,
    without a final cause, with one that no table has, or cannot be read."""
    draw = random.Random(17)
    with open(path, "w", newline="") as out:
        out.write("case,serum_sodium [mmol/L],serum_potassium [mmol/L],serum_chloride [mmol/L],serum_bicarbonate [mmol/L],"
                  "urine_ph,nephrocalcinosis,ward,seen,remark,final_cause\n")
        for number in range(ROWS):
            sodium, bicarbonate = draw.randint(132, 144), draw.randint(10, 23)
            potassium = "much" if number % 4001 == 4000 else f"{draw.uniform(2.2, 6.4):.1f}"
            remark = '"seen\ntwice"' if number % 101 == 100 else '"seen, once"'
            out.write(f"larkmoor-{number},{sodium},{potassium},{sodium - bicarbonate - draw.randint(6, 13)},{bicarbonate},"
                      f"{draw.choice(['', '5.0', '5.8', '6.6'])},{draw.choice(['', 'present', 'absent'])},"
                      f"\"Ward {draw.choice('AB')}, Larkmoor\",2025-{draw.randint(1, 3):02}-{draw.randint(1, 28):02},{remark},"
                      f"{draw.choice(CAUSES)}\n")


def audit(program, files, form, *more):
    run = subprocess.run([program, "audit", *map(str, files), *OPTIONS, "--replicates", "50", "--as", form, *more],
                         capture_output=True, check=False)
    if run.returncode not in (many_machines.DONE, many_machines.ROWS_SET_ASIDE):
        sys.exit(f"steelyard audit of {len(files)} files: exit code {run.returncode}\n{run.stderr.decode()}")
    return run.stdout


def main(program):
    faults = []

    def require(equal, what):
        if not equal:
            faults.append(what)

    with tempfile.TemporaryDirectory(prefix="steelyard-scale-") as folder:
        folder = pathlib.Path(folder)
        dask.config.set({"temporary_directory": str(folder)})
        cases = folder / "cases.csv"
        make_cases(cases)
        whole = {"json": audit(program, [cases], "json", "--threads", "1", "--keep-tally", str(folder / "whole.tally")),
                 "text": audit(program, [cases], "text", "--threads", "1")}
        require(audit(program, [cases], "json", "--threads", "8") == whole["json"], "eight threads: another audit than of one")
        require(b'"set_aside": 4,' in whole["json"], "the whole file: four rows were to be set aside")
        whole_tally = (folder / "whole.tally").read_bytes()
        require(b"larkmoor-" not in whole_tally, "the name of a case is in the tally")
        with LocalCluster(n_workers=3, threads_per_worker=1, processes=True, host="127.0.0.1", dashboard_address=None,
                          silence_logs=logging.CRITICAL) as cluster, Client(cluster) as client:
            addresses = [cluster.scheduler_address, *client.scheduler_info()["workers"]]
            require(len(addresses) == 4 and all(a.startswith("tcp://127.0.0.1:") for a in addresses),
                    f"three workers on loopback were wanted: {addresses}")
            client.upload_file(many_machines.__file__)
            for count in PARTS:
                there = folder / str(count)
                there.mkdir()
                parts = many_machines.split(cases, there, count)
                require(len(parts) == count, f"{len(parts)} parts in place of {count}")
                tallies, said = many_machines.tallies(client, program, parts, OPTIONS, there)
                require(sum(words.count("not-a-number") + words.count("bad-unit") for words in said) == 4,
                        f"{count} parts: the workers name other rows than the four that cannot be read")
                if count == 1:
                    require(tallies[0].read_bytes() == whole_tally, "one part: another tally than without a worker")
                last_first = tallies[::-1]
                merged = there / "all.tally"
                require(audit(program, last_first, "json", "--keep-tally", str(merged)) == whole["json"],
                        f"{count} parts: another audit as JSON than of the whole file")
                require(merged.read_bytes() == whole_tally, f"{count} parts: another tally than of the whole file")
                require(audit(program, [merged], "text") == whole["text"],
                        f"{count} parts: another audit as text than of the whole file")
    for fault in faults:
        print(fault)
    return 1 if faults else 0


if __name__ == "__main__":
    sys.exit(main(str(pathlib.Path(sys.argv[1]).resolve())))
