"""A second computation of every number that `ballast fit` and `ballast check` give as JSON.

It is written from the formulas, not from the program: log-Pochhammer symbols are products of one-step predictions, means are
fractions, strengths are roots of the score's derivative, quantiles are judged by scipy's and, where that is weak, by the many
digits of exact.py. Sources stand beside the formulas.
"""
import hashlib
import math
import os
from fractions import Fraction

import numpy as np
from case_files import tally, where
from exact import tails
from heldout_model import HeldOut
from mpmath import loggamma, mpf, workdps
from prior_model import scale, strengths, unit_pseudo_counts
from scipy import special

PRIORS = ["bdeu", "k2", "jeffreys", "expert"]


# ---------------------------------------------------------------- scores from counts

def log_marginal_likelihood(alpha, counts):
    """One family's: the product of one-step predictions, in any order (Dawid 1984), which is the formula of Cooper &
    Herskovits 1992 and Heckerman et al. 1995 without a gamma function."""
    rows = zip(np.append(alpha.ravel(), alpha.sum(axis=1)), np.append(counts.ravel(), counts.sum(axis=1)))
    sign = [1.0] * alpha.size + [-1.0] * len(alpha)
    return math.fsum(s * log_rising(a, n) for s, (a, n) in zip(sign, rows) if n > 0)


def log_rising(a, n):
    """ln of the rising factorial; a fraction of a record takes mpmath's gamma function."""
    if n == int(n):
        return math.fsum(np.log(a + np.arange(int(n))))
    with workdps(40):
        return float(loggamma(mpf(a) + mpf(n)) - loggamma(mpf(a)))


def is_whole(counts):
    return all((n == np.floor(n)).all() for n in counts.values())


def leave_one_out(alpha, counts):
    """Every record predicted from all the others (Geisser 1975); a sum over families. None when some count is not whole."""
    if not is_whole(counts):
        return None
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
        width = mpf(x) * mpf(relative) + mpf(5e-324)
        return _below(a, b, mpf(x) - width, p) and _above(a, b, mpf(x) + width, p)

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


def head(command, network, table, records, test=None):
    paths = [network.path] + (table.paths if table else []) + (test.paths if test else [])
    weight = math.fsum(table.weights) if table else records
    missing = [{"variable": name, "records": n} for name, n in table.missing.items()] if table else []
    return {"ballast": {"schema": 1, "command": command}, "inputs": [file_facts(path) for path in paths], "network": network.facts(),
            "data": {"records": records, "weight": weight, "dropped": table.dropped if table else 0,
                     "ignored_columns": table.ignored if table else [], "missing": missing}}


def basis(records):
    return "prior" if records == 0 else "few" if records < 5 else "data"


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


def expected_others(network, counts, used, got, records):
    """Leave-one-out of the other priors; the program's ESS of BDeu is taken once it has been found among the roundings."""
    whole = is_whole(counts)
    listed = []
    for kind in PRIORS:
        usable = kind != "expert" or (network.row_ess.keys() == network.outcomes.keys() == network.tables.keys()
                                      and not network.pseudo_counts)
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
                       "loo_per_record": leave_one_out(scale(unit, ess or 1), counts) / records if records and whole else None})
    return listed


def pick(got, allowed):
    return got if got in allowed else allowed[len(allowed) // 2]


def expected_fit(network, table, prior, got, level=0.95, split=None, counts=None, test=None):
    """The JSON of `fit`. prior: {"kind", "strength" or "by", "row_ess", "floor", "carry"}; split: as parts_of has it, or None for no
    comparison; test: the table that a split of method "test" predicts; got: the program's, read only to settle a rounding that may
    fall either way."""
    if counts is None:
        counts = tally(network, where(network, table), weights=table.weights)
    records, earlier, old = _records(table, counts), 0, None
    if prior["kind"] == "carried":
        weight = prior.get("carry", 1)
        old = {name: weight * n for name, n in network.counts.items()}
        earlier = weight * float(network.properties["ballast.records"])
        counts = {name: old[name] + n for name, n in counts.items()}
    unit = unit_pseudo_counts(network, prior)
    ess_kind = prior["kind"] == "bdeu"
    strength = prior.get("strength")
    if strength is None:
        strength = pick(got["prior"]["ess" if ess_kind else "scale"], strengths(unit, counts, prior["by"]))
    alpha = scale(unit, strength)
    families = expected_families(network, alpha, counts, level)
    score = math.fsum(f["log_marginal_likelihood"] for f in families)
    loo = leave_one_out(alpha, counts)
    heldout = None
    if split and split["method"] == "test" and loo is not None:
        heldout = HeldOut(network, test, prior, split, counts)
    elif split and table and records and loo is not None:
        heldout = HeldOut(network, table, prior, split, old)
    if heldout:
        heldout = heldout.nearest(got["heldout"]["bayes"]["log_likelihood"])
    chosen = prior.get("by", "given")
    scaled = prior["kind"] not in ("bdeu", "carried")
    told = head("fit", network, table, records, test)
    told["data"]["earlier"] = earlier
    told["network"]["free_parameters"] = int(sum(((a > 0).sum(axis=1) - 1).sum() for a in alpha.values()))  # a structural zero is none
    predictive = score - math.fsum(log_marginal_likelihood(alpha[name], old[name]) for name in old) if old else None
    return dict(told,
                prior={"kind": prior["kind"], "ess": strength if ess_kind else None,
                       "ess_chosen": chosen if ess_kind else None, "strength": None, "lean": None, "scale": strength if scaled else None,
                       "scale_chosen": chosen if scaled else None, "row_ess": prior.get("row_ess"),
                       "floor": prior.get("floor", 0) if prior["kind"] == "expert" else None},
                level=level, log_marginal_likelihood=score, log_predictive=predictive,
                composite=bool(table and table.incomplete),
                loo={"log_likelihood": loo, "per_record": loo / (records + earlier) if loo is not None and records + earlier else None},
                other_priors=expected_others(network, counts, prior["kind"], got["other_priors"], records + earlier),
                heldout=heldout, families=families)


def _records(table, counts):
    """Records that were counted, in some family or in all."""
    return float(len(table.codes)) if table else next(iter(counts.values())).sum()


def expected_check(network, table, counts=None):
    """The JSON of `check`: shares of records alone in a row (cell) of some family estimate the missing mass (Good 1953).
    From counts alone the share for each family is known, that for any family is not."""
    if counts is None:
        counts = tally(network, where(network, table))
    records = next(iter(counts.values())).sum()
    if table:
        alone = alone_by_record(network, table, counts)
        share = {key: _share(np.any(list(hits.values()), axis=0)) for key, hits in alone.items()}
        families = {name: {key: _share(hits[name]) for key, hits in alone.items()} for name in network.outcomes}
    else:
        share = {"row_share": None, "cell_share": None}
        families = {name: {"row_share": (n.sum(axis=1) == 1).sum() / records, "cell_share": (n == 1).sum() / records}
                    for name, n in counts.items()}
    share["families"] = [dict(variable=name, **families[name]) for name in network.outcomes]
    rows = {wanted: [{"variable": name, "given": given, "total": n.sum()} for name in network.outcomes
                     for n, given in zip(counts[name], network.given(name)) if basis(n.sum()) == wanted]
            for wanted in ("prior", "few")}
    return dict(head("check", network, table, records), unsupported=share, rows_without_records=rows["prior"],
                rows_with_few=rows["few"], records_per_parameter=records / network.facts()["free_parameters"])


def alone_by_record(network, table, counts):
    alone = {"row_share": {}, "cell_share": {}}
    for name, (row, outcome) in where(network, table).items():
        alone["row_share"][name] = counts[name].sum(axis=1)[row] == 1
        alone["cell_share"][name] = counts[name][row, outcome] == 1
    return alone


def _share(hits):
    return float(hits.mean()) if len(hits) else None
