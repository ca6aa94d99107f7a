#!/usr/bin/env python3
"""test_csv.py DRIVER [SEED]: tables in odd dress, read by Ballast and by Python's own csv module.

The referee is the module csv of Python's standard library (with hashlib for the digest): what it reads of a table has to be
what DRIVER (csv_driver.c) codes: also by a codebook, with weights (whose rounding and sum are those of Python's fractions), and with
missing cells dropped or given. Some tables are compressed by Python's gzip. A wrong label is put into some tables; then the place of the message has to be right.
"""
import csv
import fractions
import gzip
import hashlib
import io
import os
import random
import re
import subprocess
import sys
import tempfile

TABLES = 400
ENDS = ["\n", "\r\n", "\r"]
PIECES = ["a", "B", "z", "7", "0", ".", "-", "_", "é", "ß", "日", "🍀", "'", "/", "no", "yes", " ", ",", ";", '"', "\t"]


def label(r, delimiter):
    """A text that may be an outcome: no outer blanks, no control character (but in a column that is no variable)."""
    text = "".join(r.choice(PIECES) for _ in range(r.choice([1, 2, 3, 5, 9, 17, 40]))).replace("\t", "").strip()
    return text if text and text != "NA" and not text.startswith("#") else "x" + delimiter.replace("\t", ",")


def labels(r, n, delimiter):
    found = []
    while len(found) < n:
        text = label(r, delimiter) + (str(len(found)) if r.random() < 0.5 else "")
        if text not in found:
            found.append(text)
    return found


class Writer:
    """Writes cells in varying dress and knows where each of them begins."""

    def __init__(self, r, delimiter, end):
        self.r, self.delimiter, self.end, self.text = r, delimiter, end, ""

    def place(self):
        lines = re.split("\r\n|\r|\n", self.text)
        return len(lines), len(lines[-1]) + 1

    def cell(self, text, blanks=True):
        must = any(c in text for c in self.delimiter + '"\r\n') or text != text.strip(" \t")
        if must or self.r.random() < 0.2:
            self.text += '"' + text.replace('"', '""') + '"'
        else:
            pad = " " if blanks and self.r.random() < 0.2 else ""
            self.text += pad + text + pad * self.r.randint(0, 2)

    def record(self, cells):
        places = []
        for i, text in enumerate(cells):
            if i:
                self.text += self.delimiter
            places.append(self.place())
            self.cell(text)
        self.text += self.end or self.r.choice(ENDS)
        return places


def weight(r):
    """A weight as text, in one of its dresses."""
    value = r.choice([str(r.randint(0, 5)), str(r.randint(0, 10**6)), "%.3f" % (r.random() * 10), repr(r.random() * 10 ** r.randint(-9, 14)),
                      "%.4e" % r.random(), "+1", "0", ".25", "7."])
    return value


class Codebook:
    """Further spellings of some variables' outcomes: none that is another outcome, none twice."""

    def __init__(self, r, domain):
        self.outcomes, self.lines = {}, [["variable", "outcome", "code", "note"]]
        for variable, outcomes in domain:
            for i in range(r.choice([0, 0, 1, 4])):
                code = r.choice([str(i), "code %d" % i, "", "NA", "é" * 12 + str(i)])
                if code in outcomes or (variable, code) in self.outcomes:
                    continue
                outcome = r.choice(outcomes)
                self.outcomes[variable, code] = outcome
                self.lines.append([variable, outcome, code, "-"])

    def codes(self, variable):
        return [code for name, code in self.outcomes if name == variable]


class Table:
    """One table, with what it is read by and what it holds."""

    def __init__(self, r):
        self.domain, self.delimiter, self.text, self.wrong, self.book, self.weighted = make_table(r)
        self.policy = r.choice(["drop", "family"])
        data = (b"\xef\xbb\xbf" if r.random() < 0.2 else b"") + self.text.encode()
        self.data = gzip.compress(data) if r.random() < 0.2 else data


def make_table(r):
    """A table's domain, delimiter and text, the place of a wrong label if there is one, its codebook, and whether it has weights."""
    delimiter = r.choice(",,,;\t|")
    n = r.choice([1, 2, 3, 6])
    names = labels(r, n, delimiter)
    domain = [(name, labels(r, r.choice([1, 2, 3, 9, 300]), delimiter)) for name in names]
    extras = ["extra %d" % i for i in range(r.choice([0, 0, 1, 3])) if "extra %d" % i not in names]
    book = Codebook(r, domain)
    weighted = r.random() < 0.4 and "the weight" not in names
    columns = names + extras + ["the weight"] * weighted
    r.shuffle(columns)
    w = Writer(r, delimiter, r.choice(ENDS + [None]))
    w.record(columns)
    outcomes = dict(domain)
    wrong = None
    records = r.choice([0, 1, 5, 60])
    wrong_record = r.randrange(records) if records and r.random() < 0.3 else None
    for i in range(records):
        cells = []
        for name in columns:
            if name == "the weight":
                cells.append(weight(r) if i else "1.5")
            elif name in outcomes:
                spelt = outcomes[name] + book.codes(name) * 3
                cells.append(r.choice(["", "NA"]) if r.random() < 0.05 else r.choice(spelt))
            else:
                cells.append("".join(r.choice(PIECES + ["\n", "\r\n", "\r"]) for _ in range(r.randint(0, 9))))
        if not any(cells) and (len(cells) > 1 or i + 1 == records):
            cells[columns.index(names[0])] = outcomes[names[0]][0]  # a blank line is no record at the end, and refused between records
        if i == wrong_record:
            cells[columns.index(names[0])] = "no such outcome"
        places = w.record(cells)
        if i == wrong_record:
            wrong = places[columns.index(names[0])]
    text = w.text
    if r.random() < 0.3:
        text = re.sub("(\r\n|\r|\n)$", "", text)
    elif r.random() < 0.3 and not (len(columns) == 1 and (columns[0], "") in book.outcomes):
        text += r.choice(ENDS) * 3
    return domain, delimiter, text, wrong, book, weighted


def rounded_weight(text):
    """In units of 2^-32: the double of the text, rounded half to even."""
    return round(fractions.Fraction(float(text)) * 2**32)


def expected_output(table, name):
    """What the driver has to print, with the cells as Python's csv reads them."""
    rows = list(csv.reader(io.StringIO(table.text, newline=""), delimiter=table.delimiter, strict=True))
    while rows and rows[-1] == []:
        rows.pop()
    header = [cell.strip(" \t") for cell in rows[0]]
    lines, missing, given, dropped, incomplete, place, total = [], [0] * len(table.domain), 0, 0, 0, 0, 0
    for row in rows[1:]:
        row = [cell.strip(" \t") for cell in row] or [""]
        codes = []
        for v, (variable, outcomes) in enumerate(table.domain):
            cell = row[header.index(variable)]
            cell = table.book.outcomes.get((variable, cell), cell)
            codes.append(outcomes.index(cell) if cell in outcomes else None)
            missing[v] += codes[-1] is None and cell in ("", "NA")
        parts = rounded_weight(row[header.index("the weight")]) if table.weighted else 2**32
        begin, place = place, place - -parts // 2**32
        if None in codes and table.policy == "drop":
            dropped += 1
            continue
        given += 1
        incomplete += None in codes
        total += parts
        lines.append(" ".join([str(begin)] + ["-" if c is None else str(c) for c in codes] + [str(parts)] * table.weighted))
    exact = fractions.Fraction(total, 2**32)
    lines.append("records %d dropped %d incomplete %d weight %s missing %s" % (given, dropped, incomplete, "%.17g" % float(exact),
                                                                              " ".join(map(str, missing))))
    lines.append("%s %d %s" % (name, len(table.data), hashlib.sha256(table.data).hexdigest()))
    return "\n".join(lines) + "\n"


def check(driver, folder, seed):
    """None when the driver and Python agree on the table of this seed, else what differs."""
    r = random.Random(seed)
    made = Table(r)
    wrong = made.wrong
    table, names, book = (os.path.join(folder, name) for name in ("table.csv", "domain.txt", "book.csv"))
    with open(table, "wb") as f:
        f.write(made.data)
    with open(names, "w", encoding="utf-8", newline="") as f:
        f.write("".join("\t".join([name] + outcomes) + "\n" for name, outcomes in made.domain))
    with open(book, "w", encoding="utf-8", newline="") as f:
        csv.writer(f).writerows(made.book.lines)
    words = ["--missing", made.policy, "--delimiter", made.delimiter, "--codebook", book] + ["--weight", "the weight"] * made.weighted
    done = subprocess.run([driver, names, table] + words, capture_output=True, timeout=60)
    output, messages = done.stdout.decode(), done.stderr.decode()
    os.unlink(table)  # some file systems write a file out at once when it takes another's place
    if wrong:
        at = "%s:%d:%d: " % (table, wrong[0], wrong[1])
        told = [line for line in messages.split("\n") if line.startswith(table) and "[unknown-label]" in line]
        if done.returncode != 1 or len(told) != 1 or not told[0].startswith(at):
            return "expected a wrong label at %s, got status %d: %s" % (at, done.returncode, messages)
        return None
    expected = expected_output(made, "table.csv")
    if done.returncode != 0 or output != expected:
        return "status %d\n%s\nexpected\n%s\ngot\n%s" % (done.returncode, messages, expected, output)
    return None


def main():
    driver = os.path.abspath(sys.argv[1])
    seeds = [int(sys.argv[2])] if len(sys.argv) > 2 else range(1, TABLES + 1)
    passed = failed = 0
    with tempfile.TemporaryDirectory() as folder:
        for seed in seeds:
            problem = check(driver, folder, seed)
            if problem is None:
                passed += 1
                continue
            failed += 1
            print("seed %d: %s" % (seed, problem[:2000]))
    print("%d passed, %d failed" % (passed, failed))
    return 1 if failed else 0


if __name__ == "__main__":
    sys.exit(main())
