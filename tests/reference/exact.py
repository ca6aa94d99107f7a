"""Slow, obvious arithmetic with many digits, the referee of src/base/mathematics.c and src/base/beta.c.

The distribution function is the continued fraction DLMF 8.17.22, uncontracted; check_tails() holds it against mpmath's
own hypergeometric series where that is feasible and against its quadrature elsewhere. Gamma functions are mpmath's.
"""
from mpmath import mp, mpf

mp.dps = 60


def log_pochhammer(a, n):
    a, n = mpf(a), mpf(n)
    return mp.loggamma(a + n) - mp.loggamma(a)


def log_beta(a, b):
    a, b = mpf(a), mpf(b)
    return mp.loggamma(a) + mp.loggamma(b) - mp.loggamma(a + b)


def log_weight(a, b, x, y):
    """ln x^a y^b / B(a, b), the log of the density on the log-odds scale."""
    return a * mp.log(x) + b * mp.log(y) - log_beta(a, b)


def _fraction(a, b, x):
    """The continued fraction of DLMF 8.17.22 by the modified Lentz method; for x below (a + 1)/(a + b + 2)."""
    tiny, close = mpf(10) ** -200, mpf(10) ** (3 - mp.dps)
    value, c, d, n = mpf(1), mpf(1), mpf(0), 0
    while True:
        n += 1
        m = n // 2
        if n % 2:
            step = -(a + m) * (a + b + m) * x / ((a + 2 * m) * (a + 2 * m + 1))
        else:
            step = m * (b - m) * x / ((a + 2 * m - 1) * (a + 2 * m))
        d = 1 / ((1 + step * d) or tiny)
        c = (1 + step / c) or tiny
        value *= c * d
        if abs(c * d - 1) < close:
            return 1 / value


def tails(a, b, x, y):
    """I_x(a, b) and its complement; x + y = 1, the smaller of the two taken as exact."""
    a, b = mpf(a), mpf(b)
    if x < (a + 1) / (a + b + 2):
        lower = mp.exp(log_weight(a, b, x, y)) / a * _fraction(a, b, x)
        return lower, 1 - lower
    upper = mp.exp(log_weight(a, b, x, y)) / b * _fraction(b, a, y)
    return 1 - upper, upper


def tails_by_quadrature(a, b, x, y):
    """The same by tanh-sinh quadrature of the density along the log-odds, from the side that falls away from x."""
    a, b = mpf(a), mpf(b)
    if x > a / (a + b):
        upper, lower = tails_by_quadrature(b, a, y, x)
        return lower, upper
    scale = 1 / (abs(a - (a + b) * x) + mp.sqrt((a + b) * x * y))
    ends = [0] + [scale * mpf(2) ** k for k in range(-2, 12)]
    total = mp.quad(lambda s: mp.exp(-a * s - (a + b) * mp.log(x * mp.exp(-s) + y)), ends)
    lower = total * mp.exp(log_weight(a, b, x, y))
    return lower, 1 - lower


def tails_by_series(a, b, x, y):
    """The same by mpmath's incomplete beta function."""
    a, b = mpf(a), mpf(b)
    if x <= y:
        lower = mp.betainc(a, b, 0, x, regularized=True)
        return lower, 1 - lower
    upper = mp.betainc(b, a, 0, y, regularized=True)
    return 1 - upper, upper


def check_tails(a, b, x, y, digits=30):
    """tails(), after a second method has agreed."""
    first = tails(a, b, x, y)
    by_series = max(a, b) <= 1000 or min(a, b) < 1
    second = tails_by_series(a, b, x, y) if by_series else tails_by_quadrature(a, b, x, y)
    for one, other in zip(first, second):
        if abs(one - other) > mpf(10) ** -digits * max(one, other):
            raise ArithmeticError("two methods differ at a=%r b=%r x=%r: %s, %s" % (a, b, x, one, other))
    return first


def odds_place(v):
    """(x, y) with x + y = 1 and ln(x/y) = v, both to all digits."""
    return 1 / (1 + mp.exp(-v)), 1 / (1 + mp.exp(v))


def quantile(a, b, p, q):
    """(x, y) with I_x(a, b) = p = 1 - q: Newton's method along the log-odds on the log of the smaller tail.

    That log is concave, so Newton's steps close in from one side after the first, however far that one goes: these
    numbers have no smallest exponent.
    """
    a, b, p, q = mpf(a), mpf(b), mpf(p), mpf(q)
    v = mp.log(a / b)
    for _ in range(400):
        x, y = odds_place(v)
        lower, upper = tails(a, b, x, y)
        weight = mp.exp(log_weight(a, b, x, y))
        if p <= q:
            step = -mp.log(lower / p) * lower / weight
        else:
            step = mp.log(upper / q) * upper / weight
        v += step
        if abs(step) < mpf(10) ** -35 * (1 + abs(v)):
            return odds_place(v)
    raise ArithmeticError("no quantile found at a=%s b=%s p=%s" % (a, b, p))


LEAST_X = mpf(2) ** -1075  # half of the smallest double: below it a double says 0
LEAST_Y = mpf(2) ** -54  # half of the last step below 1: nearer to 1 a double says 1


def quantile_as_double(a, b, p):
    """The double nearest to the quantile; p is a double, and exact."""
    p = mpf(p)
    q = 1 - p
    if tails(a, b, LEAST_X, 1 - LEAST_X)[0] >= p:
        return 0.0
    if tails(a, b, 1 - LEAST_Y, LEAST_Y)[1] >= q:
        return 1.0
    x, y = quantile(a, b, p, q)
    lower, upper = check_tails(a, b, x, y)
    if abs(lower - p) > mpf(10) ** -30 * min(p, q):
        raise ArithmeticError("not a quantile at a=%r b=%r p=%s" % (a, b, p))
    return float(x) if x <= y else float(1 - y)
