#!/usr/bin/env python3
"""Writes tests/base/mathematics_values.h and beta_values.h: reference values for the tests beside them, from mpmath.

Run as: python3 -B mathematics_values.py ../base      (needs mpmath; takes a minute or two)

Every value is computed with 60 digits and rounded once. The incomplete beta values rest on two methods that agree to 30
digits (exact.py), and every quantile is put back into both.
"""
import os
import random
import sys

from exact import check_tails, log_pochhammer, mp, mpf, quantile_as_double

# The shapes: tiny, moderate, the Jeffreys and BDA examples, and the large ones, where other codes fail.
SHAPES = (1e-6, 1e-3, 0.1, 0.5, 1.0, 2.5, 17.0, 438.0, 9999.0, 1e4, 1e6, 1e9)
# a + b is not a double, and what is lost of it matters.
ROUNDED_SUMS = ((912345678.0000001, 987654321.5), (987654321.5, 912345678.0000001),
                (111.0625, 4567890123456789.0))
# The quantile is a number below 1e-308.
SUBNORMALS = ((6.8769815411782405e-06, 17942.981537008247, 0.995),
              (0.0021355229500021784, 0.2093731274367873, 0.20214331221255005),
              (3.445814002253613e-05, 93.83066320434209, 0.975))


def write_header(folder, file_name, arrays):
    guard = "BASE_" + file_name.replace(".", "_").upper()
    with open(os.path.join(folder, file_name), "w") as header:
        header.write("/* Made by tests/reference/mathematics_values.py from 60 digits of mpmath; do not edit. */\n"
                     "#ifndef %s\n#define %s\n" % (guard, guard))
        for name, columns, comment, rows in arrays:
            header.write("\n/* %s */\nstatic const double %s[][%d] = {\n" % (comment, name, columns))
            for row in rows:
                header.write("    {%s},\n" % ", ".join(repr(float(value)) for value in row))
            header.write("};\n")
        header.write("\n#endif\n")


def pochhammer_rows():
    starts = (1e-9, 1e-6, 1e-3, 0.1, 0.5, 0.618, 0.6180339887498949, 1.0, 1.4616321449683623, 2.0, 3.3, 9.999,
              9.9999999999, 10.0, 17.25, 1e3, 1e6, 1e9, 1e12)
    steps = (2.0 ** -32, 1e-9, 0.25, 0.5, 1.0, 2.0, 2.5, 3.0, 7.0, 12.25, 16.0, 17.0, 100.0, 999.75, 1e4, 1e6,
             1e9 - 0.5, 1e9)
    for a in starts:
        for n in steps:
            yield a, n, log_pochhammer(a, n)


def tail_places(a, b):
    """The mean, and places three and twelve standard deviations below and above it."""
    mean = mpf(a) / (mpf(a) + mpf(b))
    deviation = mp.sqrt(mean * (1 - mean) / (mpf(a) + mpf(b) + 1))
    places = {float(mean), float(mean - 3 * deviation), float(mean + 3 * deviation), float(mean - 12 * deviation),
              float(mean + 12 * deviation), float(mean / 8)}
    return sorted(x for x in places if 0 < x < 1)


def tail_rows():
    for a in SHAPES:
        for b in SHAPES:
            for x in tail_places(a, b):
                lower, upper = check_tails(a, b, mpf(x), 1 - mpf(x))
                if min(lower, upper) > mpf(10) ** -300:
                    yield a, b, x, lower, upper
    for a, b in ROUNDED_SUMS:
        for x in tail_places(a, b)[1:]:
            lower, upper = check_tails(a, b, mpf(x), 1 - mpf(x))
            yield a, b, x, lower, upper


def quantile_rows():
    for a in SHAPES:
        for b in SHAPES:
            for p in (0.025, 0.5, 0.975):
                yield a, b, p, quantile_as_double(a, b, p)
    for a in SHAPES[::2]:
        for b in SHAPES[::3]:
            for p in (1e-12, 0.005, 0.05, 1 - 1e-12):
                yield a, b, p, quantile_as_double(a, b, p)
    for a, b in ROUNDED_SUMS:
        for p in (1e-12, 0.001, 0.975):
            yield a, b, p, quantile_as_double(a, b, p)
    for a, b, p in SUBNORMALS:
        yield a, b, p, quantile_as_double(a, b, p)


def narrow_rows():
    """Tiny shapes at the probabilities where the quantile leaves 0 and 1: close to b/(a + b)."""
    generator = random.Random(20240229)
    for a, b in ((1e-6, 1e-6), (1e-6, 1.5e-6), (1e-6, 5.0), (1e-6, 1e9), (1e-4, 3e-5), (1e-3, 1e-3), (1e-3, 0.7)):
        for _ in range(6):
            shift = a * 600 * generator.random() ** 2
            p = float(mpf(b) / (mpf(a) + mpf(b)) * mp.exp(-shift))
            yield a, b, p, quantile_as_double(a, b, p)
            yield b, a, 1 - p, quantile_as_double(b, a, 1 - p)


def log1p_minus_rows():
    for x in (-0.999999, -0.9, -0.5, -0.4999, -0.1, -1e-3, -1e-9, 0.0, 1e-300, 1e-12, 1e-5, 0.01, 0.3, 0.5, 1.0, 7.5,
              1e9):
        yield x, mp.log1p(mpf(x)) - mpf(x)


def gamma_star_rows():
    for z in (0.5, 0.75, 1.0, 1.0000001, 1.5, 2.0, 3.75, 7.0, 9.9999, 10.0, 10.5, 33.0, 1e3, 1e6, 1e16):
        z = mpf(z)
        yield z, mp.loggamma(z) - (z - 0.5) * mp.log(z) + z - mp.log(2 * mp.pi) / 2


def normal_rows():
    for p in (1e-300, 1e-12, 1e-5, 0.005, 0.025, 0.05, 0.1, 0.3, 0.5, 0.75, 0.95, 0.975, 0.995, 0.9999, 1 - 1e-12):
        tail = min(mpf(p), 1 - mpf(p))
        start = -mp.sqrt(-2 * mp.log(2 * tail)) if tail < 0.4 else mpf(0)
        z = mp.findroot(lambda v: mp.log(mp.erfc(-v / mp.sqrt(2)) / 2) - mp.log(tail), start)
        yield p, z if p < 0.5 else -z


def main():
    folder = sys.argv[1]
    write_header(folder, "mathematics_values.h", (
        ("log_pochhammer_values", 3, "a, n, ln (a)_n", pochhammer_rows()),
        ("log1p_minus_values", 2, "x, ln(1 + x) - x", log1p_minus_rows()),
        ("log_gamma_star_values", 2, "z, ln Gamma*(z)", gamma_star_rows()),
        ("normal_quantile_values", 2, "p, the standard normal quantile", normal_rows())))
    write_header(folder, "beta_values.h", (
        ("beta_tail_values", 5, "a, b, x, I_x(a, b), 1 - I_x(a, b)", tail_rows()),
        ("beta_quantile_values", 4, "a, b, p, the x with I_x(a, b) = p; 0 or 1 where that is nearest", quantile_rows()),
        ("narrow_quantile_values", 4, "the same, tiny shapes where x leaves 0 and 1", narrow_rows())))


if __name__ == "__main__":
    main()
