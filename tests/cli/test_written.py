#!/usr/bin/env python3
"""What comes out: independent readers read it, hostile names arrive as they were, and it says nothing about the machine.

usage: test_written.py PROGRAM [TEST ...]
"""
import csv
import hashlib
import io
import json
import os
import re
import socket
import xml.etree.ElementTree as ElementTree

from bench import ProgramTest, main
from networks import write_network, write_records
from program import read_json

# Names and labels that mean something to what they pass through.
HOSTILE = ["<script>alert(1)</script>", "]]>", "a--b", "-->", "=1+1", "@SUM(A1)", "+1", '"quoted"', "it's", "a,b", ";",
           "#first", "&amp;", "&#65;", "%s%n", "\\n", "\\u0041", "a=b", "A|B", "A | B=c", "NA", "null", "NaN", "?", "..",
           "/etc/passwd", "a  b", "\u00e9", "e\u0301", "\u3000wide", "\U0001f637" * 60, "\u0627\u0644\u062d\u0645\u0649",
           "x" * 255, "--help", "yes", "Yes", "$(id)", "`id`"]
ESCAPED = {"control": "\x07", "escape": "\x1b[31m", "newline": "a\nb", "tab": "a\tb", "direction": "\u202e", "C1": "\u0085",
           "bom": "\ufeffa"}


def properties(root):
    """The properties of the network element, by name."""
    texts = [element.text for element in root.find("NETWORK").findall("PROPERTY")]
    return dict(text.split(" = ", 1) for text in texts)


class Hostile(ProgramTest):
    def setUp(self):
        super().setUp()
        labels = ["own " + name if len(name) < 200 else "own" for name in HOSTILE]
        self.outcomes = {name: [label, "<no>", '"', "#"] for name, label in zip(HOSTILE, labels)}
        parents = {child: [parent] for parent, child in zip(HOSTILE, HOSTILE[1:])}
        tables = {name: [[0.25] * 4] * (4 if name in parents else 1) for name in HOSTILE}
        write_network(self.path("hostile.xml"), self.outcomes, parents, tables, name=']]><script>"&')
        self.ballast("draw", "hostile.xml", "--records", "60", "-o", "hostile.csv")

    def test_csv(self):
        with open(self.path("hostile.csv"), encoding="utf-8", newline="") as file:
            header, *records = list(csv.reader(file))
        self.assertEqual(header, HOSTILE)
        self.assertEqual(len(records), 60)
        for record in records:
            for name, label in zip(HOSTILE, record):
                self.assertIn(label, self.outcomes[name])

    def test_json(self):
        fit = read_json(self.ballast("fit", "hostile.xml", "hostile.csv", "--json", "-", "--ess", "9").out.decode())
        self.assertEqual(fit["network"]["name"], ']]><script>"&')
        self.assertEqual([family["variable"] for family in fit["families"]], HOSTILE)
        self.assertEqual([family["outcomes"] for family in fit["families"]], list(self.outcomes.values()))
        for parent, family in zip(HOSTILE, fit["families"][1:]):
            self.assertEqual([row["given"] for row in family["rows"]], [{parent: label} for label in self.outcomes[parent]])
        check = read_json(self.ballast("check", "hostile.xml", "hostile.csv", "--json", "-").out.decode())
        self.assertEqual([family["variable"] for family in check["unsupported"]["families"]], HOSTILE)

    def test_xml(self):
        self.ballast("fit", "hostile.xml", "hostile.csv", "-o", "out.xml", "--ess", "9")
        root = ElementTree.parse(self.path("out.xml")).getroot()
        self.assertEqual(root.find("NETWORK/NAME").text, ']]><script>"&')
        written = {variable.find("NAME").text: [outcome.text for outcome in variable.findall("OUTCOME")]
                   for variable in root.iter("VARIABLE")}
        self.assertEqual(written, self.outcomes)
        told = self.ballast("check", "out.xml", "hostile.csv").err.decode()
        self.assertEqual(re.findall(r"\[[a-z-]+\]$", told, re.M), ["[counts-ignored]"])

    def test_pages_keep_their_width(self):
        for words in (["fit", "hostile.xml", "hostile.csv"], ["check", "hostile.xml", "hostile.csv"],
                      ["fit", "clinic.xml", "cases.csv"], ["check", "clinic.xml", "cases.csv"], ["check", "clinic.xml"]):
            page = self.ballast(*words).out.decode()
            self.assertNotIn("\x1b", page)
            for line in page.splitlines():
                self.assertLessEqual(len(line), 80, "%s: %s" % (words, line))

    def test_what_is_invisible_is_refused_and_shown_escaped(self):
        for told, name in ESCAPED.items():
            for outcomes in ({name: ["no", "yes"]}, {"Cold": ["no", name]}):
                write_network(self.path("net.xml"), outcomes)
                done = self.ballast("check", "net.xml", status=1)
                message = done.err.decode()
                self.assertTrue(all(c.isprintable() for c in message[:-1]), "%s: %r" % (told, message))
                self.assertRegex(message, r"^net\.xml:\d+:\d+: .* \[(control-character|forbidden-character)\]\n$")

    def test_names_in_messages(self):
        write_records(self.path("bad.csv"), HOSTILE, [["\x1b[2J<b>"] + ["x"] * (len(HOSTILE) - 1)])
        done = self.ballast("fit", "hostile.xml", "bad.csv", status=1)
        self.assertTrue(all(c.isprintable() or c == "\n" for c in done.err.decode()), done.err)


class Provenance(ProgramTest):
    def fit(self, *words):
        self.ballast("fit", "./clinic.xml", self.path("cases.csv"), "-o", "out.xml", "--json", "out.json", *words)
        return ElementTree.parse(self.path("out.xml")).getroot(), read_json(self.read("out.json").decode())

    def test_inputs_by_base_name_and_hash(self):
        root, told = self.fit()
        expected = [{"file": name, "bytes": len(self.read(name)), "sha256": hashlib.sha256(self.read(name)).hexdigest()}
                    for name in ("clinic.xml", "cases.csv")]
        self.assertEqual(told["inputs"], expected)
        self.assertEqual(properties(root)["ballast.inputs"], ", ".join('"%(file)s" sha256=%(sha256)s' % one for one in expected))
        version = self.ballast("--version").out.decode().strip()
        self.assertEqual(properties(root)["ballast.made-by"], version)
        self.assertEqual("ballast " + told["ballast"]["version"], version)
        self.assertEqual(properties(root)["ballast.records"], "250")

    def test_nothing_about_the_machine(self):
        self.fit()
        page = self.ballast("fit", self.path("clinic.xml"), self.path("cases.csv"), "-o", self.path("out.xml")).out
        given = self.read("clinic.xml").decode() + self.read("cases.csv").decode()
        words = {os.environ.get("USER", ""), os.environ.get("HOME", ""), socket.gethostname(), self.folder, os.getcwd()}
        for content in (self.read("out.xml"), self.read("out.json"), page):
            text = content.decode()
            told = [word for word in words if len(word) > 3 and word not in given and word in text]
            self.assertEqual(told, [])
            self.assertEqual(re.findall(r"20\d\d-\d\d-\d\d|\d\d:\d\d:\d\d|/tmp|/home", text), [])

    def test_a_file_name_of_any_bytes(self):
        for name, shown in ((b"a\x1b.csv", "a\\x1B.csv"), (b"\xff.csv", "\\xFF.csv"), (b"a\nb.csv", "a\\x0Ab.csv"),
                            (b'<&">.csv', '<&">.csv')):
            os.rename(self.path("cases.csv"), os.path.join(self.folder.encode(), name))
            self.ballast("fit", "clinic.xml", name, "-o", "out.xml", "--json", "out.json", "--quiet")
            self.assertIn('"%s" sha256' % shown, properties(ElementTree.parse(self.path("out.xml")).getroot())["ballast.inputs"])
            told = json.loads(self.read("out.json"))["inputs"][1]["file"]
            self.assertEqual(told, name.decode(errors="replace"))
            os.rename(os.path.join(self.folder.encode(), name), self.path("cases.csv"))

    def test_standard_input_is_named(self):
        told = read_json(self.ballast("fit", "clinic.xml", "-", "--json", "-", input=self.read("cases.csv")).out.decode())
        self.assertEqual(told["inputs"][1]["file"], "standard input")
        self.assertEqual(told["inputs"][1]["sha256"], hashlib.sha256(self.read("cases.csv")).hexdigest())

    def test_foreign_properties_stay(self):
        network = self.read("clinic.xml").decode()
        kept = "<PROPERTY>colour = &lt;red&gt; &amp; \"blue\"</PROPERTY>"
        for tag in ("<VARIABLE TYPE", "<FOR>"):
            network = network.replace(tag, kept + tag, 1)
        self.write("clinic.xml", network)
        root, _ = self.fit()
        found = [element.text for element in root.iter("PROPERTY") if element.text.startswith("colour")]
        self.assertEqual(found, ['colour = <red> & "blue"'] * 2)


class Redacted(ProgramTest):
    SECRET = "Jane Doe"

    def test_messages_show_no_cell(self):
        tables = [
            "Cold,Cough\nno,%s\n", "Cold,Cough\nno,%s,dry\n", "Cold,Cough\n%s\n", 'Cold,Cough\nno,"%s"x\n',
            'Cold,Cough\nno,"%s\n', "Cold,Cough\n" + "%s,%s\n" * 20, "Cold,Cough\nno,%s\x07\n", "Cold,Cough\nno,dry\n\n%s,no\n",
            "Cold,Cough\nno,dry\n#%s\n", "Cold,Cough\nno,dry%s\n", "Cold,Cough\nno,yes %s\n",
        ]
        for table in tables:
            self.write("cases.csv", table.replace("%s", self.SECRET))
            for command in ("fit", "check"):
                plain = self.ballast(command, "small.xml", "cases.csv", status=1).err.decode()
                redacted = self.ballast(command, "small.xml", "cases.csv", "--redact", status=1).err.decode()
                for part in self.SECRET.split():
                    self.assertNotIn(part, redacted)
                places = [re.findall(r"^\S+?: ", text, re.M) for text in (plain, redacted)]
                self.assertEqual(places[0], places[1])

    def test_without_it_only_the_offending_cell_is_shown(self):
        self.write("cases.csv", "Cold,Cough,name\nno,dyr,%s\n" % self.SECRET)
        done = self.ballast("fit", "small.xml", "cases.csv", status=1).err.decode()
        self.assertIn('"dyr"', done)
        self.assertNotIn("Jane", done)


class ReadBack(ProgramTest):
    FITS = ([], ["--ess", "0.01"], ["--prior", "k2"], ["--prior", "jeffreys", "--scale", "auto"], ["--prior", "expert"],
            ["--prior", "expert", "--row-ess", "7", "--prior-floor", "0.01"], ["--estimate", "ml"], ["--ess", "1e12"],
            ["--ess", "1e-9"])

    def parts(self, name):
        """Tables, counts and pseudo-counts of a network file, as the texts of their numbers."""
        root = ElementTree.parse(self.path(name)).getroot()
        found = {}
        for definition in root.iter("DEFINITION"):
            child = definition.find("FOR").text
            found[child] = {"table": definition.find("TABLE").text.split()}
            for element in definition.findall("PROPERTY"):
                key, _, value = element.text.partition("=")
                found[child][key.strip()] = value.split()
        return found

    def test_every_fit_can_be_read_again(self):
        for words in self.FITS:
            self.ballast("fit", "clinic.xml", "cases.csv", "-o", "one.xml", "--quiet", *words)
            page = self.ballast("check", "one.xml").out.decode()
            self.assertIn("pseudo-counts", page)
            for family in self.parts("one.xml").values():
                outcomes = len(family["table"])
                self.assertEqual((len(family["ballast.counts"]), len(family["ballast.pseudo-counts"])), (outcomes, outcomes))
            self.ballast("draw", "one.xml", "--records", "10", "-o", "drawn.csv")

    def test_means_are_what_counts_and_pseudo_counts_say(self):
        """(pseudo-count + count) / their sum over the row: Heckerman, Geiger & Chickering 1995, Machine Learning 20."""
        for words in self.FITS:
            if "ml" in words:
                continue
            self.ballast("fit", "clinic.xml", "cases.csv", "--json", "fit.json", "-o", "one.xml", "--quiet", *words)
            parts = self.parts("one.xml")
            for family in read_json(self.read("fit.json").decode())["families"]:
                r = len(family["outcomes"])
                numbers = {key: list(map(float, values)) for key, values in parts[family["variable"]].items()}
                for j, row in enumerate(family["rows"]):
                    cells = slice(j * r, (j + 1) * r)
                    self.assertEqual(row["counts"], numbers["ballast.counts"][cells])
                    self.assertEqual(row["pseudo_counts"], numbers["ballast.pseudo-counts"][cells])
                    self.assertEqual(row["mean"], numbers["table"][cells])
                    total = sum(row["counts"]) + sum(row["pseudo_counts"])
                    for n, alpha, mean in zip(row["counts"], row["pseudo_counts"], row["mean"]):
                        self.assertAlmostEqual(mean, (n + alpha) / total, delta=4e-16 * len(row["mean"]))

    def test_own_counts_give_the_same_fit(self):
        self.ballast("fit", "clinic.xml", "cases.csv", "-o", "one.xml", "--quiet")
        for data in ([], ["one.xml"]):
            self.ballast("fit", "one.xml", *data, "-o", "two.xml", "--quiet")
            self.assertEqual(self.parts("two.xml"), self.parts("one.xml"))
        self.ballast("fit", "one.xml", "-o", "three.xml", "--quiet")
        self.ballast("fit", "one.xml", "-o", "four.xml", "--quiet")
        self.assertEqual(self.read("three.xml"), self.read("four.xml"))

    def test_an_empty_batch_gives_the_prior_and_says_so(self):
        self.ballast("fit", "clinic.xml", "cases.csv", "-o", "one.xml", "--quiet")
        self.write("empty.csv", self.read("cases.csv").splitlines(True)[0])
        for network in ("clinic.xml", "one.xml"):
            done = self.ballast("fit", network, "empty.csv", "-o", "two.xml", "--json", "two.json", "--ess", "8")
            self.assertIn(b"[no-records]", done.err)
            self.assertEqual(b"[counts-ignored]" in done.err, network == "one.xml")
            told = read_json(self.read("two.json").decode())
            self.assertEqual((told["data"]["records"], told["heldout"], told["loo"]["per_record"]), (0, None, None))
            for family in told["families"]:
                r = len(family["outcomes"])
                for row in family["rows"]:
                    self.assertEqual((row["basis"], row["total"], row["ml"], row["data_share"]), ("prior", 0, None, 0))
                    self.assertEqual(row["pseudo_counts"], [8 / (r * len(family["rows"]))] * r)
                    self.assertEqual(row["mean"], [1 / r] * r)
            self.assertTrue(all(float(n) == 0 for family in self.parts("two.xml").values() for n in family["ballast.counts"]))
            self.ballast("check", "two.xml")

    def test_counts_are_those_of_the_table(self):
        self.ballast("fit", "clinic.xml", "cases.csv", "-o", "one.xml", "--quiet")
        root = ElementTree.parse(self.path("one.xml")).getroot()
        outcomes = {v.find("NAME").text: [o.text for o in v.findall("OUTCOME")] for v in root.iter("VARIABLE")}
        records = list(csv.DictReader(io.StringIO(self.read("cases.csv").decode())))
        for definition in root.iter("DEFINITION"):
            child, parents = definition.find("FOR").text, [given.text for given in definition.findall("GIVEN")]
            cells = [()]
            for name in [*parents, child]:
                cells = [cell + (label,) for cell in cells for label in outcomes[name]]
            found = dict.fromkeys(cells, 0)
            for record in records:
                found[tuple(record[name] for name in [*parents, child])] += 1
            self.assertEqual([int(n) for n in self.parts("one.xml")[child]["ballast.counts"]], list(found.values()))


if __name__ == "__main__":
    main()
