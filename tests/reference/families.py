"""Writes families.tsv: reference values of the continuous families.

Every line is `family <tab> what <tab> arguments <tab> value`, what being log_density, below or above (logarithms of the distribution
function and of the survival function), d:PARAMETER or d2:PARAMETER:PARAMETER (derivatives of the log density). Arguments
are doubles in their shortest decimal form; the value is that at exactly those doubles, worked out by mpmath in 60 digits from the
textbook formula (not the form the program computes) and printed with 25. Run `python3 families.py > families.tsv` with mpmath
installed; the points are fixed lists and a seeded generator, so the file comes out the same.
"""
import random
import mpmath as m
from mpmath import mp, mpf, inf

mp.dps = 60
rng = random.Random(20263)
LOWEST = -690  # log of the smallest probability asked for: 1e-300


def phi(z):
    """Standard normal distribution function, its digits kept in both tails."""
    return m.erfc(-z / m.sqrt(2)) / 2


def log_of(p, q):
    """log p, given its complement q as well."""
    return m.log(p) if p < mpf("0.5") else m.log1p(-q)


def reduced(z, shape):
    return z if shape == 0 else m.log1p(shape * z) / shape


# name: (parameters, log density, (below, above) or None) as functions of y and the parameters
def lognormal(y, mean, sd):
    return -m.log(y) - m.log(sd) - ((m.log(y) - mean) / sd) ** 2 / 2 - m.log(2 * m.pi) / 2


def logistic(y, location, scale):
    z = (y - location) / scale
    return -m.log(scale) - z - 2 * m.log1p(m.exp(-z))


def laplace(y, location, scale):
    return -m.log(2 * scale) - abs(y - location) / scale


def student_t(y, location, scale, df):
    z = (y - location) / scale
    return (m.loggamma((df + 1) / 2) - m.loggamma(df / 2) - m.log(df * m.pi) / 2 - m.log(scale)
            - (df + 1) / 2 * m.log1p(z * z / df))


def t_tail(z, df):
    """P(T > z), z >= 0."""
    return beta_integral(df / 2, mpf(1) / 2, df / (df + z * z), z * z / (df + z * z)) / 2


def student_cdf(y, location, scale, df):
    z = (y - location) / scale
    p = t_tail(abs(z), df)
    return (p, 1 - p) if z < 0 else (1 - p, p)


def cauchy(y, location, scale):
    return -m.log(m.pi * scale) - m.log1p(((y - location) / scale) ** 2)


def cauchy_cdf(y, location, scale):
    z = (y - location) / scale
    p = m.atan2(1, abs(z)) / m.pi
    return (p, 1 - p) if z < 0 else (1 - p, p)


def gumbel(y, location, scale):
    z = (y - location) / scale
    return -m.log(scale) - z - m.exp(-z)


def gumbel_cdf(y, location, scale):
    e = m.exp(-(y - location) / scale)
    return m.exp(-e), -m.expm1(-e)


def gumbel_smallest(y, location, scale):
    return gumbel(-y, -location, scale)


def gev(y, location, scale, shape):
    s = reduced((y - location) / scale, shape)
    return -m.log(scale) - (1 + shape) * s - m.exp(-s)


def gev_cdf(y, location, scale, shape):
    z = (y - location) / scale
    if 1 + shape * z <= 0:
        return (mpf(1), mpf(0)) if shape < 0 else (mpf(0), mpf(1))
    e = m.exp(-reduced(z, shape))
    return m.exp(-e), -m.expm1(-e)


def gamma(y, shape, scale):
    return (shape - 1) * m.log(y) - y / scale - shape * m.log(scale) - m.loggamma(shape)


def gamma_cdf(y, shape, scale):
    x = y / scale
    with m.workdps(80):
        if x < shape:
            p = m.gammainc(shape, 0, x, regularized=True)
            return p, 1 - p
        q = m.gammainc(shape, x, inf, regularized=True)
        return 1 - q, q


def weibull(y, shape, scale):
    return m.log(shape) - m.log(scale) + (shape - 1) * m.log(y / scale) - (y / scale) ** shape


def weibull_cdf(y, shape, scale):
    e = (y / scale) ** shape
    return -m.expm1(-e), m.exp(-e)


def inverse_gaussian(y, mean, shape):
    return m.log(shape / (2 * m.pi * y ** 3)) / 2 - shape * (y - mean) ** 2 / (2 * mean ** 2 * y)


def inverse_gaussian_cdf(y, mean, shape):
    # the two terms cancel in the upper tail, and the second overflows doubles but not these
    with m.workdps(400):
        root = m.sqrt(shape / y)
        second = m.exp(2 * shape / mean) * phi(-root * (y / mean + 1))
        return phi(root * (y / mean - 1)) + second, phi(-root * (y / mean - 1)) - second


def log_logistic(y, shape, scale):
    x = (y / scale) ** shape
    return m.log(shape / y) + m.log(x) - 2 * m.log1p(x)


def log_logistic_cdf(y, shape, scale):
    x = (y / scale) ** shape
    return x / (1 + x), 1 / (1 + x)


def pareto(y, shape, minimum):
    return m.log(shape) + shape * m.log(minimum) - (shape + 1) * m.log(y)


def pareto_cdf(y, shape, minimum):
    q = (minimum / y) ** shape
    return 1 - q, q


def generalised_pareto(y, scale, shape, threshold):
    return -m.log(scale) - (1 + shape) * reduced((y - threshold) / scale, shape)


def generalised_pareto_cdf(y, scale, shape, threshold):
    z = (y - threshold) / scale
    if 1 + shape * z <= 0:
        return mpf(1), mpf(0)
    s = reduced(z, shape)
    return -m.expm1(-s), m.exp(-s)


def beta(y, mean, precision):
    a, b = mean * precision, (1 - mean) * precision
    return m.loggamma(precision) - m.loggamma(a) - m.loggamma(b) + (a - 1) * m.log(y) + (b - 1) * m.log1p(-y)


def beta_integral(a, b, x, y):
    """Regularised incomplete beta function by its continued fraction (modified Lentz), x below the mean; else by the complement."""
    if x > (a + 1) / (a + b + 2):
        return 1 - beta_integral(b, a, y, x)
    tiny = mpf(10) ** -300
    c, d = mpf(1), 1 - (a + b) * x / (a + 1)
    d = 1 / (d if d else tiny)
    h = d
    for k in range(1, 200000):
        e = k * (b - k) * x / ((a + 2 * k - 1) * (a + 2 * k))
        d = 1 / (1 + e * d)
        c = 1 + e / c
        h *= d * c
        e = -(a + k) * (a + b + k) * x / ((a + 2 * k) * (a + 2 * k + 1))
        d = 1 / (1 + e * d)
        c = 1 + e / c
        h *= d * c
        if abs(d * c - 1) < mpf(10) ** -(mp.dps - 5):
            break
    front = m.exp(a * m.log(x) + b * m.log(y) + m.loggamma(a + b) - m.loggamma(a) - m.loggamma(b))
    return front * h / a


def beta_cdf(y, mean, precision):
    a, b = mean * precision, (1 - mean) * precision
    if y <= (a + 1) / (a + b + 2):
        p = beta_integral(a, b, y, 1 - y)
        return p, 1 - p
    q = beta_integral(b, a, 1 - y, y)
    return 1 - q, q


def rayleigh(y, scale):
    return m.log(y) - 2 * m.log(scale) - y * y / (2 * scale ** 2)


def rayleigh_cdf(y, scale):
    e = y * y / (2 * scale ** 2)
    return -m.expm1(-e), m.exp(-e)


def half_normal(y, sd):
    return m.log(2) / 2 - m.log(m.pi) / 2 - m.log(sd) - (y / sd) ** 2 / 2


def half_normal_cdf(y, sd):
    return m.erf(y / sd / m.sqrt(2)), m.erfc(y / sd / m.sqrt(2))


def von_mises(y, mean, concentration):
    return concentration * m.cos(y - mean) - m.log(2 * m.pi * m.besseli(0, concentration))


def normal(y, mean, sd):
    return -m.log(sd) - ((y - mean) / sd) ** 2 / 2 - m.log(2 * m.pi) / 2


def exponential(y, rate):
    return m.log(rate) - rate * y


def location_scale(cdf):
    return lambda y, location, scale: cdf((y - location) / scale)


def normal_pair(z):
    return phi(z), phi(-z)


# points: (parameters, responses); the first sets are everyday ones, the later ones extreme
REAL = [
    (dict(location=0.2, scale=3.0), [-40.5, -7.0, -0.1, 0.2, 0.75, 3.5, 9.25, 60.0]),
    (dict(location=-12.5, scale=0.04), [-13.5, -12.55, -12.5, -12.47, -12.0]),
    (dict(location=1000.25, scale=12.0), [700.0, 990.0, 1000.0, 1003.5, 1060.0, 1700.0]),
    (dict(location=1e-3, scale=1e-5), [0.0, 0.00098, 0.001, 0.00103, 0.0013]),
    (dict(location=-3e5, scale=2e4), [-9e5, -3.2e5, -3e5, -2.9e5, 1e5]),
]
POSITIVE = [0.002, 0.3, 0.9, 1.0, 2.25, 7.5, 40.0]
SETS = {
    "normal": (normal, location_scale(normal_pair), [(dict(mean=p["location"], sd=p["scale"]), y) for p, y in REAL]),
    "lognormal": (lognormal, lambda y, mean, sd: normal_pair((m.log(y) - mean) / sd), [
        (dict(mean=0.3, sd=1.2), POSITIVE), (dict(mean=-2.0, sd=0.05), [0.11, 0.1353, 0.14, 0.17]), (dict(mean=8.5, sd=2.0), [1e-3, 12.0, 4915.0, 1e5, 1e9]),
        (dict(mean=0.0, sd=9.0), [1e-100, 1e-20, 1.0, 1e30, 1e120]), (dict(mean=600.0, sd=3.0), [1e255, 1e260, 1e265, 1e268])]),
    "logistic": (logistic, location_scale(lambda z: (1 / (1 + m.exp(-z)), 1 / (1 + m.exp(z)))), REAL + [(dict(location=0.0, scale=1.0), [-650.0, -35.0, 38.0, 680.0])]),
    "laplace": (laplace, location_scale(lambda z: (m.exp(-abs(z)) / 2, 1 - m.exp(-abs(z)) / 2) if z < 0 else (1 - m.exp(-abs(z)) / 2, m.exp(-abs(z)) / 2)),
                [(p, [v for v in y if v != p["location"]]) for p, y in REAL] + [(dict(location=0.0, scale=1.0), [-650.0, -1e-9, 1e-12, 38.0, 680.0])]),
    "student_t": (student_t, student_cdf, [
        (dict(location=0.2, scale=3.0, df=4.5), [-400.0, -7.0, 0.2, 0.20001, 0.22, 0.75, 9.25, 5000.0]), (dict(location=-12.5, scale=0.04, df=1.0), [-90.0, -12.6, -12.47, 3e5]),
        (dict(location=0.0, scale=1.0, df=0.2), [-1e30, -3.0, 1e-4, 0.004, 2.0, 1e12]), (dict(location=50.0, scale=2.0, df=30.0), [20.0, 49.0, 51.0, 80.0]),
        (dict(location=0.0, scale=1.0, df=1000.0), [-25.0, -2.0, 0.5, 4.0]), (dict(location=0.0, scale=1.0, df=2.5e5), [-30.0, -2.0, 0.5, 4.0]),
        (dict(location=0.0, scale=1.0, df=1e9), [-9.0, -1.5, 0.25, 6.0])]),
    "cauchy": (cauchy, cauchy_cdf, REAL + [(dict(location=0.0, scale=1.0), [-1e100, -1e15, -1.0, 1.0, 1e-9, 1e60])]),
    "gumbel": (gumbel, gumbel_cdf, [(p, [v for v in y if v > p["location"] - 6 * p["scale"]]) for p, y in REAL] + [(dict(location=0.0, scale=1.0), [-6.0, -5.5, 29.0, 31.0, 37.0, 600.0])]),
    "gumbel_smallest": (gumbel_smallest, lambda y, location, scale: gumbel_cdf(-y, -location, scale)[::-1],
                        [(p, [v for v in y if v < p["location"] + 6 * p["scale"]]) for p, y in REAL] + [(dict(location=0.0, scale=1.0), [6.0, 5.5, -29.0, -31.0, -37.0, -600.0])]),
    "gev": (gev, gev_cdf, [
        (dict(location=20.0, scale=5.0, shape=0.2), [1.0, 8.0, 20.0, 31.0, 200.0, 1e6]), (dict(location=20.0, scale=5.0, shape=-0.3), [3.0, 12.0, 20.0, 33.0, 36.5]),
        (dict(location=0.0, scale=1.0, shape=0.0), [-4.0, -1.0, 0.0, 2.5, 40.0]), (dict(location=0.0, scale=1.0, shape=1e-9), [-4.0, -1.0, 0.5, 2.5, 40.0]),
        (dict(location=0.0, scale=1.0, shape=-1e-4), [-4.0, -1.0, 0.5, 2.5, 40.0]), (dict(location=3.0, scale=0.1, shape=1.8), [2.96, 3.0, 3.5, 1e8]), (dict(location=0.0, scale=2.0, shape=-0.49), [-8.0, 0.1, 4.0, 4.08])]),
    "exponential": (exponential, lambda y, rate: (-m.expm1(-rate * y), m.exp(-rate * y)), [
        (dict(rate=0.7), [0.0, 1e-12, 0.01, 1.0, 3.5, 60.0, 900.0]), (dict(rate=3e-6), [0.5, 1e4, 3e5, 2e6, 1e8]), (dict(rate=250.0), [1e-9, 0.004, 0.02, 0.5, 2.5]),
        (dict(rate=1.0), [1e-300, 1e-20, 0.5, 1.0, 2.0, 37.0, 40.0, 680.0])]),
    "gamma": (gamma, gamma_cdf, [
        (dict(shape=2.5, scale=3.0), POSITIVE + [300.0]), (dict(shape=0.3, scale=1.0), [1e-30, 1e-4, 0.2, 1.5, 30.0]), (dict(shape=0.01, scale=2.0), [1e-200, 1e-10, 0.5, 20.0]),
        (dict(shape=120.0, scale=0.25), [18.0, 29.0, 30.5, 45.0]), (dict(shape=1e4, scale=1e-3), [9.5, 10.0, 10.05, 10.6]), (dict(shape=1.5e6, scale=2.0), [2.99e6, 3e6, 3.002e6]),
        (dict(shape=1.0, scale=1.0), [0.1, 1.0, 650.0])]),
    "weibull": (weibull, weibull_cdf, [
        (dict(shape=1.7, scale=3.0), POSITIVE), (dict(shape=0.4, scale=20.0), [1e-30, 0.01, 5.0, 80.0, 1e5]), (dict(shape=25.0, scale=410.0), [250.0, 390.0, 410.5, 440.0, 500.0]),
        (dict(shape=1.0, scale=1.0), [1e-200, 1e-14, 0.3, 2.0, 600.0]), (dict(shape=6.0, scale=1e6), [1e-30, 2e5, 9.9e5, 2e6])]),
    "inverse_gaussian": (inverse_gaussian, inverse_gaussian_cdf, [
        (dict(mean=2.0, shape=3.0), [0.02, 0.3, 0.9, 2.0, 7.5, 40.0]), (dict(mean=1.0, shape=400.0), [0.6, 0.95, 1.0, 1.08, 2.0]), (dict(mean=50.0, shape=0.5), [0.002, 0.1, 3.0, 90.0, 2000.0]),
        (dict(mean=1.0, shape=1e5), [0.95, 0.999, 1.0, 1.01]), (dict(mean=1e-3, shape=2e-3), [2e-5, 8e-4, 1e-3, 9e-3]), (dict(mean=3e4, shape=1e5), [900.0, 2e4, 5e4, 4e5])]),
    "log_logistic": (log_logistic, log_logistic_cdf, [
        (dict(shape=1.7, scale=3.0), POSITIVE), (dict(shape=0.4, scale=20.0), [1e-30, 0.01, 5.0, 80.0, 1e9]), (dict(shape=25.0, scale=410.0), [30.0, 390.0, 410.5, 440.0, 5000.0]),
        (dict(shape=1.0, scale=1.0), [1e-200, 1e-14, 0.3, 2.0, 1e14]), (dict(shape=6.0, scale=1e6), [1e-30, 2e5, 9.9e5, 2e6])]),
    "pareto": (pareto, pareto_cdf, [
        (dict(shape=2.5, minimum=1.5), [1.5, 1.5000001, 1.6, 3.0, 40.0, 1e20]), (dict(shape=0.05, minimum=10.0), [10.0, 10.5, 1e3, 1e50, 1e200]), (dict(shape=300.0, minimum=1e6), [1e6, 1000000.5, 1002000.0, 1.1e6, 3e6]),
        (dict(shape=1.0, minimum=1e-8), [1.0000001e-8, 2e-8, 1e-3, 1.0, 1e30]), (dict(shape=7.0, minimum=100.0), [100.0, 100.25, 120.0, 180.0, 1e4, 1e30])]),
    "generalised_pareto": (generalised_pareto, generalised_pareto_cdf, [
        (dict(scale=5.0, shape=0.2, threshold=20.0), [20.0, 20.001, 24.0, 60.0, 1e7]), (dict(scale=5.0, shape=-0.3, threshold=0.0), [0.0, 1e-9, 4.0, 12.0, 16.6]),
        (dict(scale=1.0, shape=0.0, threshold=0.0), [0.0, 0.2, 2.5, 38.0, 650.0]), (dict(scale=1.0, shape=1e-9, threshold=-1.0), [-1.0, -0.9, 2.5, 38.0]),
        (dict(scale=1.0, shape=-1e-4, threshold=0.0), [0.1, 0.9, 2.5, 38.0]), (dict(scale=0.1, shape=1.8, threshold=3.0), [3.0, 3.05, 4.0, 1e9]), (dict(scale=2.0, shape=-0.49, threshold=0.0), [0.1, 2.0, 4.0, 4.08])]),
    "beta": (beta, beta_cdf, [
        (dict(mean=0.3, precision=8.0), [1e-6, 0.01, 0.2, 0.3, 0.55, 0.9, 0.99999]), (dict(mean=0.5, precision=0.5), [1e-100, 1e-9, 0.1, 0.5, 0.875]), (dict(mean=0.02, precision=3.0), [1e-200, 1e-12, 0.004, 0.3]),
        (dict(mean=0.75, precision=400.0), [0.5, 0.71, 0.75, 0.8, 0.9]), (dict(mean=0.0001, precision=1e4), [1e-9, 1e-5, 1e-4, 4e-4, 2e-3]), (dict(mean=0.25, precision=2e4), [0.22, 0.248, 0.25, 0.26])]),
    "rayleigh": (rayleigh, rayleigh_cdf, [
        (dict(scale=1.3), [1e-9, 0.01, 0.4, 1.3, 2.5, 9.0, 45.0]), (dict(scale=4e-5), [1e-9, 2e-5, 4e-5, 1.1e-4, 9e-4]), (dict(scale=7e4), [1.0, 3e3, 7.1e4, 2e5, 2.5e6]), (dict(scale=1.0), [1e-150, 1e-20, 0.1, 1.0, 1.177, 8.0, 36.0]),
        (dict(scale=1e-3), [1e-5, 1e-3, 0.01])]),
    "half_normal": (half_normal, half_normal_cdf, [
        (dict(sd=1.3), [0.0, 1e-9, 0.01, 0.4, 1.3, 2.5, 9.0, 45.0]), (dict(sd=4e-5), [0.0, 1e-9, 2e-5, 4e-5, 1.1e-4, 9e-4]), (dict(sd=7e4), [1.0, 3e3, 7.1e4, 2e5, 2.5e6]), (dict(sd=1.0), [1e-150, 0.1, 1.0, 8.0, 36.0]),
        (dict(sd=1e-3), [1e-5, 1e-3, 0.01])]),
    "von_mises": (von_mises, None, [
        (dict(mean=0.5, concentration=2.0), [-3.0, -1.0, 0.5, 0.7, 2.0, 3.1, 9.0]), (dict(mean=-7.0, concentration=0.01), [-3.0, 0.0, 0.3, 3.0]), (dict(mean=0.0, concentration=0.0), [-3.0, 0.0, 1.0, 3.0]),
        (dict(mean=3.1, concentration=40.0), [-3.1, -2.5, 0.1, 2.9, 3.2]), (dict(mean=1.0, concentration=900.0), [-2.0, 0.9, 0.98, 1.0, 1.1]), (dict(mean=0.0, concentration=1e-8), [0.1, 2.0])]),
}
KNOWN = {"minimum", "threshold"}


def line(name, what, y, parameters, value):
    arguments = " ".join(f"{k}={float(v)!r}" for k, v in [("y", y), *parameters.items()])
    print(name, what, arguments, m.nstr(value, 25), sep="\t")


def derivative(f, parameters, by):
    """By differences in many digits, one-sided where the other side has no density."""
    names = list(parameters)
    orders = tuple(by.count(n) for n in names)

    def g(*x):
        return f(**dict(zip(names, x)))
    at = tuple(mpf(parameters[n]) for n in names)
    with m.workdps(150):
        scale = min([abs(a) for a in at if a] + [mpf(1)])
        return m.diff(g, at, orders, h=scale * mpf(10) ** -50, direction=1 if parameters.get("concentration") == 0.0 else 0)


for name in sorted(SETS):
    density, cdf, sets = SETS[name]
    for parameters, responses in sets:
        exact = {k: mpf(v) for k, v in parameters.items()}
        free = [k for k in parameters if k not in KNOWN]
        for i, y in enumerate(responses):
            with m.workdps(100):
                line(name, "log_density", y, parameters, density(mpf(y), **exact))
            if cdf is not None:
                with m.workdps(100):
                    p, q = cdf(mpf(y), *exact.values())
                    if p > 0 and (v := log_of(p, q)) > LOWEST:
                        line(name, "below", y, parameters, v)
                    if q > 0 and (v := log_of(q, p)) > LOWEST:
                        line(name, "above", y, parameters, v)
            if name == "von_mises" and parameters["concentration"] == 0.0:
                continue
            f = lambda **x: density(mpf(y), **x)
            for a, one in enumerate(free):
                line(name, f"d:{one}", y, parameters, derivative(f, parameters, [one]))
                for two in free[a:]:
                    line(name, f"d2:{one}:{two}", y, parameters, derivative(f, parameters, [one, two]))
