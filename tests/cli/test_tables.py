#!/usr/bin/env python3
"""Tables with weights, in several files, compressed, coded, and larger than memory, through the whole program.

usage: test_tables.py PROGRAM [--full] [TEST ...]      --full: a table of 1 GB instead of one of 60 MB
"""
import gzip
import itertools
import json
import os
import random
import re
import subprocess
import sys
import threading

from bench import DATA, ProgramTest, SANITIZED, main

FULL = "--full" in sys.argv
sys.argv = [word for word in sys.argv if word != "--full"]
MEGABYTE = 1000000
OUTCOMES = {"smoker": ["no", "yes"], "age": ["young", "middle", "old"], "cough": ["no", "dry", "wet"]}
NETWORK = """<BIF VERSION="0.3"><NETWORK><NAME>coughs (invented)</NAME>
%s<DEFINITION><FOR>cough</FOR><GIVEN>smoker</GIVEN><GIVEN>age</GIVEN></DEFINITION>
</NETWORK></BIF>
""" % "".join('<VARIABLE TYPE="nature"><NAME>%s</NAME>%s</VARIABLE>\n' % (name, "".join("<OUTCOME>%s</OUTCOME>" % o for o in outcomes))
              for name, outcomes in OUTCOMES.items())


def without_inputs(xml):
    return re.sub(rb"\n *<PROPERTY>ballast\.inputs.*</PROPERTY>", b"", xml)


def facts(text):
    """JSON without what names the files."""
    read = json.loads(text)
    read.pop("inputs", None)
    return read


def lines_of(columns, records):
    return "".join(",".join(line) + "\n" for line in [columns, *records])


class Tables(ProgramTest):
    def setUp(self):
        super().setUp()
        self.write("coughs.xml", NETWORK)

    def written(self, words, files):
        """What fit and tally write of the same tables: networks without ballast.inputs, JSON without its inputs."""
        found = []
        for command in ("fit", "tally"):
            more = [word for word in words if command == "fit" or word not in self.only_fit]
            self.ballast(command, *files, *more, "-o", "out.xml", "--json", "out.json", "--quiet")
            found += [without_inputs(self.read("out.xml")), facts(self.read("out.json"))]
        return found

    only_fit = ()

    def records(self, r, n, missing):
        def cell(name):
            return r.choice(["", "NA"]) if r.random() < missing else r.choice(OUTCOMES[name])
        return [[cell(name) for name in OUTCOMES] for _ in range(n)]

    def test_a_weighted_table_is_its_expansion(self):
        """Line by line, in the same order: nothing that is written differs in a byte."""
        for seed, (missing, policy) in enumerate([(0, "stop"), (0.05, "drop"), (0.05, "family")]):
            r = random.Random(seed)
            records = self.records(r, 150, missing)
            weights = [r.choice([0, 1, 1, 2, 3, 17]) for _ in records]
            sites = [r.choice("ABCDE") for _ in records]
            weighted = [record + [site, str(w)] for record, site, w in zip(records, sites, weights)]
            expanded = [record + [site] for record, site, w in zip(records, sites, weights) for _ in range(w)]
            self.write("weighted.csv", lines_of([*OUTCOMES, "site", "n"], weighted))
            self.write("expanded.csv", lines_of([*OUTCOMES, "site"], expanded))
            ways = [["--folds", "10"], ["--fold-column", "site"], ["--holdout", "0.3", "--repeats", "3"], ["--prior", "jeffreys"]]
            for way in ways:
                self.only_fit = way
                words = ["--missing", policy, *way]
                plain = self.written(words, ["coughs.xml", "expanded.csv"])
                counted = self.written(words + ["--weight", "n"], ["coughs.xml", "weighted.csv"])
                for found in plain + counted:
                    if isinstance(found, dict): # these count lines of the table, whatever their weight
                        for key in ("incomplete", "dropped", "missing", "ignored_columns"):
                            found["data"].pop(key, None)
                self.assertEqual(counted, plain, "%s %s" % (policy, way))

    def test_published_counts_are_their_expansion(self):
        for name in ("titanic", "ucbadmissions"):
            network, counts = os.path.join(DATA, name + ".xml"), os.path.join(DATA, name + "_counts.csv")
            with open(counts, encoding="utf-8") as file:
                header, *lines = [line.split(",") for line in file.read().splitlines()]
            self.write("expanded.csv", lines_of(header[:-1], [line[:-1] for line in lines for _ in range(int(line[-1]))]))
            self.assertEqual(self.written(["--weight", header[-1]], [network, counts]), self.written([], [network, "expanded.csv"]))

    def test_fractions_are_told_and_counted(self):
        self.write("t.csv", "smoker,age,cough,n\nno,old,dry,0.5\nno,old,dry,0.25\nyes,young,no,1\n")
        done = self.ballast("fit", "coughs.xml", "t.csv", "--weight", "n", "--json", "-", "--quiet")
        read = json.loads(done.out)
        self.assertEqual(read["data"]["weight"], 1.75)
        self.assertIn(b"[fractional-weight]", self.ballast("fit", "coughs.xml", "t.csv", "--weight", "n").err)
        self.assertIsNone(read["heldout"])

    def test_several_tables_are_one(self):
        r = random.Random(5)
        records = self.records(r, 200, 0.03)
        whole = lines_of(OUTCOMES, records)
        self.write("whole.csv", whole)
        parts = [records[:1], records[1:1], records[1:140], records[140:]]
        names = [self.write("part%d.csv" % i, lines_of(OUTCOMES, part)) for i, part in enumerate(parts)]
        for policy in ("drop", "family"):
            words = ["--missing", policy]
            self.assertEqual(self.written(words, ["coughs.xml", *names]), self.written(words, ["coughs.xml", "whole.csv"]))
        # One of them may be a pipe, and one may be compressed.
        self.write("last.csv.gz", gzip.compress(lines_of(OUTCOMES, parts[3]).encode()))
        self.ballast("fit", "coughs.xml", "whole.csv", "--missing", "drop", "-o", "whole.xml", "--quiet")
        self.ballast("fit", "coughs.xml", names[0], names[1], "-", "last.csv.gz", "--missing", "drop", "-o", "out.xml", "--quiet",
                     input=self.read(names[2]))
        self.assertEqual(without_inputs(self.read("out.xml")), without_inputs(self.read("whole.xml")))

    def test_codes_are_labels(self):
        r = random.Random(6)
        records = self.records(r, 100, 0)
        codes = {("smoker", "no"): "0", ("smoker", "yes"): "J", ("age", "old"): "", ("cough", "wet"): "NA"}
        book = [["variable", "outcome", "code"]] + [[v, o, code] for (v, o), code in codes.items()]
        coded = [[codes.get((v, cell), cell) if r.random() < 0.7 else cell for v, cell in zip(OUTCOMES, record)] for record in records]
        self.write("book.csv", lines_of(book[0], book[1:]))
        self.write("plain.csv", lines_of(OUTCOMES, records))
        self.write("coded.csv", lines_of(OUTCOMES, coded))
        self.assertEqual(self.written(["--codebook", "book.csv"], ["coughs.xml", "coded.csv"]), self.written([], ["coughs.xml", "plain.csv"]))

    def test_numbers_are_cut(self):
        """Against Python's own comparisons, on and beside the cuts."""
        r = random.Random(7)
        cuts = [-1.5, 37.5]
        xml = NETWORK.replace("<NAME>age</NAME>", "<NAME>age</NAME><PROPERTY>ballast.cuts = -1.5 37.5</PROPERTY>"
                                                  "<PROPERTY>ballast.column = years</PROPERTY>")
        self.write("cut.xml", xml)
        numbers = ["-1.5", "37.5", "37.50", "3.75e1", "37.499999999999993", "-1.5000000000000002", "0", "1e300", "-1e300", "+40", ".5", "7."]
        records = [[cell[0], r.choice(numbers), cell[2]] for cell in self.records(r, 300, 0)]
        labels = [[a, OUTCOMES["age"][sum(cut <= float(x) for cut in cuts)], b] for a, x, b in records]
        self.write("numbers.csv", lines_of(["smoker", "years", "cough"], records))
        self.write("labels.csv", lines_of(OUTCOMES, labels))
        cut = self.written([], ["cut.xml", "numbers.csv"])
        plain = self.written([], ["coughs.xml", "labels.csv"])
        strip = [re.sub(rb"\n *<PROPERTY>ballast\.(cuts|column).*</PROPERTY>", b"", x) if isinstance(x, bytes) else x for x in cut]
        self.assertEqual(strip, plain)

    def fed(self, begin, forever, *words):
        """A run whose standard input begins so and then goes on with what forever gives."""
        process = self.start(*words, stdin=subprocess.PIPE)

        def write():
            try:
                for part in itertools.chain([begin], forever):
                    process.stdin.write(part)
                process.stdin.close()
            except (BrokenPipeError, ValueError):
                pass

        writer = threading.Thread(target=write)
        writer.start()
        out, err = process.stdout.read(), process.stderr.read()
        _, status, usage = os.wait4(process.pid, 0)
        process.returncode = os.waitstatus_to_exitcode(status)
        writer.join()
        process.stdout.close()
        process.stderr.close()
        if not process.stdin.closed:
            try:
                process.stdin.close()
            except BrokenPipeError:
                pass
        return process.returncode, out, err, usage.ru_maxrss / 1024

    def test_a_codebook_ends(self):
        self.write("t.csv", "smoker,age,cough\nno,old,dry\n")
        status, _, err, _ = self.fed(b"variable,outcome,code\n", itertools.repeat(b"smoker,yes,1\n" * 10000), "tally", "coughs.xml", "t.csv",
                                     "--codebook", "-", "-o", "-")
        self.assertEqual(status, 1)
        self.assertTrue(err.strip().endswith(b"[too-many-codes]"), err)

    def test_groups_end(self):
        def records():
            for begin in itertools.count(0, 10000):
                yield b"".join(b"%d,no,old,dry\n" % i for i in range(begin, begin + 10000))
        status, _, err, _ = self.fed(b"id,smoker,age,cough\n", records(), "fit", "coughs.xml", "-", "--fold-column", "id", "--quiet")
        self.assertEqual(status, 1)
        self.assertIn(b"standard input:1048578: ", err)
        self.assertTrue(err.strip().endswith(b"[too-many-groups]"), err)

    def test_a_large_table_takes_little_memory(self):
        """Generated as it is read, through a pipe: 32 MB are enough for any number of records, and every one is counted."""
        r = random.Random(8)
        piece = self.records(r, 20000, 0)
        data = "".join(",".join(line) + ",1.25\n" for line in piece).encode()
        times = (1000 if FULL else 60) * MEGABYTE // len(data)
        status, out, err, mebibytes = self.fed(b"smoker,age,cough,n\n", itertools.repeat(data, times), "tally", "coughs.xml", "-", "--weight", "n",
                                               "-o", "-", "--quiet")
        self.assertEqual(status, 0, err)
        if not SANITIZED:
            self.assertLess(mebibytes, 32)
        counts = re.search(rb"<FOR>smoker</FOR>\s*<PROPERTY>ballast.counts =([^<]*)</PROPERTY>", out).group(1).split()
        self.assertEqual([float(c) for c in counts],
                         [1.25 * times * sum(line[0] == label for line in piece) for label in OUTCOMES["smoker"]])


if __name__ == "__main__":
    main()
