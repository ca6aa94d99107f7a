"""Pseudo-counts of the priors, and the strength that data ask for: a root of the score's derivative."""
import math

import numpy as np
from scipy import optimize, special


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
        elif prior["kind"] == "carried":
            unit[name] = network.pseudo_counts[name]
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
        """ln of the best strength between 0.01 and 10000: the best point of 61, then the peak beside it; None if all are equal."""
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
    """ln of alpha (alpha + 1) ... (alpha + n - 1). The difference of log-gammas loses digits for large alpha, where a
    product of few factors does not."""
    few = 16
    value = special.gammaln(alpha + n) - special.gammaln(alpha)
    product = np.prod([np.where(i < n, alpha + i, 1.0) for i in range(few)], axis=0)
    return np.where((n <= few) & (n == np.floor(n)), np.log(product), value)


def _distinct(pairs):
    """Distinct (alpha, n) with n > 0, and how often each stands there."""
    pairs = pairs[pairs[:, 1] > 0]
    return np.unique(pairs, axis=0, return_counts=True)


def strengths(unit, counts, by, slack=1e-4):
    """The roundings to three digits that a search to 1e-4 in ln strength may give; 1 where the score is the same everywhere,
    as it is without records or with a single one."""
    best = Profile(unit, counts, by).best()
    if best is None:
        return [1.0]
    return sorted({float("%.3g" % math.exp(x)) for x in (best - slack, best, best + slack)
                   if math.log(0.01) - slack <= x <= math.log(10000) + slack})
