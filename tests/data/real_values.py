#!/usr/bin/env python3
# SPDX-License-Identifier: Apache-2.0
"""Prints real_values.csv: elementary functions with 1200 bits.

    python3 tests/data/real_values.py > tests/data/real_values.csv

Needs mpmath (made with 1.3.0).  Arguments are exact doubles; the value is the
nearest double plus what is missing, in units of that double's last place.
"""
import math
import random
from mpmath import mp, mpf, atan2, cos, exp, expm1, floor, log, pi, sin

mp.prec = 1200  # plenty where 1e9 is reduced and for expm1 near 0
rng = random.Random(20240611)
SMALLEST = math.ldexp(1, -1074)


def spread(low, high, n, signed=True):
    """n numbers with exponents of two spread over [low, high]."""
    sign = [-1, 1] if signed else [1]
    return [rng.choice(sign) * math.ldexp(rng.uniform(1, 2),
            rng.randint(low, high)) for _ in range(n)]


def even(low, high, n):
    return [rng.uniform(low, high) for _ in range(n)]


def around(x, n=2):
    """x and its neighbours."""
    out = [x]
    up = down = x
    for _ in range(n):
        up, down = math.nextafter(up, math.inf), math.nextafter(down, -math.inf)
        out += [up, down]
    return out


def quarters(n):
    """Doubles nearest to multiples of pi/4 up to 1e9, where digits cancel."""
    out = []
    for _ in range(n):
        k = int(math.ldexp(rng.uniform(1, 2), rng.randint(0, 29)))
        out += around(float(k * pi / 4), 1)
    return [x * rng.choice([-1, 1]) for x in out if abs(x) <= 1e9]


def wrap(x):
    """In (-pi, pi]; what rounds to -pi stands as pi."""
    y = x - 2 * pi * -floor((pi - x) / (2 * pi))
    return mpf(math.pi) if float(y) == -math.pi else y


# The nearest doubles to multiples of pi/2 below 1e9 (continued fractions).
WORST = [float.fromhex("0x1.6c6cbc45dc8dep+%d" % e) for e in range(5, 12)] + [
    float.fromhex("0x1.b951f1572eba5p+%d" % e) for e in range(23, 29)]

LN2 = math.log(2)
halves = [x for k in range(-6, 7) for x in around((k + 0.5) * LN2, 1)]
ends = [709.0, 709.78, 709.782712893384, 708.5, -708.0, -708.5, -744.0,
        -745.0, -745.1332191019411, -36.0, -37.0, -38.0, -40.5, -700.0, 0.5,
        -0.5, 1.0, -1.0, 2.0, 88.0]

TURN = (even(-1e9, 1e9, 80) + even(-1e6, 1e6, 60) + even(-100, 100, 80)
        + even(-3.2, 3.2, 100) + spread(-60, 29, 60) + quarters(60)
        + WORST + [-x for x in WORST[:3]] + [1e9, -1e9, 1.0, 0.5, SMALLEST]
        + around(math.pi / 4) + around(math.pi / 2) + around(math.pi))

PLAN = {
    "exp": (exp, even(-745, 709.7, 160) + even(-2, 2, 80) + spread(-60, 9, 80)
            + halves + ends),
    "expm1": (expm1, even(-45, 709.7, 120) + even(-1, 1, 120)
              + even(-3, 25, 80) + spread(-80, 8, 80) + halves
              + [x for x in ends if x > -41] + [SMALLEST, -1e-300]),
    "log": (log, even(0.5, 2, 120) + even(0.99, 1.01, 80)
            + spread(-1074, 1023, 120, False) + around(1.0, 3)
            + around(math.sqrt(0.5)) + around(math.sqrt(2)) + around(2.0)
            + [SMALLEST, 3 * SMALLEST, 2.2250738585072014e-308, 10.0, math.e,
               1.7976931348623157e308]),
    "sin": (sin, TURN),
    "cos": (cos, TURN),
    "wrap": (wrap, TURN),
}


def angles():
    out = [(rng.uniform(-3, 3), rng.uniform(-3, 3)) for _ in range(200)]
    for _ in range(150):
        x = spread(-990, 990, 1)[0]
        out.append((x * spread(-30, 30, 1)[0], x))
    for ratio in (7 / 16, 11 / 16, 19 / 16, 39 / 16, 0.5, 1, 1.5):
        for y in around(ratio, 1):
            out += [(y, 1.0), (y * 3, -3.0), (-y * 1e-300, 1e-300)]
    out += [(1e-300, 1e300), (1e-300, -1e300), (1e300, 1e-300),
            (SMALLEST, 1.0), (SMALLEST, SMALLEST), (SMALLEST, 3 * SMALLEST),
            (1e-310, 1e-308), (1.7e308, 1.7e308), (1.7e308, -1e308),
            (1e308, 1.0), (-1.0, 1e308), (-1e-20, -1.0), (1e-17, 2.0)]
    return out + [(y * x, x) for x in (1.0, 3.7) for y in even(0, 0.45, 40)]


def row(name, x, y, value):
    high = float(value)
    low = (value - mpf(high)) / mpf(math.ulp(high))
    print("%s,%s,%s,%s,%.6f" % (name, x.hex(), y.hex(), high.hex(), low))


print("# Made by real_values.py (mpmath, 1200 bits); licence Apache-2.0.")
print("# function,x,second argument,nearest double,missing last places")
for name, (function, arguments) in PLAN.items():
    for x in dict.fromkeys(arguments):
        row(name, x, 0.0, function(mpf(x)))
for y, x in angles():
    row("atan2", float(y), float(x), atan2(mpf(y), mpf(x)))
