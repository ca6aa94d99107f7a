#!/usr/bin/env python3
"""`ballast tally` against R base's read.csv() and table() on random tables in odd dress (see count_in_r.R).

usage: test_tables_with_r.py PROGRAM [SEED]
Status 77, which the build files take for "skipped", where R is not installed.
"""
import os
import random
import shutil
import subprocess
import sys
import tempfile
from itertools import chain

HERE = os.path.dirname(os.path.abspath(__file__))
sys.path.insert(0, os.path.join(HERE, os.pardir, "support"))
from networks import write_network  # noqa: E402
from program import Program, Trial  # noqa: E402

TABLES = 60
DELIMITERS = {"comma": ",", "semicolon": ";", "tab": "\t"}
LABELS = {"A": ["low", "middle one", "h,i;gh", 'the "top"', "ärger", "0.5"], "B": ["yes", "no", "=1+1", "don't know"]}


def dress(rng, text, delimiter):
    """A cell that reads as this text: quoted where it must be, and sometimes where it need not."""
    must = any(c in text for c in '"\n\r' + delimiter)
    if must or rng.random() < 0.3:
        return '"' + text.replace('"', '""') + '"'
    return " " * rng.choice([0, 0, 0, 1, 2]) + text + " " * rng.choice([0, 0, 0, 1]) if delimiter != "\t" else text


def write_table(rng, path, delimiter, weighted):
    columns = ["A", "B", "note"] + (["w"] if weighted else [])
    rng.shuffle(columns)
    end = rng.choice(["\n", "\r\n"])
    lines = [delimiter.join(dress(rng, name, delimiter) for name in columns)]
    for _ in range(rng.randrange(1, 60)):
        cells = {"A": rng.choice(LABELS["A"]), "B": rng.choice(LABELS["B"]),
                 "note": rng.choice(["", "plain", "two\nlines", "a, b; c", '"', " x "]),
                 "w": rng.choice(["1", "0", "3", "2.5", "0.25", "1e2"])}
        lines.append(delimiter.join(dress(rng, cells[name], delimiter) for name in columns))
    text = end.join(lines) + (end if rng.random() < 0.8 else "")
    with open(path, "w", encoding=rng.choice(["utf-8", "utf-8-sig"]), newline="") as file:
        file.write(text)


def counts_by_r(folder):
    script = os.path.join(HERE, "count_in_r.R")
    done = subprocess.run(["Rscript", "--vanilla", script, folder], capture_output=True, text=True, timeout=120,
                          env=dict(os.environ, LC_ALL="C.UTF-8"))
    if done.returncode != 0:
        raise RuntimeError(done.stderr)
    return {name: [float(number) for number in numbers] for name, *numbers in map(str.split, done.stdout.splitlines())}


def main(seed):
    if not shutil.which("Rscript"):
        print("skipped: Rscript is not installed")
        sys.exit(77)
    rng, trial = random.Random(seed), Trial()
    with tempfile.TemporaryDirectory() as folder:
        write_network(os.path.join(folder, "net.xml"), LABELS, {"B": ["A"]})
        with open(os.path.join(folder, "labels.tsv"), "w", encoding="utf-8") as file:
            file.writelines("%s\t%s\n" % (name, label) for name, labels in LABELS.items() for label in labels)
        made = []
        for i in range(TABLES):
            kind, weighted = rng.choice(list(DELIMITERS)), rng.random() < 0.5
            made.append(("t%d.csv" % i, kind, weighted))
            write_table(rng, os.path.join(folder, made[-1][0]), DELIMITERS[kind], weighted)
        with open(os.path.join(folder, "list.tsv"), "w", encoding="utf-8") as file:
            file.writelines("%s\t%s\t%s\n" % (name, kind, "w" if weighted else "-") for name, kind, weighted in made)
        wanted = counts_by_r(folder)
        program = Program(os.path.abspath(sys.argv[1]), folder)
        for name, kind, weighted in made:
            words = ["--delimiter", DELIMITERS[kind]] if kind != "tab" else []
            got = program.json("tally", "net.xml", name, *words, *(["--weight", "w"] if weighted else []))
            counts = list(chain.from_iterable(family["counts"] for family in got["families"]))
            trial.equal("seed %d, %s" % (seed, name), counts, wanted[name])
    trial.finish()


if __name__ == "__main__":
    main(int(sys.argv[2]) if len(sys.argv) > 2 else 1)
