"""A second computation of every number that `ballast fit` and `ballast check` give as JSON.

It is written from the formulas, not from the program: log-Pochhammer symbols are products of one-step predictions, means are
fractions, strengths are roots of the score's derivative, quantiles are judged by scipy's and, where that is weak, by the many digits of
exact.py. Sources stand beside the formulas.
"""
import csv
import hashlib
import itertools
import math
import os
import xml.etree.ElementTree as ElementTree
from fractions import Fraction

import numpy as np
from exact import tails
from mpmath import mpf
from scipy import optimize, special

PRIORS = ["bdeu", "k2", "jeffreys", "expert"]


# ---------------------------------------------------------------- files

class Network:
    """An XMLBIF file as plain Python: families in the order of the VARIABLE elements."""

    def __init__(self, path):
        self.path = path
        root = ElementTree.parse(path).getroot().find("NETWORK")
        self.name = root.findtext("NAME").strip()
        self.outcomes = {v.findtext("NAME").strip(): [o.text.strip() for o in v.findall("OUTCOME")]
                         for v in root.findall("VARIABLE")}
        self.parents = {name: [] for name in self.outcomes}
        self.tables, self.counts, self.row_ess = {}, {}, {}
        self.fitted = False
        for definition in root.findall("DEFINITION"):
            self._read(definition)

    def _read(self, definition):
        name = definition.findtext("FOR").strip()
        self.parents[name] = [given.text.strip() for given in definition.findall("GIVEN")]
        shape = self.shape(name)
        if definition.find("TABLE") is not None:
            self.tables[name] = np.array(definition.findtext("TABLE").split(), dtype=float).reshape(shape)
        for text in definition.findall("PROPERTY"):
            key, value = (part.strip() for part in text.text.split("=", 1))
            if key == "ballast.counts":
                self.counts[name] = np.array(value.split(), dtype=float).reshape(shape)
            elif key == "ballast.row-ess":
                self.row_ess[name] = np.array(value.split(), dtype=float) * np.ones(shape[0])
            elif key == "ballast.pseudo-counts":
                self.fitted = True

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


# ---------------------------------------------------------------- priors and their strength

def unit_pseudo_counts(network, prior):
    """Pseudo-counts at strength 1. prior: {"kind", "row_ess", "floor"}."""
    unit = {}
    for name in network.outcomes:
        q, r = network.shape(name)
        if prior["kind"] == "bdeu":          # Buntine 1991; Heckerman, Geiger & Chickering 1995
            unit[name] = np.full((q, r), 1 / (q * r))
        elif prior["kind"] == "k2":          # Cooper & Herskovits 1992
            unit[name] = np.ones((q, r))
        elif prior["kind"] == "jeffreys":    # Jeffreys 1946
            unit[name] = np.full((q, r), 0.5)
        else:
            theta = network.tables[name] / network.tables[name].sum(axis=1, keepdims=True)
            theta = (1 - prior.get("floor", 0)) * theta + prior.get("floor", 0) / r
            worth = prior.get("row_ess") or network.row_ess[name]
            unit[name] = theta * np.broadcast_to(worth, q).reshape(q, 1)
    return unit


def scale(unit, strength):
    return {name: strength * alpha for name, alpha in unit.items()}


class Profile:
    """A score of counts as a function of ln strength, with its derivative, over all cells that matter."""

    def __init__(self, unit, counts, by):
        cells = np.concatenate([np.column_stack([unit[f].ravel(), counts[f].ravel()]) for f in unit])
        rows = np.concatenate([np.column_stack([unit[f].sum(axis=1), counts[f].sum(axis=1)]) for f in unit])
        self.cells, self.cell_times = _distinct(cells)
        self.rows, self.row_times = _distinct(rows)
        self.by = by

    def value(self, log_strength):
        """At one ln strength, or at several."""
        s = np.exp(np.asarray(log_strength, dtype=float))[..., None]
        return self._sum(self.cells, self.cell_times, s) - self._sum(self.rows, self.row_times, s)

    def _sum(self, pairs, times, s):
        alpha, n = s * pairs[:, 0], pairs[:, 1]
        if self.by == "marginal-likelihood":
            return (log_pochhammer(alpha, n) * times).sum(axis=-1)
        return (n * np.log(alpha + (n - 1)) * times).sum(axis=-1)

    def slope(self, log_strength):
        """d value / d ln strength."""
        s = math.exp(log_strength)
        return s * (self._slope(self.cells, self.cell_times, s) - self._slope(self.rows, self.row_times, s))

    def _slope(self, pairs, times, s):
        alpha, n = s * pairs[:, 0], pairs[:, 1]
        if self.by == "marginal-likelihood":
            return (pairs[:, 0] * (special.digamma(alpha + n) - special.digamma(alpha)) * times).sum()
        return (n * pairs[:, 0] / (alpha + (n - 1)) * times).sum()

    def best(self):
        """ln of the best strength between 0.01 and 10000: the best point of 61, then the peak beside it. None if all are as good."""
        grid = np.linspace(math.log(0.01), math.log(10000), 61)
        values = self.value(grid)
        if np.ptp(values) <= 1e-10 * max(1, abs(values[0])):
            return None
        i = int(np.argmax(values))
        low, high = grid[max(i - 1, 0)], grid[min(i + 1, 60)]
        if self.slope(low) > 0 > self.slope(high):
            return optimize.brentq(self.slope, low, high, xtol=1e-13)
        if i == 0 and self.slope(low) <= 0:
            return low
        if i == 60 and self.slope(high) >= 0:
            return high
        fine = np.linspace(low, high, 20001)
        return fine[int(np.argmax(self.value(fine)))]


def log_pochhammer(alpha, n):
    """ln of alpha (alpha + 1) ... (alpha + n - 1). The difference of log-gammas loses digits for large alpha, where a product of few
    factors does not."""
    few = 16
    value = special.gammaln(alpha + n) - special.gammaln(alpha)
    product = np.prod([np.where(i < n, alpha + i, 1.0) for i in range(few)], axis=0)
    return np.where(n <= few, np.log(product), value)


def _distinct(pairs):
    """Distinct (alpha, n) with n > 0, and how often each stands there."""
    pairs = pairs[pairs[:, 1] > 0]
    return np.unique(pairs, axis=0, return_counts=True)


def strengths(unit, counts, by, slack=1e-4):
    """The roundings to three digits that a search to 1e-4 in ln strength may give; 1 where the score is the same everywhere, as it is
    without records or with a single one."""
    best = Profile(unit, counts, by).best()
    if best is None:
        return [1.0]
    return sorted({float("%.3g" % math.exp(x)) for x in (best - slack, best, best + slack)
                   if math.log(0.01) - slack <= x <= math.log(10000) + slack})


# ---------------------------------------------------------------- scores from counts

def log_marginal_likelihood(alpha, counts):
    """One family's: the product of one-step predictions, in any order (Dawid 1984), which is the formula of Cooper &
    Herskovits 1992 and Heckerman et al. 1995 without a gamma function."""
    rows = zip(np.append(alpha.ravel(), alpha.sum(axis=1)), np.append(counts.ravel(), counts.sum(axis=1)))
    sign = [1.0] * alpha.size + [-1.0] * len(alpha)
    return math.fsum(s * math.fsum(np.log(a + np.arange(int(n)))) for s, (a, n) in zip(sign, rows) if n > 0)


def leave_one_out(alpha, counts):
    """Every record predicted from all the others (Geisser 1975); a sum over families."""
    terms = []
    for name, n in counts.items():
        rest = alpha[name].sum(axis=1, keepdims=True) + (n.sum(axis=1, keepdims=True) - 1)
        own = alpha[name] + (n - 1)
        hit = n > 0
        terms.extend(n[hit] * np.log(own[hit] / np.broadcast_to(rest, n.shape)[hit]))
    return math.fsum(terms)


def has_zero_clash(alpha, counts):
    """A record in a structural zero."""
    return any(((alpha[name] == 0) & (counts[name] > 0)).any() for name in counts)


# ---------------------------------------------------------------- held-out

G, M64 = 0x9E3779B97F4A7C15, (1 << 64) - 1


def _mix(z):
    """The finaliser of SplitMix64: Steele, Lea & Flood 2014."""
    z = ((z ^ (z >> 30)) * 0xBF58476D1CE4E5B9) & M64
    z = ((z ^ (z >> 27)) * 0x94D049BB133111EB) & M64
    return z ^ (z >> 31)


def splitmix64(s, i):
    return _mix((_mix((s + G) & M64) + (i + 1) * G) & M64)


def folds_of(places, n_folds, seed):
    """The fold of each record by its place: a shuffle in every run of n_folds records."""
    key = splitmix64(splitmix64(seed, 1), 0)
    shuffles = {}
    for run in {int(i) // n_folds for i in places}:
        p = list(range(n_folds))
        for t in range(n_folds - 1, 0, -1):
            other = splitmix64(key, run * n_folds + t) % (t + 1)
            p[t], p[other] = p[other], p[t]
        shuffles[run] = p
    return np.array([shuffles[int(i) // n_folds][int(i) % n_folds] for i in places])


def predict(tables, places, chosen):
    """Log-likelihood and quadratic score (Brier 1950) of the chosen records, summed over families."""
    log_likelihood, quadratic = np.zeros(chosen.sum()), np.zeros(chosen.sum())
    with np.errstate(divide="ignore"):
        for name, (row, outcome) in places.items():
            p = tables[name][row[chosen]]
            own = p[np.arange(len(p)), outcome[chosen]]
            log_likelihood += np.log(own)
            quadratic += (p ** 2).sum(axis=1) - own ** 2 + (1 - own) ** 2
    return log_likelihood, quadratic


def means(alpha, counts=None):
    tables = {}
    for name, a in alpha.items():
        post = a if counts is None else a + counts[name]
        tables[name] = post / post.sum(axis=1, keepdims=True)
    return tables


def raw_frequencies(counts):
    """Rows without records uniform."""
    tables = {}
    for name, n in counts.items():
        total = n.sum(axis=1, keepdims=True)
        tables[name] = np.where(total > 0, n / np.maximum(total, 1), 1 / n.shape[1])
    return tables


def judge_ml(counts, places, chosen):
    """Which chosen records maximum likelihood calls impossible, and which meet a row without records (and are not impossible)."""
    impossible, empty = np.zeros(chosen.sum(), dtype=bool), np.zeros(chosen.sum(), dtype=bool)
    for name, (row, outcome) in places.items():
        n, total = counts[name][row[chosen], outcome[chosen]], counts[name].sum(axis=1)[row[chosen]]
        impossible |= (n == 0) & (total > 0)
        empty |= total == 0
    return impossible, empty & ~impossible


class HeldOut:
    """K-fold scores per record. Where a fold's strength may round two ways, both are kept until the program has been heard."""

    def __init__(self, network, table, prior, n_folds, seed):
        self.folds, self.n = n_folds, len(table.codes)
        places = where(network, table)
        fold = folds_of(table.places, n_folds, seed)
        unit = unit_pseudo_counts(network, prior)
        everything = tally(network, places)
        self.parts = []
        for k in sorted(set(fold)):
            chosen = fold == k
            out = tally(network, places, chosen)
            training = {name: everything[name] - out[name] for name in out}
            options = [prior["strength"]] if "strength" in prior else strengths(unit, training, prior["by"])
            self.parts.append([self._part(unit, s, training, places, chosen) for s in options])

    @staticmethod
    def _part(unit, strength, training, places, chosen):
        alpha = scale(unit, strength)
        part = {}
        part["bayes"], part["bayes_quadratic"] = predict(means(alpha, training), places, chosen)
        part["prior"], _ = predict(means(alpha), places, chosen)
        part["ml"], part["ml_quadratic"] = predict(raw_frequencies(training), places, chosen)
        part["impossible"], part["undefined"] = judge_ml(training, places, chosen)
        return part

    def nearest(self, total, most=4096):
        """The choice of roundings whose total log-likelihood is nearest to this one: the expected JSON."""
        sums = [[math.fsum(option["bayes"]) for option in part] for part in self.parts]
        if math.prod(map(len, sums)) > most:
            raise ArithmeticError("too many folds whose strength may round two ways")
        best = min(itertools.product(*(range(len(s)) for s in sums)),
                   key=lambda pick: abs(math.fsum(s[i] for s, i in zip(sums, pick)) - total))
        return self._json([part[i] for part, i in zip(self.parts, best)])

    def _json(self, parts):
        joined = {key: np.concatenate([part[key] for part in parts]) for key in parts[0]}
        seen = ~(joined["impossible"] | joined["undefined"])
        impossible, undefined, comparable = (int(joined["impossible"].sum()), int(joined["undefined"].sum()), int(seen.sum()))
        bayes, ml = joined["bayes"], joined["ml"]
        others = self.n - comparable
        on_seen = _paired(bayes[seen], ml[seen])
        total = math.fsum(bayes)
        break_even = (total - math.fsum(ml[seen])) / others if others else None
        ml_total = None if others else math.fsum(ml)
        return {"method": "folds", "folds": self.folds, "repeats": 1, "records": self.n, "incomplete": 0,
                "bayes": {"log_likelihood": total, "per_record": total / self.n, "impossible": 0},
                "ml": {"log_likelihood": ml_total, "impossible": impossible, "undefined": undefined},
                "prior_only": {"log_likelihood": math.fsum(joined["prior"]), "per_record": math.fsum(joined["prior"]) / self.n},
                "comparable": dict(records=comparable, **on_seen),
                "others": {"records": others, "bayes": math.fsum(bayes[~seen]) / others if others else None,
                           "break_even": break_even},
                "quadratic": _paired(joined["bayes_quadratic"], joined["ml_quadratic"])}


def _paired(bayes, ml):
    """Means per record, and the paired difference with its standard error."""
    n = len(bayes)
    if n == 0:
        return {"bayes": None, "ml": None, "mean_difference": None, "standard_error": None}
    difference = bayes - ml
    mean = math.fsum(difference) / n
    error = math.sqrt(math.fsum((difference - mean) ** 2) / (n - 1) / n) if n > 1 else None
    return {"bayes": math.fsum(bayes) / n, "ml": math.fsum(ml) / n, "mean_difference": mean, "standard_error": error}


# ---------------------------------------------------------------- intervals

class Quantile:
    """The p quantile of Beta(a, b), which judges a number rather than giving one."""

    known = {}

    def __init__(self, a, b, p):
        self.key = (float(a), float(b), float(p))

    def agrees(self, x, relative=1e-9):
        judged = (self.key, x)
        if judged not in self.known:
            self.known[judged] = self._agrees(x, relative)
        return self.known[judged]

    def _agrees(self, x, relative):
        a, b, p = self.key
        if not isinstance(x, (int, float)) or not 0 <= x <= 1:
            return False
        with np.errstate(all="ignore"):
            guess = special.betaincinv(a, b, p)
        if guess > 0 and abs(x - guess) <= relative * guess:
            return True
        return _below(a, b, mpf(x) * (1 - mpf(relative)) - mpf(5e-324), p) and _above(a, b, mpf(x) * (1 + mpf(relative)) + mpf(5e-324), p)

    def __repr__(self):
        return "the %.17g quantile of Beta(%.17g, %.17g)" % (self.key[2], self.key[0], self.key[1])


def _below(a, b, x, p):
    return x <= 0 or tails(a, b, x, 1 - x)[0] <= p


def _above(a, b, x, p):
    return x >= 1 or tails(a, b, x, 1 - x)[0] >= p


# ---------------------------------------------------------------- the JSON that is wanted

def file_facts(path):
    with open(path, "rb") as file:
        content = file.read()
    return {"file": os.path.basename(path), "bytes": len(content), "sha256": hashlib.sha256(content).hexdigest()}


def head(command, network, table, records):
    inputs = [file_facts(network.path)] + ([file_facts(table.path)] if table else [])
    missing = [{"variable": name, "records": n} for name, n in table.missing.items()] if table else []
    return {"ballast": {"schema": 1, "command": command}, "inputs": inputs, "network": network.facts(),
            "data": {"records": records, "weight": records, "dropped": table.dropped if table else 0,
                     "ignored_columns": table.ignored if table else [], "missing": missing}}


def basis(records):
    return "prior" if records == 0 else "few" if records <= 4 else "data"


def expected_row(alpha, counts, level, given):
    total, weight = counts.sum(), math.fsum(alpha)
    post = [Fraction(a) + Fraction(n) for a, n in zip(alpha, counts)]
    row = {"given": given, "total": total, "basis": basis(total), "counts": list(counts), "pseudo_counts": list(alpha),
           "mean": [float(p / sum(post)) for p in post], "ml": [n / total for n in counts] if total else None,
           "low": [], "high": [], "data_share": total / (weight + total)}
    for own in post:
        a, b = float(own), float(sum(post) - own)
        for key, p in (("low", (1 - level) / 2), ("high", (1 + level) / 2)):
            row[key].append(None if a == 0 else 1.0 if b == 0 else Quantile(a, b, p))
    return row


def expected_families(network, alpha, counts, level):
    return [{"variable": name, "parents": network.parents[name], "outcomes": network.outcomes[name],
             "log_marginal_likelihood": log_marginal_likelihood(alpha[name], counts[name]),
             "rows": [expected_row(a, n, level, given)
                      for a, n, given in zip(alpha[name], counts[name], network.given(name))]} for name in network.outcomes]


def expected_others(network, counts, used, got):
    """Leave-one-out of the other priors; the program's ESS of BDeu is taken once it has been found among the roundings."""
    records = next(iter(counts.values())).sum()
    listed = []
    for kind in PRIORS:
        usable = kind != "expert" or (network.row_ess.keys() == network.outcomes.keys() == network.tables.keys()
                                      and not network.fitted)
        if kind == used or not usable:
            continue
        unit = unit_pseudo_counts(network, {"kind": kind})
        if has_zero_clash(unit, counts):
            continue
        ess = None
        if kind == "bdeu":
            ess = pick(next((o["ess"] for o in got if o["kind"] == "bdeu"), None),
                       strengths(unit, counts, "marginal-likelihood"))
        listed.append({"kind": kind, "ess": ess,
                       "loo_per_record": leave_one_out(scale(unit, ess or 1), counts) / records if records else None})
    return listed


def pick(got, allowed):
    return got if got in allowed else allowed[len(allowed) // 2]


def expected_fit(network, table, prior, got, level=0.95, folds=10, seed=1, counts=None):
    """The JSON of `fit`. prior: {"kind", "strength" or "by", "row_ess", "floor"}; got: the program's, read only to settle
    a rounding that may fall either way."""
    if counts is None:
        counts = tally(network, where(network, table))
    unit = unit_pseudo_counts(network, prior)
    ess_kind = prior["kind"] == "bdeu"
    strength = prior.get("strength")
    if strength is None:
        strength = pick(got["prior"]["ess" if ess_kind else "scale"], strengths(unit, counts, prior["by"]))
    alpha = scale(unit, strength)
    records = next(iter(counts.values())).sum()
    families = expected_families(network, alpha, counts, level)
    loo = leave_one_out(alpha, counts)
    heldout = None
    if table and folds and records:
        heldout = HeldOut(network, table, prior, folds, seed).nearest(got["heldout"]["bayes"]["log_likelihood"])
    chosen = prior.get("by", "given")
    return dict(head("fit", network, table, records),
                prior={"kind": prior["kind"], "ess": strength if ess_kind else None, "ess_chosen": chosen if ess_kind else None,
                       "strength": None, "lean": None, "scale": None if ess_kind else strength,
                       "scale_chosen": None if ess_kind else chosen, "row_ess": prior.get("row_ess"),
                       "floor": prior.get("floor", 0) if prior["kind"] == "expert" else None},
                level=level,
                log_marginal_likelihood=math.fsum(f["log_marginal_likelihood"] for f in families), log_predictive=None,
                loo={"log_likelihood": loo, "per_record": loo / records if records else None},
                other_priors=expected_others(network, counts, prior["kind"], got["other_priors"]),
                heldout=heldout, families=families)


def expected_check(network, table, counts=None):
    """The JSON of `check`: shares of records alone in a row (cell) of some family estimate the missing mass (Good 1953)."""
    if counts is None:
        counts = tally(network, where(network, table))
    records = next(iter(counts.values())).sum()
    alone = {"row_share": {}, "cell_share": {}}
    for name, (row, outcome) in (where(network, table).items() if table else ()):
        alone["row_share"][name] = counts[name].sum(axis=1)[row] == 1
        alone["cell_share"][name] = counts[name][row, outcome] == 1
    share = {key: _share(np.any(list(hit.values()), axis=0)) if hit else None for key, hit in alone.items()}
    share["families"] = [{"variable": name, **{key: _share(hit[name]) if hit else None for key, hit in alone.items()}}
                         for name in network.outcomes]
    rows = {wanted: [{"variable": name, "given": given, "total": n.sum()} for name in network.outcomes
                     for n, given in zip(counts[name], network.given(name)) if basis(n.sum()) == wanted]
            for wanted in ("prior", "few")}
    return dict(head("check", network, table, records), unsupported=share, rows_without_records=rows["prior"],
                rows_with_few=rows["few"], records_per_parameter=records / network.facts()["free_parameters"])


def _share(hits):
    return float(hits.mean()) if len(hits) else None
