"""The K-fold comparison with maximum likelihood, record by record."""
import itertools
import math

import numpy as np
from case_files import tally, where
from prior_model import scale, strengths, unit_pseudo_counts

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
    """Which chosen records maximum likelihood calls impossible, and which others meet a row without records."""
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
