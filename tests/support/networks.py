"""Networks and tables as files, for the outside checks."""
import csv
import itertools
from xml.sax.saxutils import escape


def write_network(path, outcomes, parents=None, tables=None, counts=None, row_ess=None, name="test"):
    """Writes an XMLBIF 0.3 file.

    outcomes  variable -> labels, in file order;  parents  variable -> its parents
    tables, counts  variable -> rows of numbers;  row_ess  variable -> one number, or one a row
    """
    lines = ['<BIF VERSION="0.3">', "<NETWORK>", "<NAME>%s</NAME>" % escape(name)]
    for variable, labels in outcomes.items():
        lines += ['<VARIABLE TYPE="nature">', "<NAME>%s</NAME>" % escape(variable)]
        lines += ["<OUTCOME>%s</OUTCOME>" % escape(label) for label in labels] + ["</VARIABLE>"]
    for variable in outcomes:
        lines += ["<DEFINITION>", "<FOR>%s</FOR>" % escape(variable)]
        lines += ["<GIVEN>%s</GIVEN>" % escape(parent) for parent in (parents or {}).get(variable, [])]
        if tables:
            lines.append("<TABLE>%s</TABLE>" % _numbers(tables[variable]))
        if counts:
            lines.append("<PROPERTY>ballast.counts = %s</PROPERTY>" % _numbers(counts[variable]))
        if row_ess and variable in row_ess:
            lines.append("<PROPERTY>ballast.row-ess = %s</PROPERTY>" % _numbers([row_ess[variable]]))
        lines.append("</DEFINITION>")
    with open(path, "w", encoding="utf-8") as file:
        file.write("\n".join(['<?xml version="1.0" encoding="UTF-8"?>'] + lines + ["</NETWORK>", "</BIF>", ""]))


def _numbers(rows):
    flat = itertools.chain.from_iterable(row if hasattr(row, "__iter__") else [row] for row in rows)
    return " ".join(repr(float(number)) for number in flat)


def write_records(path, header, records):
    with open(path, "w", encoding="utf-8", newline="") as file:
        csv.writer(file, lineterminator="\n").writerows([header, *records])


def expand(counts_file, path):
    """Writes the records that a table of counts stands for: its last column says how many there are of each line."""
    with open(counts_file, encoding="utf-8", newline="") as file:
        header, *lines = csv.reader(file)
    write_records(path, header[:-1], [line[:-1] for line in lines for _ in range(int(line[-1]))])
