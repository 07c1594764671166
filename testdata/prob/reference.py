"""Writes a table of reference values, both tails to 25 digits, by a method that shares nothing with package prob.

Needs gmpy2 (Debian: python3-gmpy2). Run from this folder, for each of f, chisquare and t:

    python3 reference.py f > f_tails.csv

Method: with x = a·f/(a·f + b), y = 1 − x, a = df1/2, b = df2/2, in arithmetic of at least 320 bits,

    lower = x^a y^b/(a B(a, b)) · Σ (a + b)_n/(a + 1)_n x^n,

or the mirror image for the upper tail, whichever needs fewer terms; the other tail is 1 less that one, for which as many bits are
added as the tail has zeros. B comes from the library's log-gamma function. Infinite degrees of freedom (chi-square) use the limit of the same series.
A twentieth of the points is computed from both sides, and the sum must be 1 to 60 digits.
"""

import math
import random
import sys

import gmpy2
from gmpy2 import mpfr

gmpy2.get_context().emax = 10**9
gmpy2.get_context().emin = -(10**9)
INF = float("inf")


def series(first, lead, z, zn):
    """first/lead · Σ Π (zn + k z)/(lead + 1 + k)."""
    small = mpfr(2) ** -(gmpy2.get_context().precision - 40)
    total = term = mpfr(1)
    k = 0
    while True:
        ratio = (zn + k * z) / (lead + 1 + k)
        term *= ratio
        total += term
        k += 1
        bound = max(ratio, z)
        if bound < 1 and term < total * small * (1 - bound):
            return first / lead * total


def terms(lead, z, zn):
    """Roughly how many terms the series needs: an integral of the logarithm of their ratio."""
    lead, z, zn = float(lead), float(z), float(zn)
    k, log_term, top = 0.0, 0.0, 0.0
    while log_term > top - 250:
        step = max(1.0, k / 20)
        middle = k + step / 2
        log_term += step * math.log((zn + middle * z) / (lead + 1 + middle) + 1e-300)
        top = max(top, log_term)
        k += step
        if k > 1e8:
            return 1e12
    return k


def tails(df1, df2, f, both=False):
    """Both tails of F at f, a number or the reference's own."""
    gmpy2.get_context().precision = 1400
    a, g = mpfr(df1) / 2, mpfr(f)
    limit = df2 == INF
    b = mpfr(df2) / 2
    u = a * g + b
    x, y, n = (mpfr(0), mpfr(1), b) if limit else (a * g / u, b / u, a + b)
    below = terms(a, x, a * g if limit else n * x)
    above = 1e12 if limit else terms(b, y, n * y)
    tail = abs(deviance(df1, df2, float(gmpy2.log(g)))) * 1.45
    use_lower = below <= above
    direct = not both and use_lower == (g <= 1)
    gmpy2.get_context().precision = 320 + (0 if direct else int(tail))
    if limit:
        x = a * g
        e = gmpy2.exp(a * gmpy2.log(x) - x - gmpy2.lgamma(a)[0])
        lower = series(e, a, mpfr(0), x)
        return lower, 1 - lower
    u, n = a * g + b, a + b
    x, y = a * g / u, b / u
    e = gmpy2.exp(a * gmpy2.log(x) + b * gmpy2.log(y) + gmpy2.lgamma(n)[0] - gmpy2.lgamma(a)[0] - gmpy2.lgamma(b)[0])
    if both and max(below, above) < 1e6:
        lower, upper = series(e, a, x, n * x), series(e, b, y, n * y)
        assert abs(lower + upper - 1) < mpfr(10) ** -60, (df1, df2, f)
        return lower, upper
    if use_lower:
        lower = series(e, a, x, n * x)
        return lower, 1 - lower
    upper = series(e, b, y, n * y)
    return 1 - upper, upper


def deviance(df1, df2, w):
    """Half a squared distance from the centre, in ordinary numbers: good enough to aim at a tail."""
    a, b = df1 / 2, df2 / 2
    if b == INF:
        return a * (math.expm1(w) - w) if w < 40 else INF
    n = a + b
    if abs(w) < 1e-2:
        return a * b / n * w * w / 2
    if w > 500:
        return n * (w + math.log(a / n)) - a * w
    return n * math.log1p(a / n * math.expm1(w)) - a * w


def aim(df1, df2, target, side):
    """f with a deviance of about the target, above (side 1) or below (−1) 1."""
    lo, hi = 0.0, 690.0
    for _ in range(60):
        mid = (lo + hi) / 2
        if deviance(df1, df2, side * mid) < target:
            lo = mid
        else:
            hi = mid
    return math.exp(side * lo)


def degrees(rng, top):
    common = [1, 2, 3, 4, 5, 6, 8, 10, 12, 15, 20, 24, 30, 40, 60, 100, 120, 1000, 1e4, 1e5, 1e6, 1e7, 1e8, 0.3, 0.5, 0.7, 1.5, 2.5, 7.3]
    kind = rng.random()
    if kind < 0.35:
        return float(rng.choice([d for d in common if d <= top]))
    if kind < 0.5:
        return float(round(10 ** rng.uniform(0, 3)))
    return 0.3 * (top / 0.3) ** rng.random()


def points(rng):
    """(group, df1, df2, f): the groups have limits of their own in the tests."""
    for top, group, count in ((1e5, "common", 1700), (1e8, "large", 1100)):
        for _ in range(count):
            df1, df2 = degrees(rng, top), degrees(rng, top)
            kind = rng.random()
            if kind < 0.6:
                f = aim(df1, df2, rng.uniform(0, 705), 1)
            elif kind < 0.85:
                f = aim(df1, df2, 15 * rng.random() ** 2, rng.choice((-1, 1)))
            elif kind < 0.95:
                f = aim(df1, df2, rng.uniform(0, 705), -1)
            else:
                f = aim(df1, df2, rng.uniform(0, 1e-3), rng.choice((-1, 1)))
            yield group, df1, df2, f
    for _ in range(400):
        df1 = degrees(rng, 1e8)
        f = aim(df1, INF, rng.uniform(0, 705) if rng.random() < 0.6 else 15 * rng.random() ** 2, rng.choice((-1, 1, 1)))
        yield "limit", df1, INF, f
    for _ in range(300):
        df1, df2 = 10 ** rng.uniform(-2, -0.5), degrees(rng, 1e6)
        if rng.random() < 0.5:
            df1, df2 = df2, df1
        f = aim(df1, df2, rng.uniform(0, 100) * rng.random() ** 2, rng.choice((-1, 1)))
        yield "few", df1, df2, f
    for _ in range(200):
        df1, df2 = 10 ** rng.uniform(-0.5, 2.5), 10 ** rng.uniform(9, 15)
        target = rng.uniform(0, 700) if rng.random() < 0.6 else 10 * rng.random() ** 2
        f = aim(df1, df2, target, rng.choice((-1, 1, 1)))
        if rng.random() < 0.5:
            df1, df2, f = df2, df1, 1 / f
        yield "wide", df1, df2, f


def chi_squares(rng):
    """(df, x)."""
    for _ in range(500):
        df = degrees(rng, 1e8) if rng.random() < 0.9 else 10 ** rng.uniform(-2, 0)
        target = rng.uniform(0, 705) if rng.random() < 0.6 else 15 * rng.random() ** 2
        yield df, df * aim(df, INF, target, rng.choice((-1, 1, 1)))


def ts(rng):
    """(df, t)."""
    for _ in range(300):
        df = degrees(rng, 1e6) if rng.random() < 0.9 else INF
        if rng.random() < 0.5:
            yield df, rng.uniform(0, 6)
        else:
            yield df, math.sqrt(aim(1.0, df, rng.uniform(0, 705), 1))


def text(v):
    return "{0:.25Ne}".format(v)


def main():
    rng = random.Random(20)
    kind = sys.argv[1]
    if kind == "f":
        print("group,df1,df2,f,lower,upper")
        for i, (group, df1, df2, f) in enumerate(points(rng)):
            if 1e-300 < f < 1e300:
                lower, upper = tails(df1, df2, f, both=i % 20 == 0)
                print("%s,%r,%r,%r,%s,%s" % (group, df1, df2, f, text(lower), text(upper)), flush=True)
    elif kind == "chisquare":
        print("df,x,lower,upper")
        for df, x in chi_squares(rng):
            gmpy2.get_context().precision = 1400
            lower, upper = tails(df, INF, mpfr(x) / mpfr(df))
            print("%r,%r,%s,%s" % (df, x, text(lower), text(upper)), flush=True)
    elif kind == "t":
        print("df,t,two_sided")
        for df, t in ts(rng):
            gmpy2.get_context().precision = 1400
            print("%r,%r,%s" % (df, t, text(tails(1.0, df, mpfr(t) ** 2)[1])), flush=True)


main()
