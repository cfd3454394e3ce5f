"""High-precision answers for the cases of ../cases: `python3 solve.py [NAME ...]` fills in each file's "expect".

Shares nothing with the program: derivatives by sympy, Newton on the Lagrangian and all linear algebra by mpmath at 50
digits. The multipliers are checked by solving again with a right-hand side moved by 1e-20 and taking the slope.
A case may say "dropped" (indices of redundant tested restrictions), "edges" and "edges_unrestricted" (parameters held
on an end of their range, {name: value}), "unrestricted": false (no such fit is to be compared).
"""
import json, pathlib, re, sys
import mpmath as mp
import sympy as sp

mp.mp.dps = 50
CASES = pathlib.Path(__file__).resolve().parent.parent / "cases"
KNOWN = {"lgamma": sp.loggamma, "normal_cdf": lambda x: sp.erfc(-x / sp.sqrt(2)) / 2, "logistic": lambda x: 1 / (1 + sp.exp(-x))}


def parse(text, symbols):
    names = {**{s.name: s for s in symbols}, **KNOWN}
    return sp.sympify(text.replace("^", "**"), locals=names, rational=True)


def equation(text, symbols):
    left, right = text.split("=")
    return parse(left, symbols) - parse(right, symbols)


class Functions:
    """Value, gradient and Hessian of an expression in theta and the columns, as functions of numbers."""

    def __init__(self, e, theta, columns):
        g = [sp.diff(e, t) for t in theta]
        entries = [e] + g + [sp.diff(a, t) for i, a in enumerate(g) for t in theta[: i + 1]]
        self.n, self.call = len(theta), sp.lambdify(list(theta) + list(columns), entries, "mpmath", cse=True)

    def at(self, theta, row=()):
        v = self.call(*theta, *row)
        g = mp.matrix(v[1 : self.n + 1])
        h, k = mp.matrix(self.n, self.n), self.n + 1
        for i in range(self.n):
            for j in range(i + 1):
                h[i, j] = h[j, i] = v[k]
                k += 1
        return mp.mpf(v[0]), g, h


def null_space(a, n):
    if a.rows == 0:
        return mp.eye(n)
    q, _ = mp.qr(a.T, mode="full")
    return q[:, a.rows :]


class Case:
    def __init__(self, case):
        self.case = case
        self.theta = [sp.Symbol(p["name"]) for p in case["parameters"]]
        self.n = len(self.theta)
        columns = case.get("columns") or {"one": [1]}
        weight = case.get("weight")
        self.names = [c for c in columns if c != weight]
        symbols = [sp.Symbol(c) for c in self.names]
        number = lambda x: mp.mpf(str(x))
        self.rows = [[number(x) for x in r] for r in zip(*(columns[c] for c in self.names))]
        self.weights = [number(w) for w in columns[weight]] if weight else [mp.mpf(1)] * len(self.rows)
        every = list(self.theta) + symbols
        density = parse(case["log_density"], every)
        self.density = Functions(density, self.theta, symbols)
        self.start = mp.matrix([number(p["start"]) for p in case["parameters"]])
        one = lambda t: Functions(equation(t, self.theta), self.theta, [])
        self.maintained = [one(t) for t in case["maintained"]]
        self.kept = [i for i in range(len(case["tested"])) if i not in case.get("dropped", [])]
        self.tested = [one(case["tested"][i]) for i in self.kept]
        # Expected information of one row, if the case says how.
        how = case.get("information") or {}
        self.entries = None
        if "entries" in how:
            m = [[sp.Integer(0)] * self.n for _ in range(self.n)]
            place = {t.name: i for i, t in enumerate(self.theta)}
            for key, text in how["entries"].items():
                a, b = key.split(",")
                m[place[a]][place[b]] = m[place[b]][place[a]] = parse(text, every)
            self.entries = sp.lambdify(every, [x for r in m for x in r], "mpmath")
        self.outcomes = how.get("outcomes")
        if self.outcomes:
            support = how["support"]
            if support == "one of them":
                k = len(self.outcomes)
                support = [[int(i == j) for j in range(k)] for i in range(k)]
            self.support = [[mp.mpf(x) for x in r] for r in support]

    def held(self, edges):
        """Restrictions that hold parameters on their ends."""
        return [Functions(t - sp.sympify(str(edges[t.name]), rational=True), self.theta, []) for t in self.theta if t.name in edges]

    def likelihood(self, theta):
        l, g, h = mp.mpf(0), mp.matrix(self.n, 1), mp.matrix(self.n, self.n)
        for row, w in zip(self.rows, self.weights):
            if w != 0:
                a, b, c = self.density.at(theta, row)
                l, g, h = l + w * a, g + w * b, h + w * c
        return l, g, h

    def expected(self, theta):
        out = mp.matrix(self.n, self.n)
        for row, w in zip(self.rows, self.weights):
            if self.entries:
                v = self.entries(*theta, *row)
                for i in range(self.n):
                    for j in range(self.n):
                        out[i, j] += w * v[i * self.n + j]
            else:
                at = [self.names.index(o) for o in self.outcomes]
                for s in self.support:
                    r = list(row)
                    for k, x in zip(at, s):
                        r[k] = x
                    l, g, _ = self.density.at(theta, r)
                    out += w * mp.exp(l) * g * g.T
        return out

    def near(self, restrictions, start):
        """A point near the maximum in double precision, by sequential quadratic programming (scipy)."""
        from scipy.optimize import minimize

        def reach(p):
            ends = [float(x) for x in p["range"].strip("[]()").split(",")]
            return [x if abs(x) == float("inf") else x + d for x, d in zip(ends, (1e-9, -1e-9))]

        vector = lambda t: mp.matrix([mp.mpf(float(x)) for x in t])
        flat = lambda m: [float(x) for x in m]
        down = lambda t: (lambda v: (-float(v[0]), [-x for x in flat(v[1])]))(self.likelihood(vector(t)))
        bound = [{"type": "eq", "fun": lambda t, f=f: float(f.at(vector(t))[0]), "jac": lambda t, f=f: flat(f.at(vector(t))[1])} for f in restrictions]
        found = minimize(down, flat(start), jac=True, bounds=[reach(p) for p in self.case["parameters"]], constraints=bound, method="SLSQP", options={"maxiter": 500, "ftol": 1e-13})
        return vector(found.x)

    def solve(self, restrictions, start, shift=None):
        """The strict maximum near the start: (theta, multipliers, l)."""
        try:
            found = self.newton(restrictions, start, shift)
            if self.maximum(restrictions, found):
                return found
        except (ZeroDivisionError, ArithmeticError, RuntimeError):
            pass
        found = self.newton(restrictions, self.near(restrictions, self.start), shift)
        assert self.maximum(restrictions, found), "no strict maximum"
        return found

    def maximum(self, restrictions, found):
        theta, lam, _ = found
        z = null_space(self.jacobian(restrictions, theta), self.n)
        return positive_definite(z.T * (self.curvature(restrictions, theta, lam) - self.likelihood(theta)[2]) * z)

    def newton(self, restrictions, start, shift=None):
        """Newton on the Lagrangian with halved steps on the residual: (theta, multipliers, l)."""
        m, theta = len(restrictions), start.copy()
        shift = shift or [mp.mpf(0)] * m

        def system(theta, lam):
            l, g, h = self.likelihood(theta)
            c, a = mp.matrix(m, 1), mp.matrix(m, self.n)
            for k, f in enumerate(restrictions):
                v, d, dd = f.at(theta)
                c[k], a[k, :] = v - shift[k], d.T
                h -= lam[k] * dd
            r = mp.matrix(self.n + m, 1)
            r[: self.n, 0] = g - (a.T * lam if m else mp.matrix(self.n, 1))
            for k in range(m):
                r[self.n + k] = c[k]
            k = mp.matrix(self.n + m, self.n + m)
            k[: self.n, : self.n] = h
            for i in range(m):
                for j in range(self.n):
                    k[self.n + i, j] = a[i, j]
                    k[j, self.n + i] = -a[i, j]
            return l, r, k

        lam = mp.matrix(m, 1)
        if m:  # least-squares multipliers to begin with
            _, g, _ = self.likelihood(theta)
            a = mp.matrix(m, self.n)
            for k, f in enumerate(restrictions):
                a[k, :] = f.at(theta)[1].T
            lam = mp.lu_solve(a * a.T, a * g)
        l, r, k = system(theta, lam)
        for _ in range(200):
            size = mp.norm(r)
            if size < mp.mpf(10) ** -40:
                return theta, lam, l
            step, t = mp.lu_solve(k, -r), mp.mpf(1)
            while True:
                try:
                    trial, tl = theta + t * step[: self.n, 0], lam + (t * step[self.n :, 0] if m else lam)
                    l2, r2, k2 = system(trial, tl)
                    if isinstance(l2, mp.mpf) and mp.norm(r2) < size:
                        break
                except (ValueError, ZeroDivisionError, TypeError):
                    pass
                t /= 2
                if t < mp.mpf(10) ** -12:
                    if size < mp.mpf(10) ** -35:
                        return theta, lam, l
                    raise RuntimeError(f"no progress, residual {mp.nstr(size, 5)}")
            theta, lam, l, r, k = trial, tl, l2, r2, k2
        raise RuntimeError("no convergence")

    def curvature(self, restrictions, theta, lam):
        out = mp.matrix(self.n, self.n)
        for k, f in enumerate(restrictions):
            out += lam[k] * f.at(theta)[2]
        return out

    def jacobian(self, restrictions, theta):
        a = mp.matrix(len(restrictions), self.n)
        for k, f in enumerate(restrictions):
            a[k, :] = f.at(theta)[1].T
        return a


def tail(x, df):
    return mp.gammainc(mp.mpf(df) / 2, x / 2, mp.inf, regularized=True)


def positive_definite(m):
    return m.rows == 0 or min(mp.eigsy(m, eigvals_only=True)) > 0


def covariance(info, z):
    return z * mp.inverse(z.T * info * z) * z.T if z.cols else mp.matrix(info.rows, info.rows)


def answer(case):
    c = Case(case)
    number = lambda x: float(x)
    roots = lambda m: [number(mp.sqrt(m[i, i])) if m[i, i] >= 0 else None for i in range(m.rows)]
    edges = c.held(case.get("edges", {}))
    nuisance = c.maintained + edges
    theta, all_, l = c.solve(nuisance + c.tested, c.start)
    k, m = len(nuisance), len(c.tested)
    mu, lam = all_[:k, 0] if k else mp.matrix(0, 1), all_[k:, 0]
    for at, e in enumerate(case.get("edges", {}).items()):  # held on a lower end, l must fall inwards; on an upper, rise
        assert (mu[len(c.maintained) + at] < 0) == (float(e[1]) == 0), "the edge is not active"
    for i in range(m):  # the multiplier is the slope in the right-hand side
        d = [mp.mpf(0)] * (k + m)
        d[k + i] = mp.mpf(10) ** -20
        slope = (c.solve(nuisance + c.tested, theta, d)[2] - l) / d[k + i]
        assert abs(slope - lam[i]) <= 1e-15 * (1 + abs(lam[i])) * 1e3, (slope, lam[i])
    full = [None] * len(case["tested"])
    for at, v in zip(c.kept, lam):
        full[at] = number(v)
    out = {
        "restricted": {"theta": {t.name: number(v) for t, v in zip(c.theta, theta)}, "log_likelihood": number(l),
                       "mu": [number(v) for v in mu[: len(c.maintained)]] if k else [], "lambda": full},
        "df": m,
    }
    _, s, h = c.likelihood(theta)
    a, hh = c.jacobian(nuisance, theta), c.jacobian(c.tested, theta)
    za = null_space(a, c.n)
    z = null_space(c.jacobian(nuisance + c.tested, theta), c.n)
    u = None
    if case.get("unrestricted", True):
        free = c.maintained + c.held(case.get("edges_unrestricted", {}))
        u = c.solve(free, theta)
        for at, e in enumerate(case.get("edges_unrestricted", {}).values()):
            assert (u[1][len(c.maintained) + at] < 0) == (float(e) == 0), "the edge is not active in the unrestricted fit"
        lr = 2 * (u[2] - l)
        out["unrestricted"] = {"theta": {t.name: number(v) for t, v in zip(c.theta, u[0])}, "log_likelihood": number(u[2])}
        out["lr"] = {"chi_square": number(lr), "p": number(tail(lr, m))}
    kinds = ["observed"] + (["expected"] if case.get("information") else [])
    for kind in kinds:
        if kind == "observed":
            info = -h + c.curvature(nuisance, theta, mu)
            whole = -h + c.curvature(nuisance + c.tested, theta, all_)
        else:
            info = whole = c.expected(theta)
        part = {"positive_definite": bool(positive_definite(za.T * info * za))}
        part["se"] = roots(covariance(whole, z))
        if part["positive_definite"]:
            v = hh * covariance(info, za) * hh.T
            chi = (lam.T * v * lam)[0]
            zs = za.T * s
            assert abs(chi - (zs.T * mp.inverse(za.T * info * za) * zs)[0]) < mp.mpf(10) ** -25 * (1 + chi)
            inverse = mp.inverse(v)
            se = roots(inverse)
            part |= {"lambda_se": se, "lambda_z": [number(x / mp.sqrt(inverse[i, i])) for i, x in enumerate(lam)],
                     "score": {"chi_square": number(chi), "p": number(tail(chi, m))}}
        if u and not case.get("edges_unrestricted"):
            t, mult, _ = u
            info = c.expected(t) if kind == "expected" else -c.likelihood(t)[2] + c.curvature(free, t, mult)
            zu = null_space(c.jacobian(free, t), c.n)
            cov = covariance(info, zu)
            j = c.jacobian(c.tested, t)
            hv = mp.matrix([f.at(t)[0] for f in c.tested])
            wald = (hv.T * mp.inverse(j * cov * j.T) * hv)[0]
            part |= {"se_unrestricted": roots(cov), "wald": {"chi_square": number(wald), "p": number(tail(wald, m))}}
        out[kind] = part
    return out


def text(case):
    s = json.dumps(case, indent=1)
    return re.sub(r"\[\s*((?:(?:-?[\d.]+(?:e-?\d+)?|null),?\s*)+)\]", lambda m: "[" + re.sub(r"\s+", " ", m.group(1)).strip() + "]", s) + "\n"


if __name__ == "__main__":
    for path in sorted(CASES.glob("*.json")):
        if sys.argv[1:] and path.stem not in sys.argv[1:]:
            continue
        case = json.loads(path.read_text())
        case["expect"] = answer(case)
        path.write_text(text(case))
        print(path.stem, case["expect"]["df"], case["expect"].get("lr"), flush=True)
