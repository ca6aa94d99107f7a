"""The held-out comparison with maximum likelihood, record by record: folds, a fold column, a random share, a table of its own."""
import itertools
import math
from fractions import Fraction

import numpy as np
from case_files import tally, touches, where
from prior_model import scale, strengths, unit_pseudo_counts

G, M64 = 0x9E3779B97F4A7C15, (1 << 64) - 1


def _mix(z):
    """The finaliser of SplitMix64: Steele, Lea & Flood 2014."""
    z = ((z ^ (z >> 30)) * 0xBF58476D1CE4E5B9) & M64
    z = ((z ^ (z >> 27)) * 0x94D049BB133111EB) & M64
    return z ^ (z >> 31)


def splitmix64(s, i):
    return _mix((_mix((s + G) & M64) + (i + 1) * G) & M64)


def folds_of(places, n_folds, seed, repeat=0):
    """The fold of each record by its place: a shuffle in every run of n_folds records."""
    key = splitmix64(splitmix64(seed, 1), repeat)
    shuffles = {}
    for run in {int(i) // n_folds for i in places}:
        p = list(range(n_folds))
        for t in range(n_folds - 1, 0, -1):
            other = splitmix64(key, run * n_folds + t) % (t + 1)
            p[t], p[other] = p[other], p[t]
        shuffles[run] = p
    return np.array([shuffles[int(i) // n_folds][int(i) % n_folds] for i in places])


def held_out(places, share, seed, repeat=0):
    """Whether each record is held out: splitmix64(key, i) < F 2^64, without rounding."""
    key, bound = splitmix64(splitmix64(seed, 2), repeat), Fraction(share) * 2 ** 64
    return np.array([splitmix64(key, int(i)) < bound for i in places], dtype=bool)


def parts_of(split, table):
    """For each repeat the masks of records that are predicted together. split: {"method", "folds", "share", "seed", "repeats"}."""
    method, seed = split["method"], split.get("seed", 1)
    for repeat in range(split.get("repeats", 1)):
        if method == "folds":
            fold = folds_of(table.places, split["folds"], seed, repeat)
            yield [fold == k for k in range(split["folds"])]
        elif method == "fold-column":
            yield [table.labels == label for label in dict.fromkeys(table.labels)]
        elif method == "holdout":
            yield [held_out(table.places, split["share"], seed, repeat)]
        else:
            yield [np.ones(len(table.codes), dtype=bool)]


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
    """Which chosen records maximum likelihood calls impossible, and which others meet a row without records."""
    impossible, empty = np.zeros(chosen.sum(), dtype=bool), np.zeros(chosen.sum(), dtype=bool)
    for name, (row, outcome) in places.items():
        n, total = counts[name][row[chosen], outcome[chosen]], counts[name].sum(axis=1)[row[chosen]]
        impossible |= (n == 0) & (total > 0)
        empty |= total == 0
    return impossible, empty & ~impossible


class HeldOut:
    """Scores per record. Where a part's strength may round two ways, both are kept until the program has been heard.

    table    whose records are held out
    counts   of all training records, where the table is one of its own; else the earlier ones, which are in every training part
    """

    def __init__(self, network, table, prior, split, counts=None):
        self.split = split
        places = where(network, table)
        recorded = [name for name in network.outcomes if not touches(network, name, table.unrecorded)]
        complete = np.all([places[name][0] >= 0 for name in recorded], axis=0) if recorded else np.ones(len(table.codes), dtype=bool)
        unit = unit_pseudo_counts(network, prior)
        zeros = {name: np.zeros(network.shape(name)) for name in network.outcomes}
        base = counts or zeros
        if split["method"] != "test":
            everything = tally(network, places)
            base = {name: base[name] + everything[name] for name in base}
        self.parts, self.incomplete = [], 0
        for masks in parts_of(split, table):
            for mask in masks:
                out = zeros if split["method"] == "test" else tally(network, places, mask)
                training = {name: base[name] - out[name] for name in base}
                chosen = mask & complete
                self.incomplete += int((mask & ~complete).sum())
                if not chosen.any():
                    continue
                options = [prior["strength"]] if "strength" in prior else strengths(unit, training, prior["by"])
                scored = {name: places[name] for name in recorded}
                self.parts.append([self._part(unit, s, training, scored, chosen) for s in options])

    @staticmethod
    def _part(unit, strength, training, places, chosen):
        alpha = scale(unit, strength)
        part = {"record": np.flatnonzero(chosen), "strength": np.full(chosen.sum(), strength)}
        part["bayes"], part["bayes_quadratic"] = predict(means(alpha, training), places, chosen)
        part["prior"], _ = predict(means(alpha), places, chosen)
        part["ml"], part["ml_quadratic"] = predict(raw_frequencies(training), places, chosen)
        part["impossible"], part["undefined"] = judge_ml(training, places, chosen)
        return part

    def nearest(self, total, most=4096):
        """The choice of roundings whose total log-likelihood is nearest to this one: the expected JSON."""
        sums = [[_sum(option["bayes"]) for option in part] for part in self.parts]
        if math.prod(map(len, sums)) > most:
            raise ArithmeticError("too many parts whose strength may round two ways")
        picks = itertools.product(*(range(len(s)) for s in sums))
        if total is None:
            best = next(picks)
        else:
            repeats = self.split.get("repeats", 1)
            best = min(picks, key=lambda pick: abs(sum(s[i] for s, i in zip(sums, pick)) - total * repeats))
        return self._json([part[i] for part, i in zip(self.parts, best)])

    def _json(self, parts):
        keys = ("record", "strength", "bayes", "prior", "ml", "bayes_quadratic", "ml_quadratic", "impossible", "undefined")
        joined = {key: np.concatenate([part[key] for part in parts]) if parts else np.zeros(0) for key in keys}
        repeats = self.split.get("repeats", 1)
        hit, empty = joined["impossible"].astype(bool), joined["undefined"].astype(bool)
        seen = ~(hit | empty)
        bayes, ml, n = joined["bayes"], joined["ml"], len(joined["bayes"])
        others = int((~seen).sum())
        total = _sum(bayes)
        prior_total = _sum(joined["prior"])
        break_even = (total - _sum(ml[seen])) / others if others else None
        method = self.split["method"]
        strength = {"least": joined["strength"].min(), "largest": joined["strength"].max()} if n else {"least": None, "largest": None}
        folds = self.split["folds"] if method == "folds" else self.split["labels"] if method == "fold-column" else None
        return {"method": method, "folds": folds, "repeats": repeats, "records": n / repeats, "incomplete": self.incomplete / repeats,
                "bayes": {"log_likelihood": _finite(total / repeats), "per_record": _finite(total / n if n else None),
                          "impossible": int(np.isinf(bayes).sum()) / repeats},
                "ml": {"log_likelihood": None if others else _sum(ml) / repeats, "impossible": int(hit.sum()) / repeats,
                       "undefined": int(empty.sum()) / repeats},
                "prior_only": {"log_likelihood": _finite(prior_total / repeats), "per_record": _finite(prior_total / n if n else None)},
                "comparable": dict(records=int(seen.sum()) / repeats, **_paired(bayes[seen], ml[seen], joined["record"][seen])),
                "others": {"records": others / repeats, "bayes": _finite(_sum(bayes[~seen]) / others if others else None),
                           "break_even": _finite(break_even)},
                "quadratic": _paired(joined["bayes_quadratic"], joined["ml_quadratic"], joined["record"]), "strength": strength}


def _sum(x):
    return -math.inf if np.isinf(x).any() else math.fsum(x)


def _finite(x):
    return None if x is None or math.isinf(x) else x


def _paired(bayes, ml, record):
    """Means over everything that was scored; the standard error is that of the means of each record's differences."""
    n = len(bayes)
    if n == 0:
        return {"bayes": None, "ml": None, "mean_difference": None, "standard_error": None}
    difference = bayes - ml
    own = np.array([math.fsum(difference[record == i]) / (record == i).sum() for i in sorted(set(record))])
    middle = math.fsum(own) / len(own)
    error = math.sqrt(math.fsum((own - middle) ** 2) / (len(own) - 1) / len(own)) if len(own) > 1 else None
    return {"bayes": math.fsum(bayes) / n, "ml": math.fsum(ml) / n, "mean_difference": math.fsum(difference) / n, "standard_error": error}
