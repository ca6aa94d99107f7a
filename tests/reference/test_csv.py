#!/usr/bin/env python3
"""test_csv.py DRIVER [SEED]: tables in odd dress, read by Ballast and by Python's own csv module.

The referee is the module csv of Python's standard library (with hashlib for the digest): what it reads of a table has to be
what DRIVER (csv_driver.c) codes. A wrong label is put into some tables; then the place of the message has to be right.
"""
import csv
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


def make_table(r):
    """One table: its domain, its text, its delimiter, and the place of a wrong label if there is one."""
    delimiter = r.choice(",,,;\t|")
    n = r.choice([1, 2, 3, 6])
    names = labels(r, n, delimiter)
    domain = [(name, labels(r, r.choice([1, 2, 3, 9, 300]), delimiter)) for name in names]
    extras = ["extra %d" % i for i in range(r.choice([0, 0, 1, 3])) if "extra %d" % i not in names]
    columns = names + extras
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
            if name in outcomes:
                cells.append(r.choice(["", "NA"]) if r.random() < 0.05 else r.choice(outcomes[name]))
            else:
                cells.append("".join(r.choice(PIECES + ["\n", "\r\n", "\r"]) for _ in range(r.randint(0, 9))))
        if len(cells) > 1 and not any(cells):
            cells[0] = "NA"
        if i == wrong_record:
            cells[columns.index(names[0])] = "no such outcome"
        places = w.record(cells)
        if i == wrong_record:
            wrong = places[columns.index(names[0])]
    text = w.text
    if r.random() < 0.3:
        text = re.sub("(\r\n|\r|\n)$", "", text)
    elif r.random() < 0.3:
        text += r.choice(ENDS) * 3
    return domain, delimiter, text, wrong


def expected_output(domain, delimiter, text, name, data):
    """What the driver has to print, with the cells as Python's csv reads them."""
    rows = list(csv.reader(io.StringIO(text, newline=""), delimiter=delimiter, strict=True))
    while rows and rows[-1] == []:
        rows.pop()
    header = [cell.strip(" \t") for cell in rows[0]]
    lines, missing, given, dropped = [], [0] * len(domain), 0, 0
    for place, row in enumerate(rows[1:]):
        row = [cell.strip(" \t") for cell in row] or [""]
        codes = []
        for v, (variable, outcomes) in enumerate(domain):
            cell = row[header.index(variable)]
            codes.append(outcomes.index(cell) if cell in outcomes else None)
            missing[v] += codes[-1] is None and cell in ("", "NA")
        if None in codes:
            dropped += 1
            continue
        given += 1
        lines.append(" ".join([str(place)] + [str(c) for c in codes]))
    lines.append("records %d dropped %d missing %s" % (given, dropped, " ".join(map(str, missing))))
    lines.append("%s %d %s" % (name, len(data), hashlib.sha256(data).hexdigest()))
    return "\n".join(lines) + "\n"


def check(driver, folder, seed):
    """None when the driver and Python agree on the table of this seed, else what differs."""
    r = random.Random(seed)
    domain, delimiter, text, wrong = make_table(r)
    data = (b"\xef\xbb\xbf" if r.random() < 0.2 else b"") + text.encode()
    table, names = os.path.join(folder, "table.csv"), os.path.join(folder, "domain.txt")
    with open(table, "wb") as f:
        f.write(data)
    with open(names, "w", encoding="utf-8", newline="") as f:
        f.write("".join("\t".join([name] + outcomes) + "\n" for name, outcomes in domain))
    done = subprocess.run([driver, names, table, "--missing", "drop", "--delimiter", delimiter], capture_output=True, timeout=60)
    output, messages = done.stdout.decode(), done.stderr.decode()
    os.unlink(table)  # some file systems write a file out at once when it takes another's place
    if wrong:
        at = "%s:%d:%d: " % (table, wrong[0], wrong[1])
        told = [line for line in messages.split("\n") if line.startswith(table) and "[unknown-label]" in line]
        if done.returncode != 1 or len(told) != 1 or not told[0].startswith(at):
            return "expected a wrong label at %s, got status %d: %s" % (at, done.returncode, messages)
        return None
    expected = expected_output(domain, delimiter, text, "table.csv", data)
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
