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
    """Records as codes; -1 is a missing cell. Each record's place is kept when others are dropped.

    A line of whole weight w is w records, one behind the other; under fractional weights lines stay lines. Several paths are one table.
    policy: "drop" leaves incomplete records out, "family" keeps them. unrecorded: variables without a column.
    """

    def __init__(self, paths, network, missing=("", "NA"), policy="drop", weight=None, fold_column=None, unrecorded=()):
        self.paths = [paths] if isinstance(paths, str) else list(paths)
        self.path = self.paths[0]
        self.unrecorded = set(unrecorded)
        names = list(network.outcomes)
        self.ignored, codes, weights, labels = [], [], [], []
        for path in self.paths:
            with open(path, encoding="utf-8", newline="") as file:
                header, *lines = csv.reader(file)
            columns = {name: header.index(name) for name in names if name not in self.unrecorded}
            used = {weight, fold_column, *names}
            self.ignored += [name for name in header if name not in used and name not in self.ignored]
            codes += [[_code(network, name, line, columns, missing) for name in names] for line in lines]
            weights += [float(line[header.index(weight)]) if weight else 1.0 for line in lines]
            labels += [line[header.index(fold_column)] if fold_column else "" for line in lines]
        self._take(names, np.array(codes, dtype=np.int64).reshape(len(codes), len(names)), np.array(weights), labels, policy)

    def _take(self, names, codes, weights, labels, policy):
        self.missing = {name: int(n) for name, n in zip(names, (codes == -1).sum(axis=0)) if n}
        self.fractional = bool((weights != np.floor(weights)).any())
        times = np.ones(len(codes), dtype=int) if self.fractional else weights.astype(int)
        self.weights = np.round(weights * 2 ** 32) / 2 ** 32 if self.fractional else np.ones(times.sum())
        self.codes = np.repeat(codes, times, axis=0)
        self.labels = np.repeat(np.array(labels, dtype=object), times)
        self.places = np.arange(len(self.codes), dtype=np.uint64)
        whole = (self.codes != -1).all(axis=1)
        self.dropped = self.incomplete = 0
        if policy == "drop":
            self.dropped = int((~whole).sum())
            for key in ("codes", "labels", "places", "weights"):
                setattr(self, key, getattr(self, key)[whole])
        else:
            self.incomplete = int((~whole).sum())


def _code(network, name, line, columns, missing):
    """The code of a cell; -1 is missing, -2 of a variable that nobody recorded."""
    if name not in columns:
        return -2
    text, labels = line[columns[name]], network.outcomes[name]
    return -1 if text in missing and text not in labels else labels.index(text)


def touches(network, name, variables):
    """Whether a family holds one of the variables."""
    return name in variables or any(parent in variables for parent in network.parents[name])


def where(network, table):
    """For each family the row and the cell that each record falls in; -1 where a cell of the family is missing."""
    column = {name: table.codes[:, v] for v, name in enumerate(network.outcomes)}
    found = {}
    for name in network.outcomes:
        row = np.zeros(len(table.codes), dtype=np.int64)
        known = column[name] >= 0
        for parent in network.parents[name]:
            row = row * len(network.outcomes[parent]) + column[parent]
            known = known & (column[parent] >= 0)
        found[name] = (np.where(known, row, -1), np.where(known, column[name], -1))
    return found


def tally(network, places, chosen=None, weights=None):
    """Counts of the chosen records (a mask), or of all."""
    counts = {}
    for name, (row, outcome) in places.items():
        known = row >= 0 if chosen is None else (row >= 0) & chosen
        counts[name] = np.zeros(network.shape(name))
        np.add.at(counts[name], (row[known], outcome[known]), 1 if weights is None else weights[known])
    return counts
