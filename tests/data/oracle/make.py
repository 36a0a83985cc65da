"""Writes the tables beside it, which the tests of src/stats are held to.

    python3 -m venv oracle-venv && oracle-venv/bin/pip install -r requirements.txt
    oracle-venv/bin/python make.py

Every table comes from general-purpose libraries or from exact arithmetic, and
where two ways exist this script itself holds one against the other. Seeds are
fixed: running it again writes the same bytes.
"""

import csv
import math
from fractions import Fraction
from pathlib import Path

import GTC
import mpmath
import numpy as np
import statsmodels.api as sm
import uncertainties
from scipy import integrate, optimize, special, stats
from statsmodels.tsa.stattools import acf

HERE = Path(__file__).parent
INF = float("inf")
mpmath.mp.dps = 40


def write(name, header, rows):
    with open(HERE / name, "w", newline="") as file:
        out = csv.writer(file, lineterminator="\n")
        out.writerow(header)
        for row in rows:
            out.writerow([repr(float(v)) if isinstance(v, (float, np.floating)) else v for v in row])


def near(a, b, relative, absolute=0.0):
    assert abs(a - b) <= relative * abs(b) + absolute, (a, b)
    return a


# Normal: distribution by mpmath beside SciPy, quantile by SciPy.

def normal():
    rows = []
    for z in [-30, -12, -8, -5, -3, -2, -1, -0.25, -1e-6, 0, 1e-9, 0.5, 1, 1.5, 2, 3, 4.75, 6, 8]:
        exact = mpmath.erfc(-mpmath.mpf(z) / mpmath.sqrt(2)) / 2
        rows.append(["cdf", float(z), near(float(exact), stats.norm.cdf(z), 1e-12)])
    for p in [1e-300, 1e-50, 1e-12, 1e-6, 1e-3, 0.025, 0.2, 0.4999999, 0.5, 0.500001, 0.9, 0.975, 0.977249868051820792, 0.999999]:
        rows.append(["quantile", p, stats.norm.ppf(p)])
    write("normal.csv", ["what", "x", "value"], rows)


# Student's t: distribution by mpmath's incomplete beta function, quantile by SciPy,
# held against each other through the distribution.

def t_cdf_exact(t, nu):
    t, nu = mpmath.mpf(t), mpmath.mpf(nu)
    tail = mpmath.betainc(nu / 2, mpmath.mpf(1) / 2, 0, nu / (nu + t * t), regularized=True) / 2
    return tail if t < 0 else 1 - tail


def student():
    rows = []
    freedoms = [1, 1.3, 2, 2.5, 3, 4, 5, 7.77, 10, 16.675, 30, 99.5, 200, 500.25, 999.9, 1000, 1000.5,
                5e3, 1e5, 1e6, 3e6, 1e7, 1e8, 1e10]
    for nu in freedoms:
        for t in [-60, -8, -3, -1, -0.001, 1e-7, 0.3, 0.7, 2, 4.5, 30]:
            if nu <= 2000:
                exact = float(t_cdf_exact(t, nu))
                near(exact, stats.t.cdf(t, nu), 1e-9)
            else:
                exact = float(stats.t.cdf(t, nu))
            rows.append(["cdf", float(t), float(nu), exact])
        for p in [1e-6, 1e-4, 0.01, 0.158655, 0.25, 0.26, 0.4, 0.4999, 0.5, 0.5000001, 0.51, 0.75, 0.9,
                  0.95, 0.975, 0.97724986805182, 0.995, 0.99865, 0.9999, 0.999999]:
            q = float(stats.t.ppf(p, nu))
            if nu <= 2000 and p != 0.5:
                # One Newton step of the exact distribution cleans the last digits.
                density = mpmath.mpf(float(stats.t.pdf(q, nu)))
                q = float(mpmath.mpf(q) - (t_cdf_exact(q, nu) - mpmath.mpf(p)) / density)
            rows.append(["quantile", p, float(nu), q])
    write("student.csv", ["what", "x", "nu", "value"], rows)


def gamma_exact(a, x):
    a, x = mpmath.mpf(a), mpmath.mpf(x)
    term = total = 1 / a
    i = 0
    while term > total * mpmath.mpf(10) ** -35:
        i += 1
        term *= x / (a + i)
        total += term
    return total * mpmath.exp(a * mpmath.log(x) - x - mpmath.loggamma(a))


def chi_square():
    rows = []
    for nu in [1, 1.5, 2, 3, 5, 10, 37.2, 100, 999, 1e4, 1e6]:
        for p in [1e-6, 1e-3, 0.025, 0.1, 0.5, 0.9, 0.975, 0.999, 0.999999]:
            q = float(stats.chi2.ppf(p, nu))
            near(float(stats.chi2.cdf(q, nu)), p, 1e-9)
            rows.append(["quantile", p, float(nu), q])
            x = float(f"{q:.4g}")
            # SciPy loses eight digits in the far tail of a million degrees.
            exact = near(float(gamma_exact(nu / 2, x / 2)), stats.chi2.cdf(x, nu), 1e-7)
            rows.append(["cdf", x, float(nu), exact])
    write("chi-square.csv", ["what", "x", "nu", "value"], rows)


def binomial_exact(k, n, p):
    if k == n:
        return 1.0
    p, q = mpmath.mpf(p), 1 - mpmath.mpf(p)
    log_term = mpmath.loggamma(n + 1) - mpmath.loggamma(k + 1) - mpmath.loggamma(n - k + 1)
    term = mpmath.exp(log_term + k * mpmath.log(p) + (n - k) * mpmath.log(q))
    total, i = mpmath.mpf(0), k
    while i >= 0 and term > mpmath.mpf(10) ** -35:
        total += term
        term *= i * q / ((n - i + 1) * p)
        i -= 1
    return float(total)


def binomial():
    rows = []
    for n, shares in [(1, [0.3]), (4, [0.5]), (20, [0.05, 0.5, 0.9]), (125, [0.01, 0.65]),
                      (2000, [0.001, 0.5, 0.999]), (100_000, [1e-5, 0.5, 0.9]), (10_000_000, [1e-6, 0.5])]:
        for p in shares:
            for k in sorted({0, int(n * p), max(0, int(n * p - 2 * math.sqrt(n * p * (1 - p)))),
                             min(n, int(n * p + 3 * math.sqrt(n * p * (1 - p)) + 1))}):
                if n <= 125:
                    share = Fraction(p)
                    value = float(sum(math.comb(n, i) * share**i * (1 - share) ** (n - i) for i in range(k + 1)))
                else:
                    value = binomial_exact(k, n, p)
                near(value, float(stats.binom.cdf(k, n, p)), 1e-8)
                rows.append([k, n, p, value])
    write("binomial.csv", ["k", "n", "p", "value"], rows)


def clopper_pearson():
    rows = []
    for k, n in [(0, 1), (1, 1), (0, 10), (1, 10), (3, 10), (10, 10), (1, 59), (5, 125), (124, 125),
                 (37, 4000), (3820, 4000), (455, 20_000), (50_000, 100_000), (3, 1_000_000)]:
        for level in [0.5, 0.9, 0.95, 0.9545, 0.999]:
            interval = stats.binomtest(k, n).proportion_ci(level, method="exact")
            low = 0.0 if k == 0 else float(stats.beta.ppf((1 - level) / 2, k, n - k + 1))
            high = 1.0 if k == n else float(stats.beta.ppf((1 + level) / 2, k + 1, n - k))
            # The test's own interval is solved to 2e-12 only.
            near(low, interval.low, 1e-9, 1e-11)
            near(high, interval.high, 1e-9, 1e-11)
            rows.append([k, n, level, low, high])
    write("clopper-pearson.csv", ["k", "n", "level", "low", "high"], rows)


# Noncentral t: the integral over the scale in 40 digits, beside SciPy where its
# own digits hold.

def nct_exact(t, nu, delta):
    t, nu, delta = (mpmath.mpf(v) for v in (t, nu, delta))
    half = nu / 2
    log_front = mpmath.log(2) + half * mpmath.log(half) - mpmath.loggamma(half)

    def part(u):
        s = mpmath.exp(u)
        weight = mpmath.exp(log_front + nu * u - half * s * s)
        return weight * mpmath.erfc(-(t * s - delta) / mpmath.sqrt(2)) / 2

    c = mpmath.mpf(70) / nu
    low, high = -(c + mpmath.sqrt(c)), mpmath.sqrt(c)
    step = (high - low) / 60
    return mpmath.quad(part, [low + i * step for i in range(61)])


def noncentral_t():
    rows = []
    worst = 0.0
    cases = [(nu, delta) for nu in [1, 2, 4, 9, 19.5, 49, 199] for delta in [-3, 0, 1, 5.5, 14, 28.5, 52]]
    cases += [(2, 60), (29, 60), (999, 60), (999, 52), (5000, 20)]
    with mpmath.workdps(22):
        for nu, delta in cases:
            for p in [1e-4, 0.05, 0.5, 0.95, 0.999]:
                # A round point near the quantile, by the normal approximation.
                z = stats.norm.ppf(p)
                scale = math.sqrt(stats.chi2.ppf(1 - min(max(p, 0.02), 0.98), nu) / nu)
                t = float(f"{(delta + z / 2) / scale:.3g}")
                exact = float(nct_exact(t, nu, delta))
                if 1e-7 < exact < 1 - 1e-7:
                    worst = max(worst, abs(exact - float(stats.nct.cdf(t, nu, delta))))
                    rows.append([t, float(nu), float(delta), exact])
    print("noncentral t: SciPy differs by at most", worst)
    write("noncentral-t.csv", ["t", "nu", "delta", "cdf"], rows)


# Tolerance factors: quantile of noncentral t; integral with SciPy's quadrature.

def tolerance():
    rows = []
    for n in [2, 3, 5, 10, 20, 50, 100, 300]:
        for share in [0.9, 0.95, 0.99]:
            for confidence in [0.9, 0.95, 0.99]:
                nu = n - 1
                one = stats.nct.ppf(confidence, nu, stats.norm.ppf(share) * math.sqrt(n)) / math.sqrt(n)

                def held(k):
                    def part(z):
                        m = z / math.sqrt(n)
                        r = optimize.brentq(lambda r: special.ndtr(m + r) - special.ndtr(m - r) - share, 0, 20,
                                            xtol=1e-14)
                        return 2 * stats.norm.pdf(z) * stats.chi2.sf(nu * (r / k) ** 2, nu)
                    return integrate.quad(part, 0, 9, epsabs=1e-11, epsrel=1e-11, limit=200)[0]

                two = optimize.brentq(lambda k: held(k) - confidence, 0.5, 500, xtol=1e-9)
                rows.append([n, share, confidence, float(one), float(two)])
    write("tolerance.csv", ["n", "share", "confidence", "one_sided", "two_sided"], rows)


# Straight lines: exact rational arithmetic on the very binary values, beside
# statsmodels where the condition lets it.

def exact_line(x, y):
    xs, ys, n = [Fraction(v) for v in x], [Fraction(v) for v in y], len(x)
    mx, my = sum(xs) / n, sum(ys) / n
    sxx = sum((v - mx) ** 2 for v in xs)
    slope = sum((a - mx) * (b - my) for a, b in zip(xs, ys)) / sxx
    rss = sum((b - my - slope * (a - mx)) ** 2 for a, b in zip(xs, ys))
    sd = math.sqrt(rss / (n - 2))
    return float(slope), sd / math.sqrt(sxx), sd


def line():
    random = np.random.default_rng(20240501)
    points, rows = [], []
    cases = [(5, 0, 0, 1.0, 0.1), (50, 0, 20, 0.01, 0.5), (40, 1e6, 0, 3.0, 1.0), (40, 1.7e9, 300, 1e-4, 0.02),
             (40, 0, 1e9, 0.5, 1.0), (30, 1.7e9, 1e8, 0.0, 0.01), (60, -1e7, -1e7, -2.5, 1e-3)]
    for case, (n, offset_x, offset_y, slope, noise) in enumerate(cases):
        x = offset_x + np.cumsum(random.uniform(0.5, 1.5, n))
        y = offset_y + slope * (x - offset_x) + noise * random.standard_normal(n)
        found = exact_line(x.tolist(), y.tolist())
        fit = sm.OLS(y - y.mean(), sm.add_constant(x - x.mean())).fit()
        near(fit.params[1], found[0], 1e-6, 1e-9)
        near(fit.bse[1], found[1], 1e-5)
        points += [[case, a, b] for a, b in zip(x, y)]
        rows.append([case, *found])
    write("line-points.csv", ["case", "x", "y"], points)
    write("line.csv", ["case", "slope", "slope_error", "residual_sd"], rows)


# Effective number of autocorrelated values, by statsmodels.

def worth(values):
    n = len(values)
    residuals = sm.OLS(values, sm.add_constant(np.arange(n, dtype=float))).fit().resid
    rho = acf(residuals, adjusted=True, nlags=n - 1, fft=False)[1:]
    by_cut, lags = 0.0, 0
    for k, r in enumerate(rho, start=1):
        if r <= 0:
            break
        by_cut += (1 - k / n) * r
        lags = k
    by_cut = min(n, n / (1 + 2 * by_cut))
    effective = by_cut
    unbiased = min((n * rho[0] + 2) / (n - 4), 0.999) if n >= 10 else 0.0
    if unbiased > 0:
        k = np.arange(1, n)
        effective = min(by_cut, n / (1 + 2 * np.sum((1 - k / n) * unbiased**k)))
    return effective, by_cut, lags


def effective():
    random = np.random.default_rng(20240502)
    values, rows = [], []
    cases = [(5, 0, 0), (9, 0.5, 0), (10, 0.3, 0.1), (20, 0, 0), (20, 0.8, 1), (60, -0.4, 0), (60, 0.9, 0.05),
             (120, 0.5, -2), (240, 0.9, 0), (240, 0.99, 0)]
    for case, (n, phi, slope) in enumerate(cases):
        noise = random.standard_normal(n + 200)
        series = np.zeros(n + 200)
        for i in range(1, n + 200):
            series[i] = phi * series[i - 1] + noise[i]
        series = np.round(series[200:] + slope * np.arange(n) + 30, 4)
        values += [[case, float(v)] for v in series]
        rows.append([case, *(float(v) for v in worth(series)[:2]), worth(series)[2]])
    write("effective-values.csv", ["case", "value"], values)
    write("effective.csv", ["case", "effective", "by_cut", "lags"], rows)


# Combination with correlated inputs: standard uncertainty by the package
# uncertainties, degrees of freedom of paired observations by GTC.

def budget():
    random = np.random.default_rng(20240503)
    rows = []
    for case in range(12):
        n = int(random.integers(2, 6))
        contributions = np.round(random.normal(0, 3, n), 3)
        mixing = random.normal(size=(n, n))
        covariance = mixing @ mixing.T
        r = np.round(covariance / np.sqrt(np.outer(np.diag(covariance), np.diag(covariance))), 3)
        matrix = r * np.outer(np.abs(contributions), np.abs(contributions))
        inputs = uncertainties.correlated_values([0.0] * n, matrix.tolist())
        total = sum(float(np.sign(c)) * x for c, x in zip(contributions, inputs))
        pairs = [f"{i}:{j}:{r[i, j]}" for i in range(n) for j in range(i + 1, n)]
        rows.append([case, " ".join(str(float(c)) for c in contributions), " ".join(["inf"] * n),
                     " ".join(pairs), float(total.std_dev), "inf"])
    # An ensemble with common degrees of freedom beside independent inputs.
    for case, (u, nu, r, other, other_nu) in enumerate([
        ([3.0, 4.0], 4, 0.5, 2.0, 10), ([1.0, 0.8], 9, -0.6, 0.5, 3), ([2.0, 2.0], 5, 0.99, 1.0, INF),
        ([0.3, 5.0], 12, 0.2, 4.0, 7),
    ], start=12):
        pair = GTC.multiple_ureal([0.0, 0.0], u, nu)
        GTC.set_correlation(r, pair[0], pair[1])
        total = pair[0] + pair[1] + GTC.ureal(0.0, other, other_nu)
        freedoms = [str(float(v)) for v in (nu, nu, other_nu)]
        rows.append([case, f"{u[0]} {u[1]} {other}", " ".join(freedoms), f"0:1:{r}",
                     float(GTC.uncertainty(total)), float(GTC.dof(total))])
    write("budget.csv", ["case", "contributions", "freedoms", "correlations", "standard", "freedom"], rows)


# First-order approach: SciPy's least squares, errors not widened.

def first_order():
    random = np.random.default_rng(20240504)
    points, rows = [], []
    for case, (n, span, end, amplitude, tau, noise) in enumerate([
        (60, 3600.0, 80.0, -60.0, 900.0, 0.05), (200, 1000.0, 23.4, 3.0, 400.0, 0.02),
        (12, 5400.0, 61.0, -35.0, 1500.0, 0.1), (100, 600.0, 1e6, -50.0, 300.0, 0.5),
        (150, 2000.0, -5.0, 8.0, 1300.0, 0.001),
    ]):
        t = np.sort(random.uniform(0, span, n)) if case % 2 else np.linspace(0, span, n)
        t = np.round(t + 500, 3)
        y = np.round(end + amplitude * np.exp(-(t - t[0]) / tau) + noise * random.standard_normal(n), 6)

        def curve(t, end, amplitude, tau, first=t[0]):
            return end + amplitude * np.exp(-(t - first) / tau)

        def slopes(t, end, amplitude, tau, first=t[0]):
            decay = np.exp(-(t - first) / tau)
            return np.stack([np.ones_like(t), decay, amplitude * decay * (t - first) / tau**2], axis=1)

        start = (end, amplitude, tau)
        fit, covariance = optimize.curve_fit(curve, t, y, start, jac=slopes, ftol=1e-15, xtol=1e-15, gtol=1e-15)
        errors = np.sqrt(np.diag(covariance))
        sd = math.sqrt(float(np.sum((y - curve(t, *fit)) ** 2)) / (n - 3))
        points += [[case, float(a), float(b)] for a, b in zip(t, y)]
        rows.append([case, *(float(v) for v in fit), float(errors[0]), float(errors[2]), sd])
    write("first-order-points.csv", ["case", "t", "y"], points)
    write("first-order.csv", ["case", "end", "amplitude", "tau", "end_error", "tau_error", "residual_sd"], rows)


# Risks: SciPy's adaptive quadrature over the value.

def risks():
    rows = []
    for y0, u0, um, tl, th, al, ah in [
        (1500.0, 0.12, 0.04, 1499.8, 1500.2, 1499.82, 1500.18),
        (0.0, 1.0, 0.3, -INF, 2.0, -INF, 1.4), (0.5, 1.0, 0.05, -1.0, 1.0, -1.0, 1.0),
        (0.0, 1.0, 2.0, -2.0, 2.0, -1.0, 1.0), (100.0, 5.0, 1e-3, 90.0, INF, 90.002, INF),
        (3.0, 0.5, 0.2, 0.0, 1.0, 0.2, 0.8),
    ]:
        def accepted(v):
            return special.ndtr((ah - v) / um) - special.ndtr((al - v) / um)

        def prior(v):
            return stats.norm.pdf(v, y0, u0)

        def over(f, low, high):
            low, high = max(low, y0 - 12 * u0), min(high, y0 + 12 * u0)
            if low >= high:
                return 0.0
            about = [a + i * um for a in (al, ah) if math.isfinite(a) for i in range(-8, 9)]
            edges = sorted({low, high, *(e for e in about + [y0 + i * u0 for i in range(-8, 9)] if low < e < high)})
            return sum(integrate.quad(f, a, b, epsabs=1e-16, epsrel=1e-12)[0] for a, b in zip(edges, edges[1:]))

        consumer = over(lambda v: prior(v) * accepted(v), -INF, tl) + over(lambda v: prior(v) * accepted(v), th, INF)
        producer = over(lambda v: prior(v) * (1 - accepted(v)), tl, th)
        conforming = float(stats.norm.cdf(th, y0, u0) - stats.norm.cdf(tl, y0, u0))
        rows.append([y0, u0, um, tl, th, al, ah, conforming, float(consumer), float(producer)])
    write("risks.csv", ["y0", "u0", "um", "tl", "th", "al", "ah", "conforming", "consumer", "producer"], rows)


if __name__ == "__main__":
    for table in [normal, student, chi_square, binomial, clopper_pearson, noncentral_t, tolerance, line, effective,
                  budget, first_order, risks]:
        table()
        print(table.__name__, "written", flush=True)
