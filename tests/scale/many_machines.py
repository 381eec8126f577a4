# SPDX-License-Identifier: Apache-2.0
"""An audit of one large file of cases on the workers of a Dask cluster. docs/scale.md.

Each worker counts its part of the cases into a tally; only tallies come back. They are added up and audited as if one
machine had read the whole file, to the same bytes.

usage: many_machines.py SCHEDULER PROGRAM CASES.csv OUT_FOLDER [PARTS] [-- options of steelyard audit]
SCHEDULER is the address of a running dask-scheduler, as tcp://127.0.0.1:8786. The folder must be one that all workers see
under the same path; PROGRAM must be there for all of them.
"""
import pathlib
import subprocess
import sys
import tempfile

DONE, NOTHING_WEIGHED, ROWS_SET_ASIDE = 0, 4, 5  # exit codes of the program, docs/formats.md


def split(cases, folder, parts):
    """Parts of about the same length, each with the header, cut between cases. A quoted cell may hold line ends, so that
    a case ends only where the number of quotes so far is even."""
    cases, folder = pathlib.Path(cases), pathlib.Path(folder)
    bytes_each = max(1, cases.stat().st_size // parts)
    paths, out, open_quote = [], None, False
    with open(cases, "rb") as source:
        header = next(source)
        while header.count(b'"') % 2:
            header += next(source)
        for line in source:
            if out is None or (not open_quote and out.tell() >= bytes_each and len(paths) < parts):
                if out:
                    out.close()
                paths.append(folder / f"part-{len(paths):04}.csv")
                out = open(paths[-1], "wb")
                out.write(header)
            out.write(line)
            open_quote ^= line.count(b'"') % 2 == 1
    if out:
        out.close()
    return paths


def tally(program, part, options):
    """On a worker: counts the cases of one part. What leaves the worker is the tally and what was said of rows that could
    not be read."""
    with tempfile.TemporaryDirectory() as folder:
        kept = pathlib.Path(folder) / "part.tally"
        run = subprocess.run([program, "audit", str(part), "--keep-tally", str(kept), "--replicates", "20", "--threads", "1",
                              *options], stdout=subprocess.DEVNULL, stderr=subprocess.PIPE, text=True, check=False)
        if run.returncode not in (DONE, NOTHING_WEIGHED, ROWS_SET_ASIDE):
            raise RuntimeError(f"{part}: exit code {run.returncode}: {run.stderr}")
        return kept.read_bytes(), run.stderr


def tallies(client, program, parts, options, folder):
    """The tallies of all parts as files in a folder, in the order of the parts, and what the program said of each."""
    futures = client.map(lambda part: tally(program, part, options), parts, pure=False)
    paths, said = [], []
    for number, (text, words) in enumerate(client.gather(futures)):
        paths.append(pathlib.Path(folder) / f"part-{number:04}.tally")
        paths[-1].write_bytes(text)
        said.append(words)
    return paths, said


def main(scheduler, program, cases, out, parts="16", *options):
    from distributed import Client

    options = list(options[1:] if options[:1] == ("--",) else options)
    out = pathlib.Path(out)
    out.mkdir(parents=True, exist_ok=True)
    with Client(scheduler) as client:
        client.upload_file(__file__)
        paths, said = tallies(client, program, split(cases, out, int(parts)), options, out)
    sys.stderr.writelines(said)
    return subprocess.run([program, "audit", *map(str, paths), "--keep-tally", str(out / "all.tally"), *options],
                          check=False).returncode


if __name__ == "__main__":
    sys.exit(main(*sys.argv[1:]))
