#!/usr/bin/env python3
"""`ballast fit` and `ballast check` against the second computation in fit_model.py, and against the laws they must obey.

usage: test_fit.py PROGRAM
"""
import hashlib
import os
import random
import sys
import tempfile

import numpy as np

HERE = os.path.dirname(os.path.abspath(__file__))
DATA = os.path.join(HERE, os.pardir, "data")
DEMO = os.path.join(HERE, os.pardir, os.pardir, "networks")
sys.path.insert(0, os.path.join(HERE, os.pardir, "support"))
from case_files import Network, Table  # noqa: E402
from fit_model import Quantile, expected_check, expected_fit  # noqa: E402
from networks import expand, write_network, write_records  # noqa: E402
from program import Program, Trial, read_json  # noqa: E402

# Sums of a few thousand logarithms near 10, some of which cancel, are good to some 1e-12; quantiles are judged to 1e-9.
RELATIVE, ABSOLUTE = 1e-10, 1e-12

FIXED = [(["--ess", "10"], {"kind": "bdeu", "strength": 10.0}),
         (["--prior", "k2"], {"kind": "k2", "strength": 1.0}),
         (["--prior", "jeffreys"], {"kind": "jeffreys", "strength": 1.0}),
         (["--prior", "jeffreys", "--scale", "0.37"], {"kind": "jeffreys", "strength": 0.37})]
CHOSEN = [([], {"kind": "bdeu", "by": "marginal-likelihood"}),
          (["--ess", "auto-loo"], {"kind": "bdeu", "by": "leave-one-out"}),
          (["--prior", "k2", "--scale", "auto"], {"kind": "k2", "by": "marginal-likelihood"}),
          (["--prior", "jeffreys", "--scale", "auto"], {"kind": "jeffreys", "by": "marginal-likelihood"})]
EXPERT = [(["--prior", "expert", "--row-ess", "7.5"], {"kind": "expert", "strength": 1.0, "row_ess": 7.5}),
          (["--prior", "expert", "--row-ess", "7.5", "--prior-floor", "0.1"],
           {"kind": "expert", "strength": 1.0, "row_ess": 7.5, "floor": 0.1}),
          (["--prior", "expert", "--row-ess", "2", "--scale", "auto"],
           {"kind": "expert", "by": "marginal-likelihood", "row_ess": 2.0})]
CARRIED_WORTH = [(["--prior", "expert"], {"kind": "expert", "strength": 1.0}),
                 (["--prior", "expert", "--scale", "auto"], {"kind": "expert", "by": "marginal-likelihood"}),
                 (["--prior", "expert", "--scale", "2.5"], {"kind": "expert", "strength": 2.5})]
SPLITS = [{"method": "folds", "folds": 10, "seed": 1},
          {"method": "folds", "folds": 2, "seed": 7, "repeats": 3},
          {"method": "holdout", "share": 0.3, "seed": 4},
          {"method": "folds", "folds": 3, "seed": 2 ** 64 - 1},
          {"method": "holdout", "share": 0.55, "seed": 12345, "repeats": 4},
          {"method": "folds", "folds": 25, "seed": 12345},
          {"method": "folds", "folds": 10, "seed": 0}]
LEVELS = [0.95, 0.5, 0.99]


def split_words(split):
    """The options that ask for it."""
    words = ["--folds", split["folds"]] if split["method"] == "folds" else ["--holdout", repr(split["share"])]
    return words + ["--seed", split["seed"]] + (["--repeats", split["repeats"]] if "repeats" in split else [])


def compare(trial, name, wanted, got):
    """Every key and number that is wanted; the program may say more."""
    if isinstance(wanted, dict):
        if trial.check(isinstance(got, dict), name, "no object: %.100r" % (got,)):
            for key, value in wanted.items():
                if trial.check(key in got, "%s.%s" % (name, key), "missing"):
                    compare(trial, "%s.%s" % (name, key), value, got[key])
    elif isinstance(wanted, list):
        if trial.check(isinstance(got, list) and len(got) == len(wanted), name, "got %.100r, wanted %.100r" % (got, wanted)):
            for i, (one, other) in enumerate(zip(wanted, got)):
                compare(trial, "%s[%d]" % (name, i), one, other)
    elif isinstance(wanted, Quantile):
        trial.check(wanted.agrees(got), name, "got %r, wanted %r" % (got, wanted))
    elif isinstance(wanted, (float, np.floating)):
        trial.near(name, got, float(wanted), RELATIVE, ABSOLUTE)
    else:
        trial.equal(name, got, wanted)


# ---------------------------------------------------------------- networks and tables

def random_network(path, seed):
    """Some variables in an order that is not that of the arcs, labels that need quotes, tables with zeros, rows worth this
    and that. Gives a function that draws records from it."""
    rng = random.Random(seed)
    names = ["v%d" % i for i in range(rng.randint(3, 6))]
    words = ["yes", "no", "not done", "1,5 mg", "a \"b\"", "Ödem <2 cm", "β & γ"]
    outcomes = {name: words[:rng.randint(1 if seed % 3 == 0 else 2, 5)] for name in names}
    order = rng.sample(names, len(names))
    parents = {name: rng.sample(order[:i], rng.randint(0, min(i, 2))) for i, name in enumerate(order)}
    rows = {name: int(np.prod([len(outcomes[p]) for p in parents[name]])) for name in names}
    tables = {name: [random_row(rng, len(outcomes[name]), seed % 2) for _ in range(rows[name])] for name in names}
    worth = {name: [rng.uniform(0.3, 30) for _ in range(rows[name] if seed % 4 < 2 else 1)] for name in names}
    write_network(path, outcomes, parents, tables, row_ess=worth, name="random %d" % seed)

    def draw():
        record = {}
        for name in order:
            row = 0
            for parent in parents[name]:
                row = row * len(outcomes[parent]) + record[parent]
            record[name] = rng.choices(range(len(outcomes[name])), tables[name][row])[0]
        return [outcomes[name][record[name]] for name in names]
    return names, draw


def random_row(rng, n, with_zeros):
    weights = [0.0 if with_zeros and rng.random() < 0.2 else rng.gammavariate(0.7, 1) + 0.01 for _ in range(n)]
    if not any(weights):
        weights[0] = 1.0
    return [w / sum(weights) for w in weights]


def spoil(rng, records):
    """Some cells emptied, and a column that is no variable."""
    spoilt = [[cell if rng.random() > 0.06 else rng.choice(["", "NA", "?"]) for cell in record] for record in records]
    return [record + ["line %d" % i] for i, record in enumerate(spoilt)]


def open_cases(folder):
    """(name, network, table, priors to try, words for the table) over open tables and the demo network."""
    for name in ("titanic", "ucbadmissions", "college_plans"):
        expand(os.path.join(DATA, name + "_counts.csv"), os.path.join(folder, name + ".csv"))
    listed = [("birthwt.xml", os.path.join(DATA, "birthwt.csv"), FIXED + CHOSEN + EXPERT),
              ("pima.xml", os.path.join(DATA, "pima_train.csv"), FIXED + CHOSEN + EXPERT),
              ("pima.xml", os.path.join(DATA, "pima_test.csv"), CHOSEN[:2]),
              ("titanic.xml", os.path.join(folder, "titanic.csv"), FIXED[:3] + CHOSEN[:3] + EXPERT[:1]),
              ("ucbadmissions.xml", os.path.join(folder, "ucbadmissions.csv"), FIXED[:2] + CHOSEN[:2]),
              ("college_plans_1.xml", os.path.join(folder, "college_plans.csv"), CHOSEN[:1]),
              ("ch92_bs1.xml", os.path.join(DATA, "ch92.csv"), FIXED + CHOSEN + EXPERT)]
    for network, table, priors in listed:
        yield network, os.path.join(DATA, network), table, priors, []
    yield ("clinic.xml", os.path.join(DEMO, "clinic.xml"), os.path.join(DEMO, "cases.csv"),
           FIXED + CHOSEN + EXPERT[:1] + CARRIED_WORTH, [])


def random_cases(folder):
    """The same over random networks: with 0, 1, 2 and more records, with and without missing cells."""
    for seed, n in enumerate([0, 1, 2, 3, 9, 30, 57, 120, 200, 333, 80, 41]):
        network, table = (os.path.join(folder, "random%d.%s" % (seed, ending)) for ending in ("xml", "csv"))
        names, draw = random_network(network, seed)
        records = [draw() for _ in range(n)]
        words = []
        if seed % 3 == 2:
            records = spoil(random.Random(seed), records)
            words = ["--missing", "drop", "--missing-label", "?"]
        write_records(table, names + (["remark"] if words else []), records)
        priors = [FIXED[seed % 4], CHOSEN[seed % 4], EXPERT[seed % 3], CARRIED_WORTH[seed % 3], CARRIED_WORTH[(seed + 1) % 3]]
        yield "random %d" % seed, network, table, priors, words


# ---------------------------------------------------------------- comparisons and laws

def compare_with_model(trial, program, case, turn):
    """Every number of `fit` and `check`."""
    name, network_path, table_path, priors, words = case
    network = Network(network_path)
    table = Table(table_path, network, ("", "NA", "?") if words else ("", "NA"))
    compare(trial, name + " check", expected_check(network, table), program.json("check", network_path, table_path, *words))
    for prior_words, prior in priors:
        split = SPLITS[turn % len(SPLITS)]
        level = LEVELS[turn % len(LEVELS)]
        got = program.json("fit", network_path, table_path, *words, *prior_words, *split_words(split), "--level", level,
                           "-o", "fitted.xml")
        title = "%s %s level %g" % (name, " ".join(map(str, [*prior_words, *split_words(split)])), level)
        wanted = expected_fit(network, table, prior, got, level, split)
        compare(trial, title, wanted, got)
        check_file(trial, title, Network(os.path.join(program.folder, "fitted.xml")), got, "mean")
        turn += 1
    return turn


def check_file(trial, title, written, got, estimate):
    """The tables of the written file, read by another XML parser, are the JSON's, bit for bit."""
    for family in got["families"]:
        name, rows = family["variable"], family["rows"]
        uniform = [1 / len(family["outcomes"])] * len(family["outcomes"])
        trial.equal(title + " TABLE of " + name, written.tables[name].tolist(), [row[estimate] or uniform for row in rows])
        trial.equal(title + " counts of " + name, written.counts[name].tolist(), [row["counts"] for row in rows])
        trial.equal(title + " pseudo-counts of " + name, written.pseudo_counts[name].tolist(),
                    [row["pseudo_counts"] for row in rows])
        trial.equal(title + " parents of " + name, written.parents[name], family["parents"])
        trial.equal(title + " outcomes of " + name, written.outcomes[name], family["outcomes"])


    trial.equal(title + " ballast.records", float(written.properties["ballast.records"]), got["data"]["records"])
    ess = written.properties.get("ballast.ess")
    trial.equal(title + " ballast.ess", ess and float(ess), got["prior"]["ess"])
    trial.equal(title + " ballast.parts", written.properties["ballast.parts"], part_of(written))


def part_of(written):
    """SHA-256 of the counts as text: a line a family, its name and its counts in TABLE order."""
    lines = [" ".join([name] + ["%d" % n for n in counts.ravel()]) + "\n" for name, counts in
             ((name, written.counts[name]) for name in written.outcomes)]
    return hashlib.sha256("".join(lines).encode("utf-8")).hexdigest()


def without(result, *keys):
    return {key: value for key, value in result.items() if key not in keys}


def check_counts_alone(trial, program, case):
    """A fit to the counts in the file it wrote gives the same numbers, without records to hold out; the ESS it chose, given,
    the same file; raw frequencies are written on request."""
    name, network, table, _, words = case
    got = read_json(program.run("fit", network, table, *words, "--quiet", "--folds", 0, "--json", "-", "-o", "first.xml"))
    again = program.json("fit", "first.xml", "-o", "second.xml")
    for key in ("log_marginal_likelihood", "loo", "prior", "families"):
        trial.equal("%s: %s from the counts alone" % (name, key), again[key], got[key])
    trial.equal(name + ": nothing held out from counts", again["heldout"], None)
    check_counts_as_data(trial, program, case, got)
    parts = [Network(os.path.join(program.folder, f)).properties["ballast.parts"] for f in ("first.xml", "second.xml")]
    trial.equal(name + ": parts", parts[1], parts[0])
    program.run("fit", network, table, *words, "--quiet", "--ess", repr(got["prior"]["ess"]), "-o", "given.xml")
    trial.equal(name + ": the ESS given that was chosen", _bytes(program, "given.xml"), _bytes(program, "first.xml"))
    got = program.json("fit", network, table, *words, "--estimate", "ml", "-o", "raw.xml")
    check_file(trial, name + " raw", Network(os.path.join(program.folder, "raw.xml")), got, "ml")


def check_counts_as_data(trial, program, case, got):
    """Counts in the file named second are data like a table's; counts in the file named first are not added to a table's."""
    name, network, table, _, words = case
    pairs = [("counts as data", program.json("fit", network, "first.xml")),
             ("counts beside a table", program.json("fit", "first.xml", table, *words, "--folds", 0))]
    for title, again in pairs:
        for key in ("log_marginal_likelihood", "loo", "prior", "families"):
            trial.equal("%s: %s, %s" % (name, key, title), again[key], got[key])
    counted = Network(os.path.join(program.folder, "first.xml"))
    compare(trial, name + " check of counts alone", expected_check(counted, None, counted.counts),
            program.json("check", "first.xml"))


def _bytes(program, name):
    with open(os.path.join(program.folder, name), "rb") as file:
        return file.read()


# ---------------------------------------------------------------- carried, weighted, tables of their own, fold columns

def check_carried(trial, program, case, turn):
    """A fit to the first records carried on with the others, which are also held out; the old counts whole and made lighter."""
    name, network_path, table_path, priors, words = case
    missing = ("", "NA", "?") if words else ("", "NA")
    with open(table_path, encoding="utf-8") as file:
        header, *lines = file.read().splitlines()
    cut = len(lines) // 3
    for part, chosen in (("old.csv", lines[:cut]), ("new.csv", lines[cut:])):
        with open(os.path.join(program.folder, part), "w", encoding="utf-8") as file:
            file.write("\n".join([header] + chosen + [""]))
    program.run("fit", network_path, "old.csv", *words, *priors[turn % len(priors)][0], "--quiet", "--folds", 0, "-o", "old.xml")
    network = Network(os.path.join(program.folder, "old.xml"))
    table = Table(os.path.join(program.folder, "new.csv"), network, missing)
    for carry in (1, 0.5, 0, 0.3):
        split = SPLITS[turn % len(SPLITS)]
        got = program.json("fit", "old.xml", "new.csv", *words, "--prior", "carried", "--carry", carry, *split_words(split), "-o", "both.xml")
        prior = {"kind": "carried", "strength": 1.0, "carry": carry}
        compare(trial, "%s carried %g" % (name, carry), expected_fit(network, table, prior, got, split=split), got)
        turn += 1
    got = program.json("fit", "old.xml", "--prior", "carried", "--test", "new.csv", *words)
    wanted = expected_fit(network, None, {"kind": "carried", "strength": 1.0}, got, split={"method": "test"}, test=table,
                          counts={name: np.zeros_like(n) for name, n in network.counts.items()})
    compare(trial, name + " carried, test table", wanted, got)


def check_test_table(trial, program, case, turn):
    """One half of the records predicts the other; under the expert's zeros too, which the other half may contradict."""
    name, network_path, table_path, priors, words = case
    missing = ("", "NA", "?") if words else ("", "NA")
    network = Network(network_path)
    paths = [os.path.join(program.folder, half) for half in ("even.csv", "odd.csv")]
    with open(table_path, encoding="utf-8") as file:
        header, *lines = file.read().splitlines()
    for i, path in enumerate(paths):
        with open(path, "w", encoding="utf-8") as file:
            file.write("\n".join([header] + lines[i::2] + [""]))
    training, test = (Table(path, network, missing) for path in paths)
    prior_words, prior = priors[turn % len(priors)]
    got = program.json("fit", network_path, "even.csv", *words, *prior_words, "--test", "odd.csv")
    compare(trial, name + " test table", expected_fit(network, training, prior, got, split={"method": "test"}, test=test), got)
    both = program.json("fit", network_path, "even.csv", "odd.csv", *words, *prior_words, "--folds", 4, "--seed", turn)
    split = {"method": "folds", "folds": 4, "seed": turn}
    compare(trial, name + " two tables", expected_fit(network, Table(paths, network, missing), prior, both, split=split), both)


def weighted_copy(path, table_path, seed, weights, labels):
    """The table with a weight and a label behind each line."""
    rng = random.Random(seed)
    with open(table_path, encoding="utf-8") as file:
        header, *lines = file.read().splitlines()
    with open(path, "w", encoding="utf-8") as file:
        told = ["%s,%s,%s" % (line, rng.choice(weights), rng.choice(labels)) for line in lines]
        file.write("\n".join([header + ",times,where"] + told + [""]))


def check_weighted(trial, program, case, turn):
    """Whole weights, fractions, labels of a fold column, incomplete records by family, a variable that nobody recorded."""
    name, network_path, table_path, priors, words = case
    missing = ("", "NA", "?") if words else ("", "NA")
    network = Network(network_path)
    path = os.path.join(program.folder, "weighted.csv")
    prior_words, prior = priors[turn % len(priors)]
    weighted_copy(path, table_path, turn, [0, 1, 1, 2, 7], ["north", "south", "\u00f6st", "west 2"])
    options = dict(missing=missing, weight="times", fold_column="where")
    words = [*words, "--weight", "times"]
    labels = len(set(Table(path, network, **options).labels))
    folds = {"method": "folds", "folds": 10, "seed": 1}
    first = next(iter(network.outcomes))
    tries = [([], {}, folds), (["--holdout", "0.4", "--repeats", "2"], {}, {"method": "holdout", "share": 0.4, "repeats": 2}),
             (["--unrecorded", first], {"unrecorded": [first]}, folds)]
    if labels > 1:
        tries.append((["--fold-column", "where"], {}, {"method": "fold-column", "labels": labels}))
    if "drop" in words:
        tries.append(([], {"policy": "family"}, folds))
    for more, how, split in tries:
        table = Table(path, network, **dict(options, **how))
        if split["method"] != "fold-column":
            table.ignored = table.ignored + ["where"]
        used = [how.get("policy", word) if word == "drop" else word for word in words]
        got = program.json("fit", network_path, "weighted.csv", *used, *prior_words, *more)
        wanted = expected_fit(network, table, prior, got, split=split)
        del wanted["data"]["missing"], wanted["data"]["dropped"]  # lines, not records
        compare(trial, "%s weighted %s %s" % (name, " ".join(more), how), wanted, got)
    weighted_copy(path, table_path, turn, ["0.25", "1.3", "0", "2e-3", "5"], ["north"])
    if prior.get("by") == "leave-one-out":
        return
    table = Table(path, network, missing, weight="times")
    got = program.json("fit", network_path, "weighted.csv", *words, *prior_words)
    wanted = expected_fit(network, table, prior, got, split={"method": "folds", "folds": 10})
    compare(trial, name + " fractions", wanted, got)


def check_shuffled(trial, program, case):
    """The order of records changes no table and no score."""
    name, network, table, _, words = case
    with open(table, encoding="utf-8") as file:
        header, *lines = file.read().splitlines()
    random.Random(3).shuffle(lines)
    with open(os.path.join(program.folder, "shuffled.csv"), "w", encoding="utf-8") as file:
        file.write("\n".join([header] + lines + [""]))
    first = program.json("fit", network, table, *words, "--folds", 0, "-o", "first.xml")
    second = program.json("fit", network, "shuffled.csv", *words, "--folds", 0, "-o", "second.xml")
    trial.equal(name + ": shuffled, every number", without(second, "inputs"), without(first, "inputs"))
    written = [[line for line in _bytes(program, f).splitlines() if b"ballast.inputs" not in line]
               for f in ("first.xml", "second.xml")]
    trial.equal(name + ": shuffled, every other byte of the file", written[1], written[0])


def check_threads(trial, program, case):
    """The number of threads changes no byte."""
    name, network, table, _, words = case
    seen = []
    for threads in (1, 2, 3, 8):
        page = program.run("fit", network, table, *words, "--threads", threads, "--json", "t.json", "-o", "t.xml")
        seen.append((page, _bytes(program, "t.json"), _bytes(program, "t.xml")))
    for i, threads in enumerate((2, 3, 8), 1):
        trial.equal("%s: %d threads" % (name, threads), seen[i], seen[0])


def check_one_by_one(trial, program, case):
    """As many folds as records: under a fixed prior the held-out total is the leave-one-out score."""
    name, network, table, _, words = case
    n = len(Table(table, Network(network)).codes)
    got = program.json("fit", network, table, *words, "--prior", "k2", "--folds", n, "--seed", 5)
    trial.near(name + ": leave-one-out by folds", got["heldout"]["bayes"]["log_likelihood"], got["loo"]["log_likelihood"],
               RELATIVE)


def check_equivalent(trial, program):
    """Structures that say the same score the same under BDeu: Heckerman, Geiger & Chickering 1995, theorem 4."""
    outcomes = {"Class": ["1st", "2nd", "3rd", "Crew"], "Sex": ["Male", "Female"], "Age": ["Child", "Adult"],
                "Survived": ["No", "Yes"]}
    orders = [["Class", "Sex", "Age", "Survived"], ["Survived", "Age", "Sex", "Class"], ["Sex", "Survived", "Class", "Age"]]
    for ess in (0.3, 5, 800):
        scores = []
        for order in orders:
            parents = {name: order[:i] for i, name in enumerate(order)}
            write_network(os.path.join(program.folder, "full.xml"), outcomes, parents)
            got = program.json("fit", "full.xml", "titanic.csv", "--ess", ess, "--folds", 0)
            scores.append(got["log_marginal_likelihood"])
        for score in scores[1:]:
            trial.near("equivalent structures, ESS %g" % ess, score, scores[0], 1e-12)


def main():
    trial = Trial()
    with tempfile.TemporaryDirectory() as folder:
        program = Program(os.path.abspath(sys.argv[1]), folder)
        turn = 0
        cases = [*open_cases(folder), *random_cases(folder)]
        for case in cases:
            before = trial.passed
            turn = compare_with_model(trial, program, case, turn)
            print("%6d  %s" % (trial.passed - before, case[0]))
        before = trial.passed
        for number, case in enumerate(cases):
            if case[0].startswith(("college", "ucb", "titanic")):
                continue
            check_test_table(trial, program, case, number)
            check_carried(trial, program, case, number)
            check_weighted(trial, program, case, number)
        print("%6d  carried, weighted, other tables" % (trial.passed - before))
        before = trial.passed
        for case in cases:
            if not case[0].startswith(("college", "random 0")):
                check_counts_alone(trial, program, case)
                check_shuffled(trial, program, case)
                check_threads(trial, program, case)
        for case in cases:
            if case[0] in ("birthwt.xml", "pima.xml", "ch92_bs1.xml", "clinic.xml", "random 9"):
                check_one_by_one(trial, program, case)
        check_equivalent(trial, program)
        print("%6d  laws" % (trial.passed - before))
    trial.finish()


if __name__ == "__main__":
    main()
