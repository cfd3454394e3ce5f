"""Writes counts.tsv: reference values of the count families in src/family.

Every line is `family <tab> what <tab> arguments <tab> value`: what is log_density, below (log P(Y <= y)), above (log P(Y > y)),
d:PARAMETER or d2:PARAMETER:PARAMETER (of the log density), arguments are NAME=VALUE separated by spaces, doubles in their
shortest decimal form. Values are worked out by mpmath (tested with 1.3.0) in 60 or more digits at exactly those doubles, from
gamma functions or plain products, and derivatives by differences in higher precision; they share nothing with the program.
Points where the rounding of the arguments alone moves a derivative by more than 1e-9 (the top of the likelihood at counts of 1e9,
high counts at means below 1e-6) are left out. Run `python3 counts.py > counts.tsv`; it takes a minute or two.
"""
from mpmath import mp, mpf
import mpmath as m

mp.dps = 60


def line(family, what, arguments, value):
    text = " ".join(f"{k}={float(v)!r}" for k, v in arguments.items())
    print(family, what, text, m.nstr(value, 25), sep="\t")


def lines(family, log, points, parameters, derivatives=True):
    """Log density and, inside or on a smooth edge, all derivatives; `log` takes the arguments by name."""
    for point in points:
        line(family, "log_density", point, log(**{k: mpf(v) for k, v in point.items()}))
        if not derivatives:
            continue
        fixed = {k: mpf(v) for k, v in point.items() if k not in parameters}
        at = tuple(mpf(point[p]) for p in parameters)

        def f(*v):
            with m.extradps(40):
                return log(**fixed, **dict(zip(parameters, v)))

        n = len(parameters)
        for i, p in enumerate(parameters):
            order = tuple(int(k == i) for k in range(n))
            line(family, f"d:{p}", point, clean(m.diff(f, at, order) if n > 1 else m.diff(f, at[0])))
            for j in range(i, n):
                order = tuple(int(k == i) + int(k == j) for k in range(n))
                value = m.diff(f, at, order) if n > 1 else m.diff(f, at[0], 2)
                line(family, f"d2:{p}:{parameters[j]}", point, clean(value))


def clean(x):
    return mpf(0) if abs(x) < mpf(10) ** -25 else x


def tails(family, mass, points, lowest, highest=None):
    """Both tails by plain sums: the lower one, and one less it with digits to spare (or the upper sum where the counts end)."""
    for point in points:
        values = {k: mpf(v) for k, v in point.items() if k != "y"}
        with m.extradps(340):
            below = m.fsum(mass(u, **values) for u in range(lowest, int(point["y"]) + 1))
            above = 1 - below
            assert below > 0 and above > mpf(10) ** -330
            line(family, "below", point, m.log(below))
            line(family, "above", point, m.log(above))


# Poisson: y log(m) - m - log y!
def poisson(y, rate, exposure=mpf(1)):
    mean = exposure * rate
    return (y * m.log(mean) if y else mpf(0)) - mean - m.loggamma(y + 1)


POISSON = [
    (0, 0, 1), (0, 2.5, 1), (3, 2.5, 1), (1, 1e-9, 1), (2, 1e-20, 1), (40, 2.5, 1), (7, 0.35, 20.0), (0, 700.0, 1),
    (100, 99.5, 1), (100, 100.0, 1), (1000, 1001.0, 1), (1000, 10.0, 1), (12345, 12000.0, 1), (1e6, 1e6, 1), (1001000, 1e6, 1),
    (999999999, 1e9, 1), (1000100000, 1e9, 1), (999000000, 1e9, 1), (1000050000, 0.1, 1e10), (5e8, 1e9, 1), (1, 1.0, 1), (2, 30.0, 0.1),
    (15, 15.000001, 1), (8, 1e-3, 4000.0), (300, 1000.0, 1), (0, 1e9, 1), (20, 0.01, 1),
]
lines("poisson", poisson, [dict(y=y, rate=r, exposure=e) for y, r, e in POISSON], ["rate"])


def poisson_mass(u, rate, exposure):
    return m.exp(poisson(mpf(u), rate, exposure))


tails("poisson", poisson_mass, [
    dict(y=y, rate=r, exposure=e) for y, r, e in
    [(0, 2.5, 1), (3, 2.5, 1), (30, 2.5, 1), (100, 2.5, 1), (0, 1e-9, 1), (1, 1e-9, 1), (0, 600.0, 1), (400, 600.0, 1), (600, 600.0, 1),
     (900, 600.0, 1), (5, 0.7, 4.0), (9800, 1e4, 1), (10000, 1e4, 1), (10500, 1e4, 1), (2, 40.0, 1)]], 0)


# binomial
def log_choose(n, k):
    return m.loggamma(n + 1) - m.loggamma(k + 1) - m.loggamma(n - k + 1)


def binomial(y, probability, trials):
    out = log_choose(trials, y)
    if y:
        out += y * m.log(probability)
    if trials - y:
        out += (trials - y) * m.log(1 - probability)
    return out


BINOMIAL = [
    (0, 0, 5), (5, 1, 5), (0, 0.3, 1), (1, 0.3, 1), (2, 0.3, 6), (6, 0.3, 6), (0, 0.3, 6), (3, 1e-9, 7), (7, 0.999999, 7),
    (4, 0.999999, 7), (50, 0.5, 100), (1, 0.5, 100), (99, 0.5, 100), (30, 0.31, 100), (500, 0.5, 1000), (510, 0.5, 1000),
    (123, 0.1, 1000), (500000, 0.5, 1e6), (501000, 0.5, 1e6), (100, 1e-4, 1e6), (999999880, 0.9999999, 1e9), (5e8, 0.5, 1e9),
    (500030000, 0.5, 1e9), (250030000, 0.25, 1e9), (5, 3e-9, 1e9), (0, 1e-12, 1e9), (1e9, 0.99999, 1e9), (10, 0.2, 12),
]
lines("binomial", binomial, [dict(y=y, probability=p, trials=n) for y, p, n in BINOMIAL], ["probability"])


def binomial_mass(u, probability, trials):
    return m.exp(binomial(mpf(u), probability, trials))


tails("binomial", binomial_mass, [
    dict(y=y, probability=p, trials=n) for y, p, n in
    [(0, 0.3, 1), (0, 0.3, 6), (2, 0.3, 6), (5, 0.3, 6), (1, 1e-9, 7), (0, 1e-9, 7), (6, 0.999999, 7), (3, 0.999999, 7), (20, 0.5, 100),
     (50, 0.5, 100), (90, 0.5, 100), (1, 0.5, 1000), (450, 0.5, 1000), (980, 0.5, 1000), (9, 0.003, 3000), (60, 0.003, 3000)]], 0)


# geometric
def geometric(y, probability):
    return m.log(probability) + ((y - 1) * m.log(1 - probability) if y > 1 else 0)


GEOMETRIC = [
    (1, 1), (1, 0.3), (2, 0.3), (9, 0.3), (100, 0.3), (1, 1e-9), (2, 1e-9), (2e9, 1e-9), (1e6, 1e-9), (1e9, 0.5), (3, 0.5), (1, 0.5),
    (1, 0.999999), (2, 0.999999), (5, 0.999999), (40, 0.02), (50, 0.02), (1000, 0.02), (7, 0.1), (10, 0.1), (25, 0.1), (3, 1e-20),
    (1000, 1e-3), (12, 0.75), (4, 0.9), (2, 0.25),
]
lines("geometric", geometric, [dict(y=y, probability=p) for y, p in GEOMETRIC], ["probability"])
for y, p in [(1, 0.3), (2, 0.3), (9, 0.3), (500, 0.3), (1, 1e-9), (1000, 1e-9), (1e9, 1e-9), (1, 0.999999), (3, 0.999999), (40, 0.02), (3, 0.5), (1, 0.5)]:
    with m.extradps(340):
        above = (1 - mpf(p)) ** int(y)
        line("geometric", "below", dict(y=y, probability=p), m.log(1 - above))
        line("geometric", "above", dict(y=y, probability=p), m.log(above))


# negative binomial: product of (1 + k j), j < y, times m^y (1 + k m)^-(y + 1/k) / y!
def log_rising(u, k):
    """log of the product of (1 + k j) over j < u, also for k = 0 and a little below."""
    if u < 3000:
        return m.fsum(m.log1p(k * j) for j in range(int(u)))
    return u * m.log(k) + m.loggamma(u + 1 / k) - m.loggamma(1 / k)


def negative_binomial(y, mean, dispersion, exposure=mpf(1)):
    mean = exposure * mean
    k = dispersion
    out = log_rising(y, k) - m.loggamma(y + 1) - y * m.log1p(k * mean)
    if y:
        out += y * m.log(mean)
    return out - (m.log1p(k * mean) / k if k != 0 else mean)


NEGATIVE_BINOMIAL = [
    (0, 0, 0), (0, 0, 0.5), (0, 2.5, 0), (3, 2.5, 0), (3, 2.5, 1e-12), (3, 2.5, 1e-6), (3, 2.5, 0.4), (3, 2.5, 1e3), (0, 2.5, 1e3),
    (0, 2.5, 1e-12), (1, 1e-6, 0.3), (2, 1e-6, 0.3), (60, 2.5, 0.0), (60, 2.5, 1e-3), (60, 2.5, 3.0), (100, 120.0, 1e-4),
    (1000, 900.0, 0.02), (1000, 900.0, 0.0), (2000, 1e6, 2.0), (1000000, 1e6, 1e-12), (1001500, 1e6, 1e-6), (999000, 1e6, 1.0),
    (1000000000, 1e9, 1e-6), (1000000000, 1e9, 1e3), (1000030000, 1e9, 1e-12), (5000000, 1e9, 2.0), (999970000, 1e9, 0.4), (5, 0.2, 10.0),
    (40, 40.0, 1.0), (41, 40.0, 1.0), (0, 1e9, 1.0), (0, 1e6, 2.0), (3, 1e9, 1.0), (1, 1e6, 1e3), (1000, 1e9, 0.01),
]
lines("negative_binomial", negative_binomial,
      [dict(y=y, mean=mu, dispersion=k, exposure=1) for y, mu, k in NEGATIVE_BINOMIAL]
      + [dict(y=4, mean=0.7, dispersion=0.3, exposure=5.0), dict(y=30, mean=0.7, dispersion=0.0, exposure=40.0)], ["mean", "dispersion"])
# at dispersion 0 and large counts: Poisson, and the derivatives written out
for y, mu in [(1000000, 1e6), (1000030000, 1e9), (999970000, 1e9), (5000, 4900.0)]:
    point = dict(y=y, mean=mu, dispersion=0, exposure=1)
    y, mu = mpf(y), mpf(mu)
    line("negative_binomial", "log_density", point, poisson(y, mu))
    line("negative_binomial", "d:mean", point, (y - mu) / mu)
    line("negative_binomial", "d:dispersion", point, ((y - mu) ** 2 - y) / 2)
    line("negative_binomial", "d2:mean:mean", point, -y / mu ** 2)
    line("negative_binomial", "d2:mean:dispersion", point, mu - y)
    line("negative_binomial", "d2:dispersion:dispersion", point, -(y - 1) * y * (2 * y - 1) / 6 + y * mu ** 2 - 2 * mu ** 3 / 3)


def negative_binomial_mass(u, mean, dispersion, exposure):
    return m.exp(negative_binomial(mpf(u), mean, dispersion, exposure))


tails("negative_binomial", negative_binomial_mass, [
    dict(y=y, mean=mu, dispersion=k, exposure=e) for y, mu, k, e in
    [(0, 2.5, 0, 1), (3, 2.5, 0, 1), (40, 2.5, 0, 1), (3, 2.5, 1e-12, 1), (3, 2.5, 1e-6, 1), (3, 2.5, 0.4, 1), (0, 2.5, 1e3, 1), (30, 2.5, 1e3, 1),
     (1, 1e-9, 0.3, 1), (150, 120.0, 1e-4, 1), (60, 120.0, 0.02, 1), (400, 120.0, 0.5, 1), (7, 1.2, 0.7, 3.0), (500, 20.0, 1.0, 1)]], 0)


# beta-binomial: products of (p + theta j), (q + theta j) and (1 + theta j)
def log_product(p, theta, u):
    if u < 3000:
        return m.fsum(m.log(p + theta * j) for j in range(int(u)))
    return u * m.log(theta) + m.loggamma(u + p / theta) - m.loggamma(p / theta)


def beta_binomial(y, mean, overdispersion, trials):
    theta = overdispersion / (1 - overdispersion)
    return (log_choose(trials, y) + log_product(mean, theta, y) + log_product(1 - mean, theta, trials - y)
            - log_product(mpf(1), theta, trials))


BETA_BINOMIAL = [
    (0, 0, 0, 5), (0, 0, 0.3, 5), (5, 1, 0.3, 5), (5, 1, 0, 5), (0, 0.3, 0, 1), (1, 0.3, 0.5, 1), (2, 0.3, 0, 6), (2, 0.3, 1e-10, 6),
    (2, 0.3, 0.1, 6), (2, 0.3, 0.9, 6), (0, 0.3, 0.9, 6), (6, 0.3, 0.9, 6), (3, 1e-6, 0.2, 7), (0, 1e-9, 0.2, 7), (7, 0.999999, 0.01, 7),
    (50, 0.5, 0.0, 100), (50, 0.5, 0.01, 100), (3, 0.5, 0.01, 100), (97, 0.5, 0.3, 100), (500, 0.45, 1e-10, 1000), (500, 0.45, 1e-3, 1000),
    (120, 0.1, 0.0, 1000), (990, 0.1, 0.2, 1000), (500700, 0.5, 1e-6, 1000000), (400000, 0.5, 0.05, 1000000), (501000, 0.5, 1e-10, 1000000),
    (250400000, 0.25, 1e-6, 1000000000), (250030000, 0.25, 1e-10, 1000000000), (100000000, 0.5, 0.9, 1000000000), (10, 0.2, 0.999, 12),
    (1, 0.5, 0.5, 1000000000), (999999990, 0.5, 0.5, 1000000000), (0, 0.3, 0.2, 1000000), (100, 0.3, 1e-3, 1000000),
]
lines("beta_binomial", beta_binomial,
      [dict(y=y, mean=p, overdispersion=r, trials=n) for y, p, r, n in BETA_BINOMIAL], ["mean", "overdispersion"])
# at overdispersion 0 and many trials: binomial, and the derivatives written out
for y, p, n in [(500000, 0.5, 1000000), (250030000, 0.25, 1000000000), (4900, 0.5, 10000)]:
    point = dict(y=y, mean=p, overdispersion=0, trials=n)
    y, p, n = mpf(y), mpf(p), mpf(n)
    z, q = n - y, 1 - p
    pairs = lambda u: u * (u - 1) / 2
    squares = lambda u: (u - 1) * u * (2 * u - 1) / 6
    first = pairs(y) / p + pairs(z) / q - pairs(n)
    line("beta_binomial", "log_density", point, binomial(y, p, n))
    line("beta_binomial", "d:mean", point, y / p - z / q)
    line("beta_binomial", "d:overdispersion", point, first)
    line("beta_binomial", "d2:mean:mean", point, -y / p ** 2 - z / q ** 2)
    line("beta_binomial", "d2:mean:overdispersion", point, -pairs(y) / p ** 2 + pairs(z) / q ** 2)
    line("beta_binomial", "d2:overdispersion:overdispersion", point, -squares(y) / p ** 2 - squares(z) / q ** 2 + squares(n) + 2 * first)


def beta_binomial_mass(u, mean, overdispersion, trials):
    return m.exp(beta_binomial(mpf(u), mean, overdispersion, trials))


tails("beta_binomial", beta_binomial_mass, [
    dict(y=y, mean=p, overdispersion=r, trials=n) for y, p, r, n in
    [(0, 0.3, 0.5, 1), (2, 0.3, 0, 6), (2, 0.3, 1e-10, 6), (5, 0.3, 0.9, 6), (0, 0.3, 0.9, 6), (1, 1e-9, 0.2, 7), (6, 0.999999, 0.01, 7),
     (30, 0.5, 0.0, 100), (95, 0.5, 0.01, 100), (50, 0.5, 0.6, 100), (0, 0.1, 1e-3, 300), (280, 0.1, 1e-3, 300)]], 0)


# logarithmic
def logarithmic(y, probability):
    return y * m.log(probability) - m.log(y) - m.log(-m.log1p(-probability))


LOGARITHMIC = [
    (1, 0.5), (2, 0.5), (10, 0.5), (1, 1e-9), (2, 1e-9), (3, 1e-20), (1, 1e-20), (1, 0.999999), (1000, 0.999999), (1e6, 0.999999),
    (1e9, 0.999999), (1e9, 0.9999999999), (1, 0.9), (9, 0.9), (100, 0.9), (1, 0.1), (2, 0.1), (5, 0.1), (3, 0.97), (30, 0.97), (300, 0.97),
    (7, 0.75), (20, 0.6), (4, 0.01), (1, 0.01), (50, 0.99),
]
lines("logarithmic", logarithmic, [dict(y=y, probability=p) for y, p in LOGARITHMIC], ["probability"])


def logarithmic_mass(u, probability):
    return m.exp(logarithmic(mpf(u), probability))


tails("logarithmic", logarithmic_mass, [
    dict(y=y, probability=p) for y, p in
    [(1, 0.5), (2, 0.5), (100, 0.5), (1, 1e-9), (3, 1e-9), (1, 0.999999), (100, 0.999999), (50, 0.97), (33, 0.97), (1, 0.1), (20, 0.1), (500, 0.9)]], 1)


# zero-truncated Poisson
def truncated(y, rate, exposure=mpf(1)):
    mean = exposure * rate
    # mean / (1 - exp(-mean)), 1 at 0
    factor = -mean / m.expm1(-mean) if mean != 0 else mpf(1)
    return (y - 1) * m.log(mean) - mean - m.loggamma(y + 1) + m.log(factor) if y > 1 else -mean + m.log(factor)


TRUNCATED = [
    (1, 0, 1), (1, 1e-12, 1), (1, 1e-6, 1), (2, 1e-6, 1), (5, 1e-3, 1), (1, 0.5, 1), (2, 0.5, 1), (9, 0.5, 1), (1, 1.0, 1), (3, 0.999999, 1),
    (3, 1.0, 1), (4, 2.5, 1), (1, 2.5, 1), (60, 2.5, 1), (1, 700.0, 1), (30, 40.0, 1), (40, 40.0, 1), (1000, 1001.0, 1), (12345, 12000.0, 1),
    (1e6, 1e6, 1), (999999999, 1e9, 1), (1000100000, 1e9, 1), (1000050000, 0.1, 1e10), (7, 0.35, 20.0), (2, 0.35, 0.1), (15, 15.0, 1), (1, 20.0, 0.2),
]
lines("zero_truncated_poisson", truncated, [dict(y=y, rate=r, exposure=e) for y, r, e in TRUNCATED if r > 0], ["rate"])
# at rate 0: -1/2 and -1/12 of the series -r/2 - r^2/24
for what, value in [("log_density", mpf(0)), ("d:rate", mpf(-1) / 2), ("d2:rate:rate", mpf(-1) / 12)]:
    line("zero_truncated_poisson", what, dict(y=1, rate=0, exposure=1), value)


def truncated_mass(u, rate, exposure):
    return m.exp(truncated(mpf(u), rate, exposure))


tails("zero_truncated_poisson", truncated_mass, [
    dict(y=y, rate=r, exposure=e) for y, r, e in
    [(1, 1e-9, 1), (2, 1e-9, 1), (1, 0.5, 1), (2, 0.5, 1), (20, 0.5, 1), (1, 0.999, 1), (1, 1.0, 1), (3, 1.5, 1), (1, 20.0, 1), (10, 40.0, 1), (40, 40.0, 1),
     (120, 40.0, 1), (2, 300.0, 1), (6, 0.7, 4.0), (9800, 1e4, 1)]], 1)


# noncentral hypergeometric
def hypergeometric_weights(successes, failures, trials):
    low, high = int(max(0, trials - failures)), int(min(successes, trials))
    return low, [m.binomial(successes, u) * m.binomial(failures, trials - u) for u in range(low, high + 1)]


CACHE = {}


def hypergeometric(y, odds_ratio, trials, successes, failures):
    key = (successes, failures, trials, mp.prec)
    if key not in CACHE:
        CACHE[key] = hypergeometric_weights(successes, failures, trials)
    low, c = CACHE[key]
    v = int(y) - low
    lead = m.log(c[v]) + (v * m.log(odds_ratio) if v else 0)
    return lead - m.log(m.polyval(c[::-1], odds_ratio))


TABLES = [
    (5, 7, 6, 1.0), (5, 7, 6, 3.5), (5, 7, 9, 1e-3), (5, 7, 9, 1e4), (3, 2, 4, 0.7), (40, 30, 35, 1.0), (40, 30, 35, 0.05), (200, 1000, 30, 2.0),
    (200, 1000, 30, 1e-6), (1000, 800, 900, 1.2), (60, 5, 62, 6.0),
]
POINTS = [(5, 7, 6, 0, 0), (5, 7, 9, 0, 2), (3, 2, 4, 0, 2), (40, 30, 35, 0, 5)]
for s, f, n, w in TABLES:
    low, high = int(max(0, n - f)), int(min(s, n))
    POINTS += [(s, f, n, w, y) for y in sorted({low, (2 * low + high) // 3, (low + 2 * high) // 3, high})]
lines("hypergeometric", hypergeometric,
      [dict(y=y, odds_ratio=w, trials=n, successes=s, failures=f) for s, f, n, w, y in POINTS], ["odds_ratio"])


def central(y, s, f, n):
    return log_choose(s, y) + log_choose(f, n - y) - log_choose(s + f, n)


# all alike: large margins by gamma functions
for s, f, n, y in [(1e6, 2e6, 3e5, 100000), (1e6, 2e6, 3e5, 100700), (1e9, 1e9, 1e9, 500000000), (1e9, 1e9, 1e9, 500030000), (1e9, 3e9, 100, 30)]:
    line("hypergeometric", "log_density", dict(y=y, odds_ratio=1, trials=n, successes=s, failures=f), central(*map(mpf, (y, s, f, n))))


def hypergeometric_mass(u, odds_ratio, trials, successes, failures):
    low, c = hypergeometric_weights(successes, failures, trials)
    return c[u - low] * odds_ratio ** (u - low) / m.polyval(c[::-1], odds_ratio)


for s, f, n, w, y in [(5, 7, 6, 3.5, 0), (5, 7, 6, 3.5, 3), (5, 7, 9, 1e-3, 3), (5, 7, 9, 1e4, 4), (40, 30, 35, 1.0, 12), (40, 30, 35, 1.0, 30),
                      (40, 30, 35, 0.05, 5), (40, 30, 35, 0.05, 20), (200, 1000, 30, 2.0, 8), (60, 5, 62, 6.0, 58), (3, 2, 4, 0.7, 2)]:
    tails("hypergeometric", hypergeometric_mass, [dict(y=y, odds_ratio=w, trials=n, successes=s, failures=f)], int(max(0, n - f)))
