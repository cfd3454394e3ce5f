"""Writes special.tsv: reference values of the special functions and tail probabilities in src/math.

Every line is `function <tab> arguments separated by spaces <tab> value`. Arguments are doubles in their shortest decimal form,
and the value is that of the function at exactly that double, worked out by mpmath (tested with 1.3.0) in 60 or more
digits and printed with 25. Run `python3 special.py > special.tsv` with mpmath installed; the points come from fixed lists and a
seeded generator, so the file comes out the same.
"""
import random
from mpmath import mp, mpf, mpmathify, inf, ninf
import mpmath as m

mp.dps = 60
rng = random.Random(20261)


def row(name, args, value):
    print(name, " ".join(repr(float(a)) for a in args), m.nstr(value, 25), sep="\t")


def spread(low, high, count):
    """Doubles whose logarithm is uniform between two positive ends."""
    import math
    return [math.exp(rng.uniform(math.log(low), math.log(high))) for _ in range(count)]


def upper(x):
    """The upper tail of the standard normal, with digits to spare however far."""
    return m.erfc(x / m.sqrt(2)) / 2


def log_cdf(x):
    x = mpf(x)
    if x < -30:
        # Mills ratio by its continued fraction, from the far end: erfc itself underflows nothing in mpmath but loses digits.
        y, t = -x, mpf(0)
        for k in range(4000, 0, -1):
            t = k / (y + t)
        return -x * x / 2 - m.log(2 * m.pi) / 2 - m.log(y + t)
    if x > 0:
        with m.workdps(60 + (int(x * x / 4) if x < 100 else 0)):
            return m.log1p(-upper(x))
    return m.log(upper(-x))


def log_interval(a, b):
    """log(Phi(b) - Phi(a)) by quadrature of the density relative to its largest value, in 60 digits."""
    a, b = mpf(a), mpf(b)
    if a < 0 < b:
        with m.workdps(800):
            return m.log(m.erf(b / m.sqrt(2)) / 2 - m.erf(a / m.sqrt(2)) / 2) if b - a < 30 else m.log1p(-upper(b) - upper(-a))
    if b <= 0:
        a, b = -b, -a
    if b == inf:
        return log_cdf(-a)
    width = b - a
    # The integrand has fallen to 1e-60 after `reach`; cut there, in pieces the quadrature finds easy.
    reach = min(width, 140 / (a + 12))
    # In units of `reach`: the quadrature judges its error absolutely.
    pieces = [mpf(k) / 12 for k in range(13)]
    share = reach * m.quad(lambda v: m.exp(-a * v * reach - (v * reach) ** 2 / 2), pieces)
    return -a * a / 2 - m.log(2 * m.pi) / 2 + m.log(share)


def chi_upper(x, df):
    return m.gammainc(mpf(df) / 2, mpf(x) / 2, inf, regularized=True)


for x in [1e-300, 1e-10, 0.5, 1.0, 1.0000001, 1.4616321449683623, 1.9999999, 2.0, 3.5, 10.0, 1e3, 1e10, 1e300] + spread(1e-6, 1e6, 30):
    row("lgamma", [x], m.log(m.gamma(mpf(x))) if x < 1e6 else m.loggamma(mpf(x)))
for x in [-0.5, -1.5, -2.25, -10.9, -100.3]:
    row("lgamma", [x], m.log(abs(m.gamma(mpf(x)))))

digamma_points = [1e-300, 1e-8, 0.1, 1.0, 1.4616321449683623, 2.0, 9.999, 10.0, 100.5, 1e8, 1e300, -0.5, -0.504083008264455, -1e-9, -1.0000001, -7.999999999,
                  -10.25, -1000.75, -123456.789]
for x in digamma_points + spread(1e-4, 1e5, 30) + [-v for v in spread(1e-3, 1e4, 20)]:
    row("digamma", [x], m.psi(0, mpf(x)))
for order in [1, 2, 3, 4, 5, 8, 15, 20]:
    for x in [1e-12, 0.01, 1.0, 5.0, 9.99, 17.0, 40.5, 1e4, 1e9] + spread(1e-3, 1e3, 12):
        row("polygamma", [order, x], m.psi(order, mpf(x)))
    for x in [-0.5, -0.49999999, -1.5, -0.001, -0.9999, -3.25, -3.75, -20.5, -100.1] + [-v for v in spread(1e-2, 1e3, 8)]:
        # mpmath's reflection for negative arguments, with digits to spare near the poles.
        with m.workdps(120):
            row("polygamma", [order, x], m.psi(order, mpf(x)))
for order, x in [(50, 2.5), (120, 1.25), (120, 30.0), (170, 3.0), (200, 150.0)]:
    row("polygamma", [order, x], m.psi(order, mpf(x)))

for x in [-6.0, -2.5, -1e-5, 0.0, 1e-300, 1e-8, 0.3, 0.84375, 1.25, 3.0, 5.9] + [rng.uniform(-4, 4) for _ in range(15)]:
    row("erf", [x], m.erf(mpf(x)))
for x in [-6.0, -1.0, 0.0, 0.3, 0.84375, 1.25, 2.857, 6.0, 15.0, 26.0] + [rng.uniform(-3, 26) for _ in range(20)]:
    row("erfc", [x], m.erfc(mpf(x)))
cdf_points = [-37.5, -37.0, -30.0, -20.0, -8.0, -3.0, -1.0, -1e-9, 0.0, 0.5, 1.0, 3.0, 8.0] + [rng.uniform(-37, 5) for _ in range(30)]
for x in cdf_points:
    row("normal_cdf", [x], upper(-mpf(x)))
log_points = [-1e150, -1e8, -1e5, -99999.5, -1234.5, -100.0, -38.5, -37.0, -30.0, -25.000001, -25.0, -24.999999, -20.0, -8.0, -3.0, -1.0, -1e-9, 0.0, 1e-9, 0.49999,
              0.50001, 1.0, 3.0, 5.5, 8.0, 20.0, 37.0] + [rng.uniform(-60, 9) for _ in range(40)] + [-v for v in spread(1, 1e6, 20)]
for x in log_points:
    row("normal_log_cdf", [x], log_cdf(x))
    if x > -1e100:
        ratio = m.exp(-mpf(x) ** 2 / 2 - m.log(2 * m.pi) / 2 - log_cdf(x))
        row("inverse_mills", [x], ratio)
        row("inverse_mills_slope", [x], -ratio * (x + ratio))
for p in [5e-324, 1e-300, 1e-100, 1e-20, 1e-5, 0.001, 0.025, 0.2, 0.29, 0.3, 0.31, 0.45, 0.49999999, 0.5, 0.5000001, 0.75, 0.9, 0.975, 0.999999, 1 - 2.0 ** -53] + [
        rng.random() for _ in range(20)] + spread(1e-12, 0.1, 20):
    p_exact = mpf(p)
    start = m.sqrt(2) * m.erfinv(2 * p_exact - 1) if 1e-12 < p < 1 - 1e-12 else None
    if start is None:
        tail = p_exact if p < 0.5 else 1 - p_exact
        low, high = mpf(-40), mpf(-5)
        for _ in range(220):
            middle = (low + high) / 2
            if log_cdf(middle) < m.log(tail):
                low = middle
            else:
                high = middle
        start = low if p < 0.5 else -low
    row("normal_quantile", [p], start)

intervals = [(-inf, 0.0), (-inf, -40.0), (40.0, inf), (-inf, 3.0), (-3.0, inf), (-1.0, 1.0), (-1e-10, 2e-10), (-0.1, 0.0), (0.0, 1e-300), (0.0, 5.0),
             (1.0, 1.0 + 2.0 ** -52), (-30.0, -30.0 + 2.0 ** -47), (100.0, 100.0000001), (100.0, 200.0), (-1e5, -99999.0), (-1e5, -1e5 + 1e-6),
             (-1e5, -1e5 + 2e-11), (5.0, 5.19), (5.0, 5.2), (8.0, 9.0), (-9.0, 8.0), (-0.5, 40.0), (-6.0, 0.001), (-1e-3, 7.0), (-50.0, 50.0), (-38.0, -37.0), (0.67, 0.68),
             (-0.6745, 0.6745), (-0.67, 0.68), (-40.0, 1e-20), (1e-20, 3.0), (24.9, 25.1)]
for _ in range(60):
    a = rng.uniform(-12, 12)
    intervals.append((a, a + spread(1e-8, 10, 1)[0]))
for _ in range(20):
    a = -spread(10, 1e5, 1)[0]
    intervals.append((a, a + spread(1e-6, 10, 1)[0]))
for a, b in intervals:
    log_p = log_interval(a, b)
    row("normal_log_interval", [a, b], log_p)

for x in [-800.0, -745.0, -40.0, -1.0, -1e-9, 0.0, 1e-9, 0.7, 36.0, 37.0, 800.0] + [rng.uniform(-30, 30) for _ in range(15)]:
    row("log_logistic", [x], -m.log1p(m.exp(-mpf(x))))
    row("logistic", [x], 1 / (1 + m.exp(-mpf(x))))
for p in [1e-300, 1e-9, 0.1, 0.2499999, 0.25, 0.4, 0.49999999, 0.5, 0.50000001, 0.6, 0.75, 0.7500001, 0.999, 1 - 2.0 ** -53] + [rng.random() for _ in range(15)]:
    row("logit", [p], m.log(mpf(p) / (1 - mpf(p))))
for x in [1e-300, 1e-10, 0.1, 0.6931471, 0.69314719, 1.0, 30.0, 40.0, 740.0] + spread(1e-5, 50, 15):
    row("log1mexp", [x], m.log(-m.expm1(-mpf(x))) if x < 1 else m.log1p(-m.exp(-mpf(x))) if x < 100 else -m.exp(-mpf(x)))
for terms in [(0.0,), (-1000.0, -1001.0), (1000.0, 999.0, -5.0), (1e-3, -40.0), (0.0, -800.0), (3.0, 3.0, 3.0), (-1.5, 2.25, 0.125, -7.0, 2.0)]:
    row("log_sum_exp", terms, m.log(sum(m.exp(mpf(t)) for t in terms)))
for pairs in [(1.0, 0.0), (2.0, -3.0, 5.0, -2.5), (1e-3, 20.0, 1e3, 10.0), (0.25, -1000.0, 0.75, -1001.0), (0.0, 5.0, 1.0, 1.0), (0.3, 1.0, 0.3, 1.5, 0.4, -2.0)]:
    row("log_mix", pairs, m.log(sum(mpf(w) * m.exp(mpf(a)) for w, a in zip(pairs[::2], pairs[1::2]))))

for order in [0.0, 0.5, 1.0, 2.0, 3.7, 10.0, 25.5, 39.9, 40.0, 100.0, 333.25, 1000.0]:
    for x in [1e-8, 0.1, 1.0, 5.0, 20.0, 31.0, 39.99, 40.01, 77.0, 300.0, 650.0, 1500.0, 1e5, 1e8] + spread(0.01, 700, 6):
        if x > 3000:
            continue
        with m.workdps(60 + int(x / 2)):
            value = m.besseli(mpf(order), mpf(x))
        if mpf("1e-290") < value < mpf("1e300"):
            row("bessel_i", [order, x], value)
for order, x in [(1.0, -2.5), (2.0, -2.5), (-1.0, 3.0), (3.0, -50.0)]:
    row("bessel_i", [order, x], m.besseli(int(order), mpf(x)))

for df in [1.0, 2.0, 3.0, 5.0, 10.0, 37.0, 100.0, 1000.0, 1e5]:
    points = [1e-10 * df, 0.01 * df, 0.3 * df, 0.7 * df, 0.9 * df, df, 1.1 * df, 1.5 * df, 2 * df, 4 * df]
    if df <= 100:
        points += [30.0, 100.0, 400.0, 1000.0, 1300.0, 1400.0, 2000.0, 1e4, 1e6]
    for x in points:
        with m.workdps(80):
            p = chi_upper(x, df)
            if p > mpf("1e-300"):
                row("chi_square_upper", [x, df], p)
            row("chi_square_log10_upper", [x, df], m.log10(p) if p < mpf("0.5") else m.log1p(-m.gammainc(mpf(df) / 2, 0, mpf(x) / 2, regularized=True)) / m.log(10))
for z in [0.0, 1e-9, 0.5, 1.96, -3.0, 8.0, 20.0, 37.0, -38.0]:
    row("normal_two_sided", [z], 2 * upper(abs(mpf(z))))

# From here on points have a generator of their own, so that functions can be added at the end.
rng = random.Random(20262)


def deviance(x, mean):
    x, mean = mpf(x), mpf(mean)
    return mean if x == 0 else x * m.log(x / mean) - x + mean


for x, mean in [(0.0, 3.5), (1.0, 1.0), (1.0, 1.0 + 2.0 ** -52), (3.0, 2.9999999), (7.0, 3.5), (7.0, 14.0), (7.0, 13.999), (1e5, 1.001e5), (1e9, 1e9 + 1), (1e-8, 3.0),
                (50.0, 1e-8), (1e-200, 2e-200), (1e200, 1.2e200), (1e-300, 1e10), (1e300, 1e-10), (5e-324, 1.0), (0.5, 0.7071), (2.0, 4.001), (2.0, 1.0)]:
    row("deviance", [x, mean], deviance(x, mean))
for x in spread(1e-3, 1e6, 30):
    mean = x * float(m.exp(rng.uniform(-1, 1) * 10.0 ** -rng.uniform(0, 9)))
    row("deviance", [x, mean], deviance(x, mean))
for x in [1e-300, 1e-12, 1e-8, 1e-3, 0.25, 0.5, 1.0, 2.0, 3.0, 7.0, 8.0, 8.999999, 9.0, 10.0, 15.5, 100.0, 12345.0, 1e8, 1e15, 1e200] + spread(1e-4, 30, 15):
    with m.workdps(60 + (int(m.log10(x)) + 5 if x > 1 else 0)):
        row("factorial_remainder", [x], m.loggamma(mpf(x) + 1) - mpf(x) * m.log(x) + x)


def stirling_inverse_derivative(order, c):
    """By the derivatives of lgamma in closed form; 250 digits, as they cancel at small c."""
    with m.workdps(250):
        z = 1 / mpf(c)
        # mu and its derivatives in z, then by c with z' = -z^2
        d = [m.loggamma(z) - (z - 0.5) * m.log(z) + z - m.log(2 * m.pi) / 2, m.psi(0, z) - m.log(z) + 1 / (2 * z), m.psi(1, z) - 1 / z - 1 / (2 * z ** 2),
             m.psi(2, z) + 1 / z ** 2 + 1 / z ** 3]
        return [d[0], -d[1] * z ** 2, d[2] * z ** 4 + 2 * d[1] * z ** 3, -d[3] * z ** 6 - 6 * d[2] * z ** 5 - 6 * d[1] * z ** 4][order]


def log1p_over(order, w):
    """(-1)^m m! times the integral of t^m / (1 + w t)^(m+1): Gauss' hypergeometric function."""
    return (-1) ** order * m.factorial(order) / (order + 1) * m.hyp2f1(order + 1, order + 1, order + 2, -mpf(w))


def log1p_excess(order, w):
    return (-1) ** order * m.factorial(order) / (order + 2) * m.hyp2f1(order + 1, order + 2, order + 3, -mpf(w))


for order in range(4):
    for c in [1e-30, 1e-10, 1e-5, 0.01, 0.06, 0.0625, 0.0626, 0.066, 0.1, 0.2, 0.25, 0.5, 0.75, 1.0, 1.9999, 2.0, 2.0001, 3.0, 5.0, 10.0, 50.0, 1e3, 1e6, 1e10] + spread(1e-3, 20, 8):
        row("stirling_inverse", [order, c], stirling_inverse_derivative(order, c))
for order in range(5):
    for w in [0.0, 1e-300, 1e-10, -1e-10, 1e-4, -1e-4, 0.01, 0.1, 0.4999, 0.9999, 1.0, 1.0001, 2.0, 10.0, 1e4, 1e10, -0.1, -0.25, -0.4999, -0.5, -0.5001, -0.75, -0.9, -0.99, -0.999999,
              -1 + 1e-12] + [rng.uniform(-0.9, 2) for _ in range(6)]:
        row("log1p_over", [order, w], log1p_over(order, w))
        row("log1p_excess", [order, w], log1p_excess(order, w))


def shapes(f, *at):
    """Values and first and second derivatives of f in one or two shapes, {(i, j): value}, by central differences of values: the
    step 1e-40 in 190 digits leaves an error near 1e-60 of each."""
    h = mpf(10) ** -40
    at = [mpf(s) for s in at]
    if len(at) == 1:
        low, mid, high = f(at[0] - h * at[0]), f(at[0]), f(at[0] + h * at[0])
        k = h * at[0]
        return {0: mid, 1: (high - low) / (2 * k), 2: (high - 2 * mid + low) / k ** 2}
    a, b = at
    k, l = h * a, h * b
    v = {(s, t): f(a + s * k, b + t * l) for s in (-1, 0, 1) for t in (-1, 0, 1) if (s, t) not in ((1, -1), (-1, 1))}
    mid = v[0, 0]
    aa = (v[1, 0] - 2 * mid + v[-1, 0]) / k ** 2
    bb = (v[0, 1] - 2 * mid + v[0, -1]) / l ** 2
    # f(+,+) + f(-,-) - 2 f = k^2 aa + 2 k l ab + l^2 bb
    ab = (v[1, 1] + v[-1, -1] - 2 * mid - k ** 2 * aa - l ** 2 * bb) / (2 * k * l)
    return {(0, 0): mid, (1, 0): (v[1, 0] - v[-1, 0]) / (2 * k), (0, 1): (v[0, 1] - v[0, -1]) / (2 * l), (2, 0): aa, (1, 1): ab, (0, 2): bb}


def incomplete_gamma(a, x, upper):
    """log P or log Q by the ascending series, whose terms are all positive; the working precision covers a complement."""
    x = mpf(x)
    term = total = 1 / a
    n = 0
    while term > total * mpf(10) ** -m.mp.dps:
        n += 1
        term *= x / (a + n)
        total += term
    p = m.exp(a * m.log(x) - x - m.loggamma(a)) * total
    return m.log(1 - p) if upper else m.log(p)


gamma_points = [(1e-8, x) for x in [1e-300, 1e-8, 0.1, 1.0, 1.4999, 1.5001, 5.0, 40.0, 300.0]]
gamma_points += [(1e-3, x) for x in [1e-200, 1e-3, 0.7, 1.6, 20.0]] + [(0.3, x) for x in [1e-30, 0.01, 0.3, 1.2, 2.5, 60.0]]
gamma_points += [(0.9999, 0.5), (1.0, 0.5), (1.0001, 1.9), (1.0, 3.0), (1.0, 200.0), (2.5, 1e-100), (2.5, 0.01), (2.5, 3.4999), (2.5, 3.5001), (2.5, 9.0), (2.5, 700.0)]
for a in [20.0, 99.9, 100.0, 101.5, 1000.0, 12345.0, 1e6]:
    gamma_points += [(a, a + z * a ** 0.5) for z in [-37.0, -8.0, -2.0, -0.1, 0.0, 0.1, 1.0, 3.0, 9.0, 37.0] if a + z * a ** 0.5 > 0]
gamma_points += [(200.0, 1e-3), (200.0, 1.0), (150.0, 900.0), (50.0, 1e-5), (50.0, 600.0)]
gamma_points += [(a, a * float(m.exp(rng.uniform(-1, 1) / (1 + a) ** 0.3))) for a in spread(0.01, 300, 20)]
for a, x in gamma_points:
    for upper, name in [(False, "gamma_log_cdf"), (True, "gamma_log_survival")]:
        # digits that the complement loses: those of exp(-deviance)
        lost = int((a * m.log(a / mpf(x)) - a + x) / 2.3) + 20 if (x > a) == upper else 20
        with m.workdps(190 + lost):
            values = shapes(lambda s: incomplete_gamma(s, x, upper), a)
        for order in range(3):
            row(name, [order, a, x], values[order])


def incomplete_beta(a, b, x, y, rest):
    """log I_x(a, b), or log of 1 less it, by the series x^a y^b / (a B) (1 + (a+b)/(a+1) x + ...), all terms positive."""
    if x > 0.5:
        return incomplete_beta(b, a, y, x, not rest)
    term = total = 1 / a
    n = 0
    while term > total * mpf(10) ** -m.mp.dps:
        term *= (a + b + n) / (a + 1 + n) * x
        total += term
        n += 1
    p = m.exp(a * m.log(x) + b * m.log(y) + m.loggamma(a + b) - m.loggamma(a) - m.loggamma(b)) * total
    return m.log(1 - p) if rest else m.log(p)


beta_points = []
for a, b in [(1e-8, 1e-8), (1e-8, 1.0), (1e-8, 50.0), (2.0, 1e-8), (1e-3, 0.2), (0.5, 0.5), (0.3, 3.0), (1.0, 1.0), (2.5, 0.7), (5.0, 7.0), (0.9, 400.0), (3.0, 1e4), (1e4, 0.4), (60.0, 90.0)]:
    beta_points += [(a, b, x) for x in [1e-12, 1e-3, 0.1, 0.5, 0.75, 0.999]]
    beta_points += [(a, b, a / (a + b) * 1.0001)] if a > 1e-5 and b > 1e-5 else []
for a, b in [(99.0, 300.0), (100.0, 100.0), (150.0, 101.0), (1000.0, 3000.0), (1e4, 1e4), (1e4, 300.0), (1e4, 90.0)]:
    centre, width = a / (a + b), (a * b / (a + b) ** 3) ** 0.5
    beta_points += [(a, b, centre + z * width) for z in [-35.0, -8.0, -2.0, -0.1, 0.0, 0.1, 1.0, 4.0, 9.0, 30.0] if 0 < centre + z * width < 1]
beta_points += [(a, b, rng.random()) for a, b in zip(spread(0.05, 50, 20), spread(0.05, 50, 20))]
for a, b, x in beta_points:
    if x >= 1:
        continue
    y = 1.0 - x
    # beside the rounding of y, which the function is handed as it is, x + y = 1 in the series
    with m.workdps(400):
        # digits that a complement may lose
        c = mpf(a) / (mpf(a) + b)
        lost = int((a * m.log(c / x) + b * m.log((1 - c) / (1 - mpf(x)))) / 2.3) + 40
    if lost > 700:
        # the complement of so small a probability would take its time, and says nothing new
        continue
    with m.workdps(190 + lost):
        values = shapes(lambda s, t: incomplete_beta(s, t, mpf(x), 1 - mpf(x), False), a, b)
    for (i, j), value in values.items():
        row("beta_log_cdf", [i, j, a, b, x, y], value)


for x in [0.0, 1e-300, 1e-10, 1e-3, 0.5, 1.0, 2.0, 5.0, 10.0, 19.99, 20.0, 20.01, 25.0, 30.0, 39.99, 40.0, 40.01, 100.0, 700.0, 720.0, 3000.0, -2.5] + spread(0.01, 1000, 12):
    with m.workdps(70 + int(abs(x) / 2)):
        ratio = m.besseli(1, mpf(x)) / m.besseli(0, mpf(x))
        row("log_bessel_i0", [x], m.log(m.besseli(0, mpf(x))))
        row("log_bessel_i0_scaled", [x], m.log(m.besseli(0, mpf(x))) - abs(mpf(x)))
        row("bessel_ratio", [x], ratio)
        row("bessel_ratio_slope", [x], 1 - ratio / x - ratio ** 2 if x else mpf("0.5"))
