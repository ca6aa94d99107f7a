#!/usr/bin/env python3
"""`ballast draw` against a second simulation of the same rule, and against the tables it draws from.

usage: test_draw.py PROGRAM
"""
import csv
import io
import os
import re
import sys
import tempfile

import numpy as np
from scipy import stats

HERE = os.path.dirname(os.path.abspath(__file__))
DEMO = os.path.join(HERE, os.pardir, os.pardir, "networks")
sys.path.insert(0, os.path.join(HERE, os.pardir, "support"))
from case_files import Network, Table, tally, where  # noqa: E402
from heldout_model import splitmix64  # noqa: E402
from program import Program, Trial  # noqa: E402
from test_fit import random_network  # noqa: E402

DRAWS = 60000
# The smallest of some hundred p values is about 1e-2 where all is well.
SUSPICIOUS = 1e-6


def draw(network, n_records, seed):
    """Variable v of record i takes the point splitmix64(splitmix64(key, i), v) / 2^64 of its row's cumulated table."""
    key = splitmix64(splitmix64(seed, 3), 0)
    names = list(network.outcomes)
    order = []
    while len(order) < len(names):
        order += [name for name in names if name not in order and set(network.parents[name]) <= set(order)]
    for i in range(n_records):
        own = splitmix64(key, i)
        record = {}
        for name in order:
            row = 0
            for parent in network.parents[name]:
                row = row * len(network.outcomes[parent]) + record[parent]
            point = splitmix64(own, names.index(name)) / 2 ** 64
            reached = np.cumsum(network.tables[name][row])
            record[name] = min(int(np.searchsorted(reached, point, side="right")), len(reached) - 1)
        yield [network.outcomes[name][record[name]] for name in names]


def lines_of(program, network, n_records, seed):
    text = program.run("draw", network, "--records", n_records, "--seed", seed, "-o", "-")
    return list(csv.reader(io.StringIO(text.decode("utf-8"), newline="")))


def check_rule(trial, program, title, path, n_records, seed):
    network = Network(path)
    lines = lines_of(program, path, n_records, seed)
    trial.equal(title + ": header", lines[0], list(network.outcomes))
    trial.equal(title + ": records", lines[1:], list(draw(network, n_records, seed)))
    trial.equal(title + ": a shorter draw begins it", lines_of(program, path, n_records // 3, seed), lines[:n_records // 3 + 1])


def check_frequencies(trial, program, path):
    """The counts of every row against its table by Pearson's chi-squared test; cells of probability 0 stay empty."""
    network = Network(path)
    program.run("draw", path, "--records", DRAWS, "-o", "drawn.csv")
    counts = tally(network, where(network, Table(os.path.join(program.folder, "drawn.csv"), network)))
    tested = 0
    for name, table in network.tables.items():
        for row, (n, p) in enumerate(zip(counts[name], table)):
            trial.equal("%s row %d: impossible outcomes" % (name, row), n[p == 0].sum(), 0)
            likely = n.sum() * p >= 5
            if likely.sum() >= 2 and n.sum() > 0:
                wanted = p[likely] / p[likely].sum() * n[likely].sum()
                chance = stats.chisquare(n[likely], wanted).pvalue
                trial.check(chance > SUSPICIOUS, "%s row %d" % (name, row), "%s for %s, p = %g" % (n, p, chance))
                tested += 1
    trial.check(tested > 40, "enough rows to test", tested)


def check_demo(trial, program):
    """The demo table is the draw that the maker of its network says it is."""
    with open(os.path.join(HERE, os.pardir, "data", "make_networks.py"), encoding="utf-8") as file:
        words = re.search(r"ballast (draw clinic-truth.xml --records \d+ --seed \d+) -o cases.csv", file.read())
    with open(os.path.join(DEMO, "cases.csv"), "rb") as file:
        command, network, *options = words.group(1).split()
        trial.equal("the demo table", file.read(), program.run(command, os.path.join(DEMO, network), *options, "-o", "-"))


def main():
    trial = Trial()
    with tempfile.TemporaryDirectory() as folder:
        program = Program(os.path.abspath(sys.argv[1]), folder)
        truth = os.path.join(DEMO, "clinic-truth.xml")
        check_rule(trial, program, "clinic", truth, 500, 42)
        check_rule(trial, program, "clinic", truth, 50, 2 ** 64 - 1)
        for seed in range(6):
            path = os.path.join(folder, "random.xml")
            random_network(path, seed)
            check_rule(trial, program, "random %d" % seed, path, 200, seed)
        check_frequencies(trial, program, truth)
        trial.equal("another seed, other records", lines_of(program, truth, 20, 1) == lines_of(program, truth, 20, 2), False)
        trial.equal("no seed is seed 1", program.run("draw", truth, "--records", 20, "-o", "-"),
                    program.run("draw", truth, "--records", 20, "--seed", 1, "-o", "-"))
        check_demo(trial, program)
    trial.finish()


if __name__ == "__main__":
    main()
