#!/usr/bin/env python3
"""Compares src/base/mathematics.c and beta.c with mpmath at random places.

Run as: python3 -B test_mathematics.py DRIVER [SEED [POINTS]]      (ctest does; needs mpmath)

The places are drawn from a seed, which is printed when something fails; another seed gives other places. A quantile is
judged by how far the distribution function, in 50 digits, puts it from the true one: no reference quantile is needed.
"""
import math
import random
import subprocess
import sys

import exact
from exact import mp, mpf

mp.dps = 50


def power(generator, low, high):
    return 10 ** generator.uniform(low, high)


def draw_shape(generator):
    kind = generator.randrange(4)
    if kind == 0:
        return power(generator, -6, 9)
    if kind == 1:
        return power(generator, -6, 0)
    if kind == 2:
        return float(generator.randint(1, 1000)) + generator.choice((0, 0, 0.5))
    return power(generator, -1, 5)


def draw_probability(generator):
    small = generator.choice((0.025, 0.05, 0.5, 0.005, power(generator, -12, -0.31), generator.uniform(0.001, 0.5)))
    return small if generator.random() < 0.5 else 1 - small


def draw_pochhammer(generator):
    a = power(generator, -9, 12) if generator.random() < 0.6 else generator.uniform(0.001, 12)
    n = generator.choice((float(generator.randint(0, 40)), float(math.floor(power(generator, 0, 9))),
                          power(generator, -10, 9), generator.uniform(0, 30)))
    return a, n


def draw_tail(generator):
    a, b = draw_shape(generator), draw_shape(generator)
    mean = a / (a + b)
    deviation = math.sqrt(mean * (1 - mean) / (a + b + 1))
    x = generator.choice((mean + generator.gauss(0, 3) * deviation, power(generator, -12, 0),
                          1 - power(generator, -12, 0), generator.random()))
    return (a, b, x) if 0 < x < 1 else (a, b, mean)


def draw_quantile(generator):
    return draw_shape(generator), draw_shape(generator), draw_probability(generator)


def draw_narrow_quantile(generator):
    """A probability at which a tiny shape's quantile is neither 0 nor 1: close to b/(a + b)."""
    a, b = power(generator, -6, -2), power(generator, -6, generator.choice((-2, 9)))
    p = float(mpf(b) / (mpf(a) + mpf(b)) * mp.exp(-a * power(generator, -3, 2.8)))
    return (a, b, p) if 0 < p < 1 and generator.random() < 0.5 else (b, a, max(1 - p, 1e-12))


def pochhammer_error(arguments, answer):
    """The error over its promise: 1e-12 max(1, |value|)."""
    value = exact.log_pochhammer(*arguments)
    return abs(mpf(answer[0]) - value) / max(1, abs(value)) / mpf("1e-12")


def tail_error(arguments, answer):
    """The relative error of the smaller tail over its promise, 1e-12."""
    a, b, x = arguments
    wanted = exact.tails(a, b, mpf(x), 1 - mpf(x))
    i = 0 if wanted[0] <= wanted[1] else 1
    if wanted[i] < mpf("1e-300"):
        return 0 if answer[i] < 1.01e-300 else mp.inf
    return abs(mpf(answer[i]) / wanted[i] - 1) / mpf("1e-12")


def quantile_error(arguments, answer):
    """The error over its promise: 1e-10 of the smaller of x and 1 - x, and half a step of the doubles."""
    a, b, p = arguments
    x, p = answer[0], mpf(p)
    if x == 0:
        return 0 if exact.tails(a, b, exact.LEAST_X * mpf("1.001"), 1)[0] >= p else mp.inf
    if x == 1:
        return 0 if exact.tails(a, b, 1, exact.LEAST_Y * mpf("1.001"))[1] >= 1 - p else mp.inf
    step = mpf(math.ulp(x)) / 2
    x, y = mpf(x), 1 - mpf(x)
    lower, upper = exact.tails(a, b, x, y)
    slope = mp.exp(exact.log_weight(a, b, x, y))
    shift = -mp.log(lower / p) * lower / slope if p <= 0.5 else mp.log(upper / (1 - p)) * upper / slope
    if abs(shift) > 1:  # within a step of an end a quantile may be far in log-odds
        return abs(min(x, y) * mp.expm1(shift if x < y else -shift)) / (step * mpf("1.001"))
    return abs(shift) / (mpf("1e-10") + step * mp.exp(abs(shift)) / min(x, y))


SUBJECTS = (("log_pochhammer", draw_pochhammer, pochhammer_error, 3),
            ("beta_cdf", draw_tail, tail_error, 3),
            ("beta_quantile", draw_quantile, quantile_error, 3),
            ("beta_quantile", draw_narrow_quantile, quantile_error, 1))


def answers(driver, lines):
    questions = "\n".join(lines) + "\n"
    run = subprocess.run([driver], input=questions, capture_output=True, text=True, check=True, timeout=120)
    found = run.stdout.splitlines()
    if len(found) != len(lines):
        raise RuntimeError("%d answers to %d questions" % (len(found), len(lines)))
    return found


def main():
    driver = sys.argv[1]
    seed = int(sys.argv[2]) if len(sys.argv) > 2 else 19640601
    points = int(sys.argv[3]) if len(sys.argv) > 3 else 1000
    generator = random.Random(seed)
    passed = failed = 0
    for function, draw, error, share in SUBJECTS:
        places = [draw(generator) for _ in range(points * share // 10)]
        lines = ["%s %s" % (function, " ".join(map(repr, place))) for place in places]
        worst = 0
        for place, line, text in zip(places, lines, answers(driver, lines)):
            ratio = mp.inf if text == "refused" else error(place, [float(number) for number in text.split()])
            worst = max(worst, ratio)
            if ratio <= 1:
                passed += 1
                continue
            failed += 1
            print("seed %d: %s gives %s, %s times the error allowed" % (seed, line, text, mp.nstr(ratio, 3)))
        print("%s (%s): the largest error is %s of what is allowed" % (function, draw.__name__, mp.nstr(mpf(worst), 3)))
    print("%d passed, %d failed" % (passed, failed))
    return 0 if failed == 0 and passed > 0 else 1


if __name__ == "__main__":
    sys.exit(main())
