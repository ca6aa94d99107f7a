"""Networks and tables as plain Python, read by the standard library's parsers, and counted."""
import csv
import itertools
import math
import xml.etree.ElementTree as ElementTree

import numpy as np


class Network:
    """An XMLBIF file as plain Python: families in the order of the VARIABLE elements."""

    def __init__(self, path):
        self.path = path
        root = ElementTree.parse(path).getroot().find("NETWORK")
        self.name = root.findtext("NAME").strip()
        self.outcomes = {v.findtext("NAME").strip(): [o.text.strip() for o in v.findall("OUTCOME")]
                         for v in root.findall("VARIABLE")}
        self.parents = {name: [] for name in self.outcomes}
        self.tables, self.counts, self.pseudo_counts, self.row_ess = {}, {}, {}, {}
        self.properties = dict(_parts_of(p.text) for p in root.findall("PROPERTY"))
        for definition in root.findall("DEFINITION"):
            self._read(definition)

    def _read(self, definition):
        name = definition.findtext("FOR").strip()
        self.parents[name] = [given.text.strip() for given in definition.findall("GIVEN")]
        shape = self.shape(name)
        if definition.find("TABLE") is not None:
            self.tables[name] = np.array(definition.findtext("TABLE").split(), dtype=float).reshape(shape)
        for text in definition.findall("PROPERTY"):
            key, value = _parts_of(text.text)
            if key == "ballast.counts":
                self.counts[name] = np.array(value.split(), dtype=float).reshape(shape)
            elif key == "ballast.pseudo-counts":
                self.pseudo_counts[name] = np.array(value.split(), dtype=float).reshape(shape)
            elif key == "ballast.row-ess":
                self.row_ess[name] = np.array(value.split(), dtype=float) * np.ones(shape[0])

    def shape(self, name):
        """Rows and outcomes of a family."""
        return (math.prod(len(self.outcomes[p]) for p in self.parents[name]), len(self.outcomes[name]))

    def given(self, name):
        """{parent: outcome} of each row, the first parent slowest."""
        parents = self.parents[name]
        return [dict(zip(parents, labels)) for labels in itertools.product(*(self.outcomes[p] for p in parents))]

    def facts(self):
        shapes = [self.shape(name) for name in self.outcomes]
        return {"name": self.name, "variables": len(self.outcomes), "arcs": sum(map(len, self.parents.values())),
                "cells": sum(q * r for q, r in shapes), "free_parameters": sum(q * (r - 1) for q, r in shapes)}


def _parts_of(text):
    """Key and value of a PROPERTY."""
    key, _, value = text.partition("=")
    return key.strip(), value.strip()


class Table:
    """Records as codes; -1 is a missing cell. Each record's place in the file is kept when others are dropped."""

    def __init__(self, path, network, missing=("", "NA")):
        self.path = path
        with open(path, encoding="utf-8", newline="") as file:
            header, *lines = csv.reader(file)
        columns = [header.index(name) for name in network.outcomes]
        codes = [{label: k for k, label in enumerate(labels)} for labels in network.outcomes.values()]
        for code, labels in zip(codes, network.outcomes.values()):
            code.update({text: -1 for text in missing if text not in labels})
        self.codes = np.array([[code[line[c]] for code, c in zip(codes, columns)] for line in lines],
                              dtype=np.int64).reshape(len(lines), len(columns))
        self.places = np.arange(len(lines), dtype=np.uint64)
        self.ignored = [name for name in header if name not in network.outcomes]
        self.missing = {name: int(n) for name, n in zip(network.outcomes, (self.codes < 0).sum(axis=0)) if n}
        whole = (self.codes >= 0).all(axis=1)
        self.dropped = int((~whole).sum())
        self.codes, self.places = self.codes[whole], self.places[whole]


def where(network, table):
    """For each family the row and the cell that each record falls in."""
    column = {name: table.codes[:, v] for v, name in enumerate(network.outcomes)}
    found = {}
    for name in network.outcomes:
        row = np.zeros(len(table.codes), dtype=np.int64)
        for parent in network.parents[name]:
            row = row * len(network.outcomes[parent]) + column[parent]
        found[name] = (row, column[name])
    return found


def tally(network, places, chosen=slice(None)):
    counts = {}
    for name, (row, outcome) in places.items():
        counts[name] = np.zeros(network.shape(name))
        np.add.at(counts[name], (row[chosen], outcome[chosen]), 1)
    return counts
