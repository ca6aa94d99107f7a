#!/usr/bin/env python3
"""Batch after batch: a fit carried on, tallies put in between, old counts made lighter.

usage: test_carried.py PROGRAM [TEST ...]
"""
import math
import os
import re
import time
import xml.etree.ElementTree as ElementTree

from bench import NETWORKS, SANITIZED, ProgramTest, main
from networks import write_network
from program import read_json

PROVENANCE = re.compile(rb"ballast\.(inputs|parts|made-by) = ")
FITS = [["--prior", "jeffreys"], ["--prior", "k2", "--scale", "0.3"], ["--ess", "7"], ["--prior", "expert", "--row-ess", "6"], []]


def properties(content):
    return dict(p.text.split(" = ", 1) for p in ElementTree.fromstring(content).find("NETWORK").findall("PROPERTY"))


class Carried(ProgramTest):
    """Three batches of the demo's records: jan 100, feb 1, mar 149."""

    def setUp(self):
        super().setUp()
        with open(os.path.join(NETWORKS, "cases.csv"), encoding="utf-8") as file:
            self.header, *self.lines = file.read().splitlines()
        for name, first, last in (("jan.csv", 0, 100), ("feb.csv", 100, 101), ("mar.csv", 101, 250), ("none.csv", 0, 0)):
            self.write(name, "\n".join([self.header] + self.lines[first:last] + [""]))

    def fit(self, *words, output=None):
        """The JSON of a fit without records held out."""
        words = [*words, "--quiet", "--json", "-", "--folds", "0"] + (["-o", output] if output else [])
        return read_json(self.ballast("fit", *words).out)

    def but_provenance(self, name):
        return [line for line in self.read(name).splitlines() if not PROVENANCE.search(line)]

    def test_any_order_of_batches_is_one_batch(self):
        orders = [("jan", "feb", "mar"), ("mar", "jan", "feb"), ("feb", "mar", "jan")]
        for number, prior in enumerate(FITS):
            for first, *others in orders:
                whole = self.fit("clinic.xml", "jan.csv", "feb.csv", "mar.csv", *prior, output="whole.xml")
                if not prior:  # an ESS that the first batch asked for
                    ess = repr(self.fit("clinic.xml", first + ".csv")["prior"]["ess"])
                    whole = self.fit("clinic.xml", "jan.csv", "feb.csv", "mar.csv", "--ess", ess, output="whole.xml")
                self.fit("clinic.xml", first + ".csv", *prior, output="carried.xml")
                for other in others:
                    got = self.fit("carried.xml", other + ".csv", "--prior", "carried", output="next.xml")
                    os.rename(self.path("next.xml"), self.path("carried.xml"))
                self.assertEqual(self.but_provenance("carried.xml"), self.but_provenance("whole.xml"), (number, first))
                for key in ("log_marginal_likelihood", "loo", "families"):
                    self.assertEqual(got[key], whole[key], key)
                self.assertEqual(properties(self.read("carried.xml"))["ballast.records"], "250")
                self.assertEqual(len(properties(self.read("carried.xml"))["ballast.parts"].split()), 3)

    def test_a_tally_is_a_batch_like_a_table(self):
        self.fit("clinic.xml", "jan.csv", "--prior", "jeffreys", output="jan.xml")
        self.ballast("tally", "clinic.xml", "feb.csv", "mar.csv", "-o", "tally.xml", "--quiet")
        table = self.fit("jan.xml", "feb.csv", "mar.csv", "--prior", "carried", output="table.xml")
        tally = self.fit("jan.xml", "tally.xml", "--prior", "carried", output="tallied.xml")
        self.assertEqual(self.but_provenance("tallied.xml"), self.but_provenance("table.xml"))
        self.assertEqual({**tally, "inputs": 0, "data": 0}, {**table, "inputs": 0, "data": 0})
        parts = [properties(self.read(name))["ballast.parts"] for name in ("tallied.xml", "table.xml")]
        self.assertEqual(parts[0], parts[1])

    def test_new_records_given_the_old(self):
        """The difference of two log marginal likelihoods (Dawid 1984); nothing new is predicted with certainty."""
        old = self.fit("clinic.xml", "jan.csv", "--prior", "k2", output="jan.xml")
        both = self.fit("clinic.xml", "jan.csv", "mar.csv", "--prior", "k2")
        got = self.fit("jan.xml", "mar.csv", "--prior", "carried")
        self.assertEqual(got["log_marginal_likelihood"], both["log_marginal_likelihood"])
        self.assertTrue(math.isclose(got["log_predictive"], both["log_marginal_likelihood"] - old["log_marginal_likelihood"],
                                     rel_tol=1e-13))
        self.assertEqual(got["loo"], both["loo"])
        self.assertEqual((got["data"]["records"], got["data"]["earlier"]), (149, 100))
        self.assertEqual(self.fit("jan.xml", "none.csv", "--prior", "carried")["log_predictive"], 0)
        alone = self.fit("jan.xml", "--prior", "carried")
        self.assertEqual((alone["log_predictive"], alone["data"]["records"], alone["data"]["earlier"]), (0, 0, 100))
        self.assertEqual(alone["families"], old["families"])
        self.assertIsNone(old["log_predictive"])
        self.assertEqual(got["prior"], {**dict.fromkeys(got["prior"]), "kind": "carried"})

    def test_one_record_is_predicted_by_the_old_tables(self):
        """One new record: the log of the product of its cells in the file that is carried on."""
        old = self.fit("clinic.xml", "jan.csv", "--prior", "jeffreys", output="jan.xml")
        got = self.fit("jan.xml", "feb.csv", "--prior", "carried")
        record = dict(zip(self.header.split(","), self.lines[100].split(",")))
        total = 0
        for family in old["families"]:
            row = next(r for r in family["rows"] if all(record[p] == label for p, label in r["given"].items()))
            total += math.log(row["mean"][family["outcomes"].index(record[family["variable"]])])
        self.assertTrue(math.isclose(got["log_predictive"], total, rel_tol=1e-10), (got["log_predictive"], total))

    def test_old_counts_may_weigh_less(self):
        old = self.fit("clinic.xml", "jan.csv", "--prior", "jeffreys", output="jan.xml")
        new = self.fit("clinic.xml", "mar.csv", "--prior", "jeffreys", output="mar.xml")
        half = self.fit("jan.xml", "mar.csv", "--prior", "carried", "--carry", "0.5", output="half.xml")
        none = self.fit("jan.xml", "mar.csv", "--prior", "carried", "--carry", "0", output="none.xml")
        for a, b, both in zip(old["families"], new["families"], half["families"]):
            for x, y, row in zip(a["rows"], b["rows"], both["rows"]):
                self.assertEqual(row["counts"], [m / 2 + n for m, n in zip(x["counts"], y["counts"])])
                post = [n + 0.5 for n in row["counts"]]
                self.assertEqual(row["mean"], [p / sum(post) for p in post])
                self.assertEqual(row["data_share"], row["total"] / (sum(row["pseudo_counts"]) + row["total"]))
        self.assertEqual(half["data"]["earlier"], 50)
        self.assertEqual(properties(self.read("half.xml"))["ballast.records"], "199")
        for key in ("log_marginal_likelihood", "loo", "families"):
            self.assertEqual(none[key], new[key], key)
        self.assertEqual(none["log_predictive"], new["log_marginal_likelihood"])
        self.assertEqual(self.but_provenance("none.xml"), self.but_provenance("mar.xml"))
        self.assertEqual(properties(self.read("none.xml"))["ballast.parts"], properties(self.read("mar.xml"))["ballast.parts"])
        whole = self.fit("jan.xml", "mar.csv", "--prior", "carried", "--carry", "1")
        self.assertEqual(whole["data"]["earlier"], 100)

    def test_fractions_leave_nothing_out(self):
        self.fit("clinic.xml", "jan.csv", "--prior", "jeffreys", output="jan.xml")
        got = self.ballast("fit", "jan.xml", "mar.csv", "--prior", "carried", "--carry", "0.5", "--json", "half.json", "-o", "half.xml")
        self.assertNotIn(b"leave-one-out", got.out)
        self.assertNotIn(b"New records", got.out)
        self.assertNotIn(b"nan", got.out)
        self.assertIn(b"[fractional-weight]", got.err)
        half = read_json(self.read("half.json"))
        self.assertEqual(half["loo"], {"log_likelihood": None, "per_record": None})
        self.assertEqual([other["loo_per_record"] for other in half["other_priors"]], [None] * 3)
        self.assertIsNone(half["heldout"])
        self.assertTrue(math.isfinite(half["log_predictive"]))
        for words in (["--ess", "auto-loo"], ["half.xml", "--ess", "auto-loo"]):
            done = self.ballast("fit", "half.xml", *words, status=1)
            self.assert_error(done, "fractional-weight", "auto")
        self.assertIsNone(self.fit("half.xml", "--ess", "auto")["loo"]["per_record"])

    def test_provenance_of_the_prior_is_kept(self):
        self.fit("clinic.xml", "jan.csv", "--ess", "7", output="jan.xml")
        self.fit("jan.xml", "feb.csv", "--prior", "carried", output="feb.xml")
        kept = properties(self.read("feb.xml"))
        self.assertEqual((kept["ballast.ess"], kept["ballast.prior"]), ("7", "bdeu"))
        self.fit("jan.xml", "feb.csv", "--prior", "k2", output="k2.xml")
        other = properties(self.read("k2.xml"))
        self.assertNotIn("ballast.ess", other)
        self.assertEqual((other["ballast.prior"], other["ballast.records"]), ("k2 scale=1", "1"))
        self.assertEqual(len(other["ballast.parts"].split()), 1)

    def test_held_out_keeps_the_old_counts_in_every_part(self):
        """One fold a new record: each is predicted by the old records and the other new ones, as leave-one-out does over all."""
        self.fit("clinic.xml", "jan.csv", "--prior", "k2", output="jan.xml")
        words = ["--quiet", "--json", "-", "--folds", "149"]
        got = read_json(self.ballast("fit", "jan.xml", "mar.csv", "--prior", "carried", *words).out)
        other = read_json(self.ballast("fit", "clinic.xml", "jan.csv", "mar.csv", "--prior", "k2", "--quiet", "--json", "-", "--folds", "249").out)
        self.write("parts.csv", "\n".join([self.header + ",part"] + [line + ",old" for line in self.lines[:100]] +
                                          [line + ",%d" % i for i, line in enumerate(self.lines[101:])] + [""]))
        self.assertEqual(got["heldout"]["records"], 149)
        self.assertTrue(math.isclose(other["heldout"]["bayes"]["log_likelihood"], other["loo"]["log_likelihood"], rel_tol=1e-10))
        # by label: the part of the old records is predicted too, by the new ones alone
        parts = read_json(self.ballast("fit", "clinic.xml", "parts.csv", "--prior", "k2", "--fold-column", "part", "--quiet", "--json", "-").out)
        self.fit("clinic.xml", "mar.csv", "--prior", "k2", output="mar.xml")
        old = read_json(self.ballast("fit", "mar.xml", "--test", "jan.csv", "--prior", "k2", "--quiet", "--json", "-").out)
        total = got["heldout"]["bayes"]["log_likelihood"] + old["heldout"]["bayes"]["log_likelihood"]
        self.assertTrue(math.isclose(parts["heldout"]["bayes"]["log_likelihood"], total, rel_tol=1e-12))

    def test_refusals(self):
        self.fit("clinic.xml", "jan.csv", "--prior", "k2", output="jan.xml")
        done = self.ballast("fit", "jan.xml", "feb.csv", "--prior", "expert", "--row-ess", "5", status=1)
        self.assert_error(done, "fitted-tables", "carried")
        done = self.ballast("fit", "clinic.xml", "feb.csv", "--prior", "carried", status=2)
        self.assert_error(done, "no-pseudo-counts")
        self.ballast("tally", "clinic.xml", "feb.csv", "-o", "tally.xml", "--quiet")
        self.assert_error(self.ballast("fit", "tally.xml", "feb.csv", "--prior", "carried", status=2), "no-pseudo-counts")
        for prior in ("bdeu", "k2", "jeffreys", "expert"):
            self.assert_error(self.ballast("fit", "jan.xml", "--prior", prior, "--carry", "0.5", status=2), "option-mismatch", "--carry")
        for words in (["--ess", "5"], ["--scale", "2"], ["--row-ess", "5"], ["--prior-floor", "0.1"]):
            self.assert_error(self.ballast("fit", "jan.xml", "--prior", "carried", *words, status=2), "option-mismatch", words[0])
        for value in ("-0.1", "1.1", "nan"):
            self.assert_error(self.ballast("fit", "jan.xml", "--prior", "carried", "--carry", value, status=2), "bad-value")
        zeros = re.sub(rb"(ballast.pseudo-counts =\s)([\s1]+)", lambda found: found.group(1) + found.group(2).replace(b"1", b"0"),
                       self.read("jan.xml"), count=1)
        self.write("zeros.xml", zeros)
        self.assert_error(self.ballast("fit", "zeros.xml", "feb.csv", "--prior", "carried", status=1), "no-pseudo-counts", "zeros.xml")


class Tallies(ProgramTest):
    def test_a_tally_fits_as_its_table_does(self):
        self.write("again.csv", self.read("cases.csv"))
        self.ballast("tally", "clinic.xml", "cases.csv", "again.csv", "-o", "tally.xml", "--json", "tally.json", "--quiet")
        words = ["--quiet", "--json", "-", "--folds", "0", "--ess", "3"]
        fits = [read_json(self.ballast("fit", *inputs, *words, "-o", "%d.xml" % i).out)
                for i, inputs in enumerate([["clinic.xml", "cases.csv", "again.csv"], ["tally.xml"], ["clinic.xml", "tally.xml"]])]
        for key in ("log_marginal_likelihood", "loo", "other_priors", "families", "network"):
            self.assertEqual(fits[1][key], fits[0][key], key)
            self.assertEqual(fits[2][key], fits[0][key], key)
        written = [sorted(line for line in self.read("%d.xml" % i).splitlines() if b"ballast.inputs" not in line) for i in range(3)]
        self.assertEqual(written[1], written[0])
        self.assertEqual(written[2], written[0])
        tally = read_json(self.read("tally.json"))
        self.assertEqual(tally["ballast"]["command"], "tally")
        self.assertEqual((tally["data"]["records"], tally["data"]["weight"]), (500, 500))
        self.assertEqual([i["file"] for i in tally["inputs"]], ["clinic.xml", "cases.csv", "again.csv"])
        self.assertEqual([[f["variable"], f["parents"], f["counts"]] for f in tally["families"]],
                         [[f["variable"], f["parents"], [n for row in f["rows"] for n in row["counts"]]] for f in fits[0]["families"]])

    def test_a_tally_is_asked_for_somewhere(self):
        self.assert_error(self.ballast("tally", "clinic.xml", "cases.csv", status=2), "wrong-arguments", "-o")

    def test_a_large_tally_is_read_and_written_in_seconds(self):
        """2^20 cells, nearly all of them 0."""
        parents = ["p%d" % i for i in range(4)]
        outcomes = {name: ["o%d" % i for i in range(16)] for name in [*parents, "child"]}
        write_network(self.path("large.xml"), outcomes, {"child": parents})
        self.write("large.csv", "\n".join([",".join(outcomes)] + [",".join("o%d" % (i * k % 16) for k in range(1, 6)) for i in range(500)] + [""]))
        start = time.monotonic()
        self.ballast("tally", "large.xml", "large.csv", "-o", "tally.xml", "--quiet")
        middle = time.monotonic()
        self.ballast("tally", "large.xml", "tally.xml", "-o", "again.xml", "--quiet")
        end = time.monotonic()
        self.assertGreater(len(self.read("tally.xml")), 2 << 20)
        self.assertEqual([line for line in self.read("again.xml").splitlines() if b"ballast.inputs" not in line],
                         [line for line in self.read("tally.xml").splitlines() if b"ballast.inputs" not in line])
        if not SANITIZED:
            self.assertLess(middle - start, 5)
            self.assertLess(end - middle, 5)


if __name__ == "__main__":
    main()
