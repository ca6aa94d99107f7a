#!/usr/bin/env python3
"""`ballast fit` against R base on the records that R's own datasets package gives (see fit_in_r.R).

usage: test_with_r.py PROGRAM
Status 77, which the build files take for "skipped", where R is not installed.
"""
import os
import shutil
import subprocess
import sys
import tempfile
from itertools import chain

HERE = os.path.dirname(os.path.abspath(__file__))
DATA = os.path.join(HERE, os.pardir, "data")
sys.path.insert(0, os.path.join(HERE, os.pardir, "support"))
from program import Program, Trial  # noqa: E402

WORDS = {"k2": ["--prior", "k2"], "jeffreys": ["--prior", "jeffreys"], "bdeu-10": ["--ess", "10"]}
# qbeta() is good to about 1e-10 at these shapes, a difference of lgamma() near 10^4 to about 1e-11.
RELATIVE = {"counts": 0.0, "mean": 1e-14, "low": 1e-9, "high": 1e-9, "log_marginal_likelihood": 1e-11}


def quantities(folder):
    """(table, prior) -> {(family, quantity): numbers}."""
    script = os.path.join(HERE, "fit_in_r.R")
    done = subprocess.run(["Rscript", "--vanilla", script, folder], capture_output=True, text=True, timeout=120, check=True)
    found = {}
    for line in done.stdout.splitlines():
        table, prior, family, quantity, *numbers = line.split()
        found.setdefault((table, prior), {})[family, quantity] = [float(number) for number in numbers]
    return found


def compare(trial, name, family, quantity, wanted):
    if quantity == "log_marginal_likelihood":
        got = [family[quantity]]
    else:
        got = list(chain.from_iterable(row[quantity] for row in family["rows"]))
    if trial.equal(name + ", how many", len(got), len(wanted)):
        for one, other in zip(got, wanted):
            trial.near(name, one, other, RELATIVE[quantity])


def main():
    if not shutil.which("Rscript"):
        print("skipped: Rscript is not installed")
        sys.exit(77)
    trial = Trial()
    with tempfile.TemporaryDirectory() as folder:
        program = Program(os.path.abspath(sys.argv[1]), folder)
        found = quantities(folder)
        trial.equal("fits that R made", len(found), 6)
        for (table, prior), wanted in found.items():
            got = program.json("fit", os.path.join(DATA, table + ".xml"), table + ".csv", *WORDS[prior], "--folds", 0)
            families = {family["variable"]: family for family in got["families"]}
            trial.equal("%s: families" % table, sorted(families), sorted({family for family, _ in wanted}))
            for (family, quantity), numbers in wanted.items():
                compare(trial, "%s %s %s %s" % (table, prior, family, quantity), families[family], quantity, numbers)
    trial.finish()


if __name__ == "__main__":
    main()
