"""Writes count_functions.tsv: reference values of the tails of counts in src/math/special/mass.

Every line is `function <tab> arguments separated by spaces <tab> value`. Arguments are doubles in their shortest decimal form, and
the value is that of the function at exactly those doubles, worked out by mpmath (tested with 1.3.0) in 60 or more digits and
printed with 25. Masses are written as plain products, tails are finite sums or one less them with digits to spare, and
derivatives are differences in ever higher precision. Run `python3 count_functions.py > count_functions.tsv`; it takes some minutes.
"""
from mpmath import mp, mpf
import mpmath as m

mp.dps = 60


def row(name, args, value):
    print(name, " ".join(repr(float(a)) for a in args), m.nstr(value, 25), sep="\t")


def negative_binomial_below(y, mean, k):
    """The mass at u is the product of (1 + k j) over j < u, times mean^u (1 + k mean)^-(u + 1/k) / u!."""
    log = m.log1p(k * mean) / k if k != 0 else mean
    term = m.exp(-log)
    total = mpf(0)
    q = 1 + k * mean
    for u in range(int(y) + 1):
        total += term
        term *= (1 + k * u) * mean / (q * (u + 1))
    return total


def beta_binomial_below(y, n, p, rho):
    theta = rho / (1 - rho)
    if n < 10:
        up = lambda a, u: m.fprod(a + theta * j for j in range(int(u)))
        return m.fsum(m.binomial(n, u) * up(p, u) * up(1 - p, n - u) / up(mpf(1), n) for u in range(int(y) + 1))
    term = mpf(1)
    for j in range(int(n)):
        term *= (1 - p + theta * j) / (1 + theta * j)
    total = mpf(0)
    for u in range(int(y) + 1):
        total += term
        if u < n:
            term *= (n - u) * (p + theta * u) / ((u + 1) * (1 - p + theta * (n - u - 1)))
    return total


def logarithmic_below(y, p):
    total, power = mpf(0), mpf(1)
    for u in range(1, int(y) + 1):
        power *= p
        total += power / u
    return -total / m.log1p(-p)


def weights(s, f, n, low, high):
    return [m.binomial(s, u) * m.binomial(f, n - u) for u in range(low, high + 1)]


def hypergeometric_part(y, w, s, f, n, above):
    low, high = int(max(0, n - f)), int(min(s, n))
    c = weights(s, f, n, low, high)
    total = part = mpf(0)
    power = mpf(1)
    for u, x in zip(range(low, high + 1), c):
        total += x * power
        if (u > y) == above:
            part += x * power
        power *= w
    return part / total


def tails(name, below, y, fixed, at, orders):
    """Lines of every side and order; `at` are the arguments that are differentiated."""
    for side in (0, 1):
        def log(*v):
            with m.extradps(320):
                part = below(y, *fixed, *v)
                return +m.log(part if side == 0 else 1 - part)
        for order in orders:
            if order == (0,) * len(order):
                value = log(*map(mpf, at))
            else:
                value = m.diff(log, tuple(map(mpf, at)), order) if len(at) > 1 else m.diff(log, mpf(at[0]), order[0])
            row(name, (side, *order, y, *fixed, *at), value)


BOTH = [(0, 0), (1, 0), (0, 1), (2, 0), (1, 1), (0, 2)]
ONE = [(0,), (1,), (2,)]

for y, mean, k in [
    (0, 2.5, 0), (3, 2.5, 0), (12, 2.5, 0), (40, 2.5, 0), (0, 2.5, 1e-12), (7, 2.5, 1e-6), (3, 0.25, 0.7), (0, 1e-8, 0.3),
    (2, 1e-8, 0.3), (25, 6.0, 0.4), (60, 6.0, 0.4), (1, 6.0, 5.0), (30, 6.0, 5.0), (0, 6.0, 1000.0), (90, 6.0, 1000.0),
    (80, 100.0, 0.0), (40, 100.0, 0.0), (180, 100.0, 1e-9), (30, 100.0, 0.02), (400, 100.0, 0.5), (100, 100.0, 0.5),
    (2, 100.0, 1.0), (2100, 2000.0, 1e-4), (1500, 2000.0, 0.0), (5, 50.0, 2.0), (700, 50.0, 0.9),
]:
    tails("negative_binomial_log_tail", negative_binomial_below, y, (), (mean, k), BOTH)

for y, n, p, rho in [
    (0, 6, 0.3, 0), (2, 6, 0.3, 0), (5, 6, 0.3, 0), (2, 6, 0.3, 1e-10), (2, 6, 0.3, 0.9), (0, 1, 0.4, 0.5), (10, 20, 0.5, 0.2),
    (1, 20, 0.5, 0.2), (18, 20, 0.03, 0.1), (19, 20, 0.03, 0.0), (3, 20, 0.97, 0.6), (30, 100, 0.5, 0.0), (30, 100, 0.5, 1e-6),
    (75, 100, 0.5, 0.01), (5, 100, 0.5, 0.3), (500, 1000, 0.5, 1e-3), (560, 1000, 0.5, 0.0), (100, 1000, 0.05, 1e-4),
    (0, 30, 1e-5, 0.2), (1, 30, 1e-5, 0.2), (2, 7, 0.999999, 0.05), (40, 60, 0.6, 0.99),
]:
    tails("beta_binomial_log_tail", beta_binomial_below, y, (n,), (p, rho), BOTH)

# at the ends of the probability: one-sided, and the tail is no logarithm's business unless it is near one
for y, n, rho in [(0, 6, 0.0), (1, 6, 0.0), (2, 6, 0.0), (0, 6, 0.3), (1, 6, 0.3), (4, 6, 0.3), (1, 6, 0.95)]:
    for p, side in ((0, 0), (1, 1)):
        at = y if p == 0 else n - 1 - y
        for order in BOTH:
            part = lambda p, rho: m.log(beta_binomial_below(at, n, p, rho) if side == 0 else 1 - beta_binomial_below(at, n, p, rho))
            value = part(mpf(p), mpf(rho)) if order == (0, 0) else m.diff(part, (mpf(p), mpf(rho)), order)
            row("beta_binomial_log_tail", (side, *order, at, n, p, rho), m.chop(value, tol=mpf(10) ** -30))

for y, p in [
    (1, 0.5), (2, 0.5), (9, 0.5), (80, 0.5), (1, 1e-5), (3, 1e-5), (1, 0.99), (50, 0.99), (98, 0.99), (99, 0.99), (101, 0.99),
    (2000, 0.99), (1, 0.999999), (1000, 0.999999), (5000, 0.9999), (20000, 0.9999), (1, 0.9), (5, 0.9), (8, 0.9), (9, 0.9), (10, 0.9),
]:
    tails("logarithmic_log_tail", logarithmic_below, y, (), (p,), ONE)

TABLES = [
    (5, 7, 6, 1.0), (5, 7, 6, 3.5), (5, 7, 6, 1e-3), (5, 7, 6, 1e4), (3, 2, 4, 0.7), (40, 30, 35, 1.0), (40, 30, 35, 0.05),
    (200, 1000, 30, 2.0), (200, 1000, 30, 1e-6), (1000, 800, 900, 1.2), (1000, 800, 900, 20.0), (1, 9, 4, 0.4), (60, 5, 62, 6.0),
]
for s, f, n, w in TABLES:
    low, high = int(max(0, n - f)), int(min(s, n))
    c = weights(s, f, n, low, high)
    t = mpf(float(m.log(mpf(w))))
    x = [a * m.exp(t * u) for a, u in zip(c, range(low, high + 1))]
    total = m.fsum(x)
    mean = m.fsum(a * u for a, u in zip(x, range(low, high + 1))) / total
    mu = [m.fsum(a * (u - mean) ** k for a, u in zip(x, range(low, high + 1))) / total for k in range(5)]
    for order, value in enumerate([m.log(total), mean, mu[2], mu[3], mu[4] - 3 * mu[2] ** 2]):
        row("hypergeometric_log_sum", (order, float(t), s, f, n), value)


def hypergeometric_lines(y, w, s, f, n):
    low, high = int(max(0, n - f)), int(min(s, n))
    c = weights(s, f, n, low, high)
    if w > 0 or y == low:
        def mass(w):
            lead = m.log(c[y - low]) + (y - low) * m.log(w) if y > low else m.log(c[0])
            return lead - m.log(m.polyval(c[::-1], w))
        for order in range(3):
            row("hypergeometric_log_mass", (order, y, w, s, f, n), m.diff(mass, mpf(w), order))
    for side in (0, 1):
        if (side == 1 and w == 0) or y >= high:
            continue

        def tail(w):
            with m.extradps(320):
                return m.log(hypergeometric_part(y, w, s, f, n, side == 1))
        for order in range(3):
            value = m.diff(tail, mpf(w), order) if order else tail(mpf(w))
            row("hypergeometric_log_tail", (side, order, y, w, s, f, n), m.chop(value, tol=mpf(10) ** -30) if w == 0 else value)


for s, f, n, w in TABLES + [(5, 7, 6, 0.0), (5, 7, 9, 0.0), (5, 7, 9, 1e-12), (200, 1000, 30, 1e-12)]:
    low, high = int(max(0, n - f)), int(min(s, n))
    wide = high - low
    for y in sorted({low, low + 1, low + 2, low + wide // 4, low + wide // 2, high - 1, high}):
        if low <= y <= high:
            hypergeometric_lines(y, w, s, f, n)
