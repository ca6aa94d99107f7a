#!/usr/bin/env python3
"""Records held out in every way: the page, the JSON, and what must not matter.

usage: test_heldout.py PROGRAM [TEST ...]
"""
import os
import random

from bench import ProgramTest, main
from program import read_json

WAYS = [["--folds", "7"], ["--folds", "7", "--repeats", "3"], ["--holdout", "0.3"], ["--holdout", "0.3", "--repeats", "5"],
        ["--fold-column", "where"], ["--test", "new.csv"]]
KEYS = {"heldout": ["method", "folds", "repeats", "records", "incomplete", "bayes", "ml", "prior_only", "comparable", "others", "quadratic"],
        "bayes": ["log_likelihood", "per_record", "impossible"], "ml": ["log_likelihood", "impossible", "undefined"],
        "prior_only": ["log_likelihood", "per_record"], "comparable": ["records", "bayes", "ml", "mean_difference", "standard_error"],
        "others": ["records", "bayes", "break_even"], "quadratic": ["bayes", "ml", "mean_difference", "standard_error"]}


class HeldOut(ProgramTest):
    def setUp(self):
        super().setUp()
        dice = random.Random(1)
        header, *lines = self.read("cases.csv").decode().splitlines()
        self.weighted = [(line, dice.choice([0, 1, 1, 2, 5]), dice.choice(["north", "south", "east"])) for line in lines]
        self.header = header
        self.write("cases.csv", "\n".join([header + ",times,where"] + ["%s,%d,%s" % record for record in self.weighted] + [""]))
        self.write("new.csv", "\n".join([header + ",times"] + ["%s,%d" % record[:2] for record in self.weighted[::3]] + [""]))

    def fit(self, *words, table="cases.csv"):
        return self.ballast("fit", "clinic.xml", table, *words, "--json", "out.json").out, self.read("out.json")

    def test_pages_are_80_columns_wide(self):
        for way in WAYS:
            page = self.fit(*way, "--weight", "times")[0].decode()
            self.assertIn("New records", page)
            self.assertLess(max(map(len, page.splitlines())), 80, way)

    def test_keys(self):
        for way in WAYS:
            told = read_json(self.fit(*way, "--weight", "times")[1])["heldout"]
            for key, names in KEYS.items():
                inner = told if key == "heldout" else told[key]
                self.assertEqual([name for name in names if name not in inner], [], (way, key))
            self.assertEqual(told["method"], way[0][2:])
            self.assertEqual(told["folds"], {"folds": 7, "fold-column": 3}.get(told["method"]))
            self.assertEqual(told["repeats"], int(way[3]) if "--repeats" in way else 1)

    def test_threads_and_memory_do_not_matter(self):
        for way in WAYS:
            seen = {self.fit(*way, "--weight", "times", *how) for how in
                    (["--threads", "1"], ["--threads", "2"], ["--threads", "8"], ["--memory", "0"], ["--memory", "3K", "--threads", "3"])}
            self.assertEqual(len(seen), 1, way)

    def test_weights_are_records(self):
        lines = ["%s,1,%s" % (line, where) for line, times, where in self.weighted for _ in range(times)]
        self.write("all.csv", "\n".join([self.header + ",times,where"] + lines + [""]))
        for way in WAYS:
            one, two = (read_json(self.fit(*way, *more, "--quiet", table=table)[1])
                        for table, more in (("cases.csv", ["--weight", "times"]), ("all.csv", ["--weight", "times"])))
            self.assertEqual(dict(one, inputs=0), dict(two, inputs=0), way)

    def test_seeds_matter_where_parts_are_random(self):
        for way in WAYS:
            one, two = (read_json(self.fit(*way, "--weight", "times", "--seed", seed)[1]) for seed in ("1", "2"))
            self.assertEqual(one["heldout"] != two["heldout"], way[0] in ("--folds", "--holdout"), way)

    def test_several_tables_are_one(self):
        header, *lines = self.read("cases.csv").decode().splitlines()
        for name, chosen in (("first.csv", lines[:77]), ("second.csv", lines[77:])):
            self.write(name, "\n".join([header] + chosen + [""]))
        for way in WAYS:
            one = read_json(self.fit(*way, "--weight", "times")[1])
            words = ["first.csv", "second.csv", *way, "--weight", "times", "--json", "two.json"]
            self.ballast("fit", "clinic.xml", *words)
            self.assertEqual(dict(one, inputs=0), dict(read_json(self.read("two.json")), inputs=0), way)

    def test_the_test_table_from_standard_input(self):
        done = self.ballast("fit", "clinic.xml", "cases.csv", "--test", "-", "--weight", "times", "--json", "in.json", input=self.read("new.csv"))
        one, two = read_json(self.read("in.json")), read_json(self.fit("--test", "new.csv", "--weight", "times")[1])
        self.assertEqual(one["heldout"], two["heldout"])
        self.assertIn(b"New records", done.out)

    def test_an_empty_test_table(self):
        self.write("none.csv", self.header + ",times\n")
        page, told = self.fit("--test", "none.csv", "--weight", "times")
        self.assertIn(b"no complete record was held out", page)
        heldout = read_json(told)["heldout"]
        self.assertEqual((heldout["records"], heldout["bayes"]["per_record"], heldout["quadratic"]["bayes"]), (0, None, None))

    def test_a_test_table_that_is_not_there(self):
        done = self.ballast("fit", "clinic.xml", "cases.csv", "--test", "gone.csv", "-o", "fitted.xml", status=3)
        self.assert_error(done, "cannot-open", "gone.csv")
        self.assertFalse(os.path.exists(self.path("fitted.xml")))


if __name__ == "__main__":
    main()
