"""Writes ../data/nist/certified.json: `python3 certified.py`.

The data and the certified figures are those of NIST's Statistical Reference Datasets, linear regression, which are in
the public domain. Here each set is solved again in exact rational arithmetic and held to the certified figures, so that
a slip in either shows.
"""
import csv, json, pathlib
from fractions import Fraction
import mpmath as mp

mp.mp.dps = 40
HERE = pathlib.Path(__file__).resolve().parent.parent / "data" / "nist"

# Certified figures as the carrier prints them; residual sd from the certified residual sum of squares where it prints that.
SETS = {
    "longley": {
        "degree": None, "carrier": "data, coefficients and residual sum of squares: GSL 2.7.1, multifit/test_longley.c (Debian source package gsl)",
        "coefficients": ["-3482258.63459582", "15.0618722713733", "-0.358191792925910E-01", "-2.02022980381683", "-1.03322686717359", "-0.511041056535807E-01", "1829.15146461355"],
        "squares": "836424.055505915", "digits": 9,
    },
    "norris": {
        "degree": 1, "carrier": "data and coefficients: scipy 1.17.1, stats/tests/test_stats.py (PyPI package scipy); residual sd recalled from memory",
        "coefficients": ["-0.262323073774029", "1.00211681802045"], "residual_sd": "0.884796396144373", "digits": 12,
    },
    "pontius": {
        "degree": 2, "carrier": "data, coefficients and residual sum of squares: GSL 2.7.1, multifit/test_pontius.c (Debian source package gsl)",
        "coefficients": ["0.673565789473684E-03", "0.732059160401003E-06", "-0.316081871345029E-14"], "squares": "0.155761768796992E-05", "digits": 11,
    },
    "wampler3": {
        "degree": 5, "carrier": "data recalled from memory: a quintic with all coefficients one plus a symmetric pattern orthogonal to it, which exact arithmetic confirms; residual sum of squares recalled from memory",
        "coefficients": ["1", "1", "1", "1", "1", "1"], "squares": "83554268", "digits": 9,
    },
    "filip": {
        "degree": 10, "carrier": "data, coefficients and residual sum of squares: GSL 2.7.1, multifit/test_filip.c (Debian source package gsl)",
        "coefficients": ["-1467.48961422980", "-2772.17959193342", "-2316.37108160893", "-1127.97394098372", "-354.478233703349", "-75.1242017393757", "-10.8753180355343", "-1.06221498588947", "-0.670191154593408E-01", "-0.246781078275479E-02", "-0.402962525080404E-04"],
        "squares": "0.795851382172941E-03", "digits": 7,
    },
}


def least_squares(x, y):
    """Normal equations by Gauss-Jordan elimination in fractions: exact."""
    n = len(x[0])
    m = [[sum(r[i] * r[j] for r in x) for j in range(n)] + [sum(r[i] * v for r, v in zip(x, y))] for i in range(n)]
    for i in range(n):
        pivot = next(k for k in range(i, n) if m[k][i] != 0)
        m[i], m[pivot] = m[pivot], m[i]
        m[i] = [v / m[i][i] for v in m[i]]
        for k in range(n):
            if k != i and m[k][i] != 0:
                m[k] = [a - m[k][i] * b for a, b in zip(m[k], m[i])]
    return [r[n] for r in m]


out = {}
for name, s in SETS.items():
    rows = list(csv.reader(open(HERE / f"{name}.csv")))[1:]
    y = [Fraction(r[0]) for r in rows]
    x = [[Fraction(1)] + ([Fraction(v) for v in r[1:]] if s["degree"] is None else [Fraction(r[1]) ** k for k in range(1, s["degree"] + 1)]) for r in rows]
    b = least_squares(x, y)
    squares = sum((v - sum(p * q for p, q in zip(b, r))) ** 2 for r, v in zip(x, y))
    number = lambda f: mp.mpf(f.numerator) / f.denominator
    sd = mp.sqrt(number(squares) / (len(y) - len(b)))
    for exact, certified in zip(b, s["coefficients"]):
        assert abs(number(exact) / mp.mpf(certified) - 1) < mp.mpf(10) ** -14 * 5, (name, number(exact), certified)
    if "squares" in s:
        assert abs(number(squares) / mp.mpf(s["squares"]) - 1) < mp.mpf(10) ** -14 * 5, (name, number(squares))
    else:
        assert abs(sd / mp.mpf(s["residual_sd"]) - 1) < mp.mpf(10) ** -14 * 5, (name, sd)
    out[name] = {"degree": s["degree"], "carrier": s["carrier"], "digits": s["digits"], "coefficients": s["coefficients"], "residual_sd": mp.nstr(sd, 15)}
(HERE / "certified.json").write_text(json.dumps(out, indent=1) + "\n")
