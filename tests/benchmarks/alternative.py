"""The same whole analysis of a bench run in numpy and scipy, to measure against.

Written as one would write it who knows both libraries and wants it fast, without leaving out a step: correction,
choke-ratio posterior, points left out, line with uncertainties in both coordinates, the fit moved by every common source,
budget, Welch-Satterthwaite, coverage factor, every check with its p-value, Fieller's limits, conformity. Choices made for
speed, each measured:

- all fits (the readings as they are, and with each source moved up and down) are one stack of arrays, fitted together;
- the posterior is one stack over the grid of choke ratios;
- quantiles and tails come from scipy.special, which scipy.stats calls too, after far more handling of arguments;
  `analyse` measures the analysis with scipy.stats as well, since that is what most people write;
- the Monte Carlo trials go in stacks that stay in the cache, on two threads (numpy lets go of the interpreter's lock).

`scipy.odr` is measured beside it (`odr`); it fits one line at a time.

Takes what the benchmark files hold: points, a mass-reading meter, oxygen. Writes nothing but its result.
"""

import csv
import json
import math
import pathlib
import re
import sys
import time
import tomllib
import types

import numpy as np
from scipy import special

R = 8.31446261815324
MOLAR_MASS = 0.0319988
VISCOSITY = 2.027238e-5
# Critical flow function of oxygen, rows by pressure, columns by temperature.
CRITICAL_FLOW = np.array(
    [
        [0.684255317, -0.000189704, -0.000025431],
        [0.003533145, -0.000760732, 0.000092211],
        [0.000029576, -0.000021145, 0.000005764],
    ]
)
STPD_DENSITY = 101325.0 * MOLAR_MASS / (R * 273.15)
LARGEST_K = 3.5
B_GRID = 105
K_GRID = 15
PRIOR_B = (0.08, 0.60)
SIGNIFICANCE = 0.01


class Special:
    """Tails and quantiles straight from scipy.special."""

    t_quantile = staticmethod(lambda p, dof: special.stdtrit(dof, p))
    t_cdf = staticmethod(lambda t, dof: special.stdtr(dof, t))
    normal_quantile = staticmethod(special.ndtri)
    normal_cdf = staticmethod(special.ndtr)
    chi_squared_upper = staticmethod(lambda x, dof: special.chdtrc(dof, x))
    f_upper = staticmethod(lambda f, a, b: special.fdtrc(a, b, f))


class Stats:
    """The same from scipy.stats, imported only when asked for."""

    def __init__(self):
        from scipy import stats

        self.t_quantile = stats.t.ppf
        self.t_cdf = stats.t.cdf
        self.normal_quantile = stats.norm.ppf
        self.normal_cdf = stats.norm.cdf
        self.chi_squared_upper = stats.chi2.sf
        self.f_upper = stats.f.sf


UNITS = {
    "bar": 1e5, "hPa": 100.0, "mbar": 100.0, "kPa": 1e3,
    "L/min": 1.0, "%": 0.01, "°C": 1.0, "s": 1.0,
}  # fmt: skip


def number(text):
    """The number of a quantity in pascals, litres a minute, kelvins above 0 °C, or one."""
    value, unit = re.fullmatch(r"\s*(-?[\d.]+)\s*(\S+)\s*", text).groups()
    return float(value) * UNITS[unit]


def with_half_width(text):
    """Value and standard uncertainty of "a ± b", k = 2."""
    value, _, width = text.partition("±")
    return number(value), number(width) / 2.0 if width else 0.0


def read(file):
    """A run file and its readings."""
    path = pathlib.Path(file)
    document = tomllib.loads(path.read_text(encoding="utf-8"))
    with open(path.parent / document["readings"], newline="", encoding="utf-8") as rows:
        table = list(csv.DictReader(rows))
    columns, conditions, meter, transducer, acceptance = (
        document[key] for key in ("columns", "conditions", "meter", "transducer", "acceptance")
    )

    def column(name):
        unit = UNITS[columns[name]["unit"]]
        return np.array([float(row[columns[name]["column"]]) for row in table]) * unit

    reference = [number(part) for part in meter["reads_at"].split(",")]
    temperature, temperature_u = with_half_width(conditions["temperature"])
    barometer, barometer_u = with_half_width(conditions["barometer"])
    k_meter, k_transducer = float(meter["coverage"]), float(transducer["coverage"])
    return types.SimpleNamespace(
        shown_pa=column("pressure"),
        shown=column("flow"),
        time_s=column("time"),
        rising=np.array([row[columns["sweep"]["column"]] == "rising" for row in table]),
        temperature_k=temperature + 273.15,
        ambient_pa=barometer,
        back_pa=number(conditions["back_pressure"]),
        stpd=reference[1] / 101325.0 * 273.15 / (reference[0] + 273.15),
        # Standard uncertainties: meter gain, meter zero, transducer gain, transducer zero, barometer, gas temperature.
        sources=np.array(
            [
                number(meter["gain"]) / k_meter,
                number(meter["zero"]) / k_meter,
                number(transducer["gain"]) / k_transducer,
                number(transducer["zero"]) / k_transducer,
                barometer_u,
                temperature_u,
            ]
        ),
        flow_noise=number(meter["noise"]) / k_meter,
        flow_resolution=number(meter["resolution"]),
        pressure_noise_pa=number(transducer["noise"]) / k_transducer,
        pressure_resolution_pa=number(transducer["resolution"]),
        flow_range=[number(part) for part in meter["range"].split("to")],
        pressure_range=[number(part) for part in transducer["range"].split("to")],
        nominal_bar=number(acceptance["ip"]) / 1e5 + 1.01325,
        nominal_flow=number(acceptance["flow"]),
        tolerance=number(acceptance["tolerance"]),
    )


def correct(run, shown_pa, shown, shift):
    """Absolute pressures in bar and flow in L/min STPD at 20 °C; `shift` holds an error of each source down its last axis."""
    g, z, pg, pz, b, t = (shift[..., i, None] for i in range(6))
    ambient = run.ambient_pa + b
    p1 = (shown_pa * (1.0 + pg) + pz + ambient) / 1e5
    p2 = (ambient + run.back_pa) / 1e5
    per_shown = run.stpd * np.sqrt((run.temperature_k + t) / 293.15)
    return p1, p2, (shown * (1.0 + g) + z) * per_shown, per_shown


def critical_flow(p_bar):
    """At 20 °C."""
    p = p_bar / 10.0
    return CRITICAL_FLOW[0, 0] + p * (CRITICAL_FLOW[1, 0] + p * CRITICAL_FLOW[2, 0])


def hole_diameter(flow_l_min, p1_bar):
    """Effective diameter in metres."""
    mass = flow_l_min * 1e-3 / 60.0 * STPD_DENSITY
    per_area = critical_flow(p1_bar) * p1_bar * 1e5 * math.sqrt(MOLAR_MASS / (R * 293.15))
    return math.sqrt(4.0 * mass / per_area / math.pi)


def fit_lines(x, y, ux2, uy2):
    """Lines with uncertainties in both coordinates, one a row of x and y (York et al. 2004; ISO/TS 28037, clause 7)."""
    dx = x - x.mean(axis=-1, keepdims=True)
    b = (dx * y).sum(axis=-1, keepdims=True) / (dx * dx).sum(axis=-1, keepdims=True)
    for _ in range(100):
        w = 1.0 / (uy2 + (b * b) * ux2)
        w_sum = w.sum(axis=-1, keepdims=True)
        x_mean = (w * x).sum(axis=-1, keepdims=True) / w_sum
        y_mean = (w * y).sum(axis=-1, keepdims=True) / w_sum
        u = x - x_mean
        v = y - y_mean
        beta = w * (u * uy2 + (b * ux2) * v)
        weighted = w * beta
        new = (weighted * v).sum(axis=-1, keepdims=True) / (weighted * u).sum(axis=-1, keepdims=True)
        done = np.abs(new - b).max() <= 1e-12 * np.abs(new).max()
        b = new
        if done:
            break
    a = y_mean - b * x_mean
    return types.SimpleNamespace(
        intercept=a[..., 0], slope=b[..., 0], w=w, w_sum=w_sum, x_mean=x_mean, beta=beta, u=u, v=v
    )


def line_of(run, p1, flow, pressure_u, flow_u, shifts):
    """The line, its covariance and what each source does to it. p1 and flow hold a row for each of `shifts`."""
    lines = fit_lines(p1, flow, pressure_u * pressure_u, flow_u * flow_u)
    w, w_sum, beta = lines.w[0], lines.w_sum[0, 0], lines.beta[0]
    residual = lines.v[0] - lines.slope[0] * lines.u[0]
    adjusted = lines.x_mean[0, 0] + beta
    centre = w @ adjusted / w_sum
    from_centre = adjusted - centre
    slope_variance = 1.0 / (w @ (from_centre * from_centre))
    random = np.array(
        [
            [1.0 / w_sum + centre * centre * slope_variance, -centre * slope_variance],
            [-centre * slope_variance, slope_variance],
        ]
    )
    dof = p1.shape[-1] - 2
    reduced = (w @ (residual * residual)) / dof
    random = random * max(reduced, 1.0)
    up, down = slice(1, None, 2), slice(2, None, 2)
    moved = np.stack(
        [lines.intercept[up] - lines.intercept[down], lines.slope[up] - lines.slope[down]], axis=-1
    )
    moved /= 2.0
    return types.SimpleNamespace(
        intercept=lines.intercept[0],
        slope=lines.slope[0],
        random=random,
        dof=dof if reduced > 1.0 else math.inf,
        reduced=reduced,
        common=moved,
        covariance=random + moved.T @ moved,
    )


def subsonic(ratio, b):
    x = (ratio - b) / (1.0 - b)
    return np.where(ratio <= b, 1.0, np.sqrt(np.maximum(1.0 - x * x, 0.0)))


def posterior(low, high, ratio, p1, flow, pressure_u, flow_u, choked, inverse_root_re, scale, effects):
    """Logarithm of the weight and least chi-squared of each choke ratio on an even grid."""
    b = np.linspace(low, high, B_GRID)[:, None]
    below = ratio <= b
    psi = subsonic(ratio, b)
    floor = np.maximum(psi, 0.1)
    square = (1.0 - b) ** 2
    choked_already = below | (psi <= 0.0)
    slope = np.where(choked_already, 0.0, -(ratio - b) / square / floor)
    curvature = np.where(choked_already, 0.0, -1.0 / (square * floor**3))
    e_p1, e_p2, e_flow = effects
    # What is common to all pressures, to second order.
    second = curvature * (ratio * ratio / p1 * (e_p1 * e_p1).sum(axis=0))
    per_bar = scale * choked / p1
    by_p1 = (psi - slope * ratio) * per_bar
    by_p2 = slope * per_bar
    variance = flow_u * flow_u + (by_p1 * pressure_u) ** 2
    weight = 1.0 / variance
    d = np.empty((B_GRID, len(e_p1) + 1, len(p1)))
    d[:, :-1] = e_flow - by_p1[:, None, :] * e_p1 - by_p2[:, None, :] * e_p2
    d[:, -1] = per_bar * second / math.sqrt(2.0)
    dw = d * weight[:, None, :]
    lower = np.linalg.cholesky(np.eye(d.shape[1]) + dw @ d.transpose(0, 2, 1))
    log_determinant = np.log(variance).sum(axis=-1) + 2.0 * np.log(
        np.diagonal(lower, axis1=1, axis2=2)
    ).sum(axis=-1)
    a = choked * (psi + 0.5 * second / p1)
    vectors = np.stack([a, a * inverse_root_re, np.broadcast_to(flow, a.shape)], axis=-1)
    projected = np.linalg.solve(lower, dw @ vectors)
    forms = vectors.transpose(0, 2, 1) @ (weight[:, :, None] * vectors) - projected.transpose(
        0, 2, 1
    ) @ projected
    k = np.linspace(0.0, LARGEST_K, K_GRID)
    aa, ac, cc = forms[:, 0, 0, None], forms[:, 0, 1, None], forms[:, 1, 1, None]
    aq, cq, qq = forms[:, 0, 2, None], forms[:, 1, 2, None], forms[:, 2, 2, None]
    mm = aa - k * (2.0 * ac - k * cc)
    mq = aq - k * cq
    chi_square = qq - mq * mq / mm
    logs = -0.5 * (chi_square + np.log(mm))
    top = logs.max(axis=-1, keepdims=True)
    shares = np.exp(logs - top)
    sums = shares.sum(axis=-1) - 0.5 * (shares[:, 0] + shares[:, -1])
    return b[:, 0], top[:, 0] + np.log(sums) - 0.5 * log_determinant, chi_square.min()


def choke_ratio(tails, p1, p2, flow, pressure_u, flow_u, moved):
    """Mean, standard deviation and 95 % interval of the choke ratio, and its grid with weights."""
    ratio = p2 / p1
    choked = p1 * critical_flow(p1) / critical_flow(10.0)
    scale = (flow / choked).max()
    diameter = hole_diameter(scale, 1.0)
    mass = np.maximum(flow, 0.01 * scale) * 1e-3 / 60.0 * STPD_DENSITY
    inverse_root_re = 1.0 / np.sqrt(np.maximum(4.0 * mass / (math.pi * diameter * VISCOSITY), 1.0))
    known = (ratio, p1, flow, pressure_u, flow_u, choked, inverse_root_re, scale, moved)
    low, high = PRIOR_B
    b, log_weight, least = posterior(low, high, *known)
    alive = b[log_weight > log_weight.max() - 20.0]
    step = (high - low) / (B_GRID - 1)
    narrow = max(alive[0] - step, low), min(alive[-1] + step, high)
    if narrow[1] - narrow[0] < 0.5 * (high - low):
        b, log_weight, least = posterior(*narrow, *known)
    dof = max(len(p1) - 3.0, 1.0)
    reduced = least / dof
    fits = tails.chi_squared_upper(least, dof) >= SIGNIFICANCE
    temper = 1.0
    if not fits:
        if reduced >= 4.0:
            b, log_weight = np.linspace(low, high, B_GRID), np.zeros(B_GRID)
        else:
            temper = max(reduced, 1.0)
    weight = np.exp((log_weight - log_weight.max()) / temper)
    weight[[0, -1]] *= 0.5
    weight /= weight.sum()
    mean = weight @ b
    deviation = b - mean
    sd = math.sqrt(weight @ (deviation * deviation))
    # Quantiles of a density given on an even grid, whose end points carry half a cell.
    edges = np.concatenate(([b[0]], (b[:-1] + b[1:]) / 2.0, [b[-1]]))
    below = np.concatenate(([0.0], np.cumsum(weight)))
    interval = np.interp([0.025, 0.975], below, edges)
    measured = fits and (interval[1] - interval[0]) / 2.0 < 0.05
    return types.SimpleNamespace(
        value=mean, u=sd, interval=interval, b=b, weight=weight, measured=measured
    )


def ordinary(tails, columns, y):
    """Coefficient and p-value of the last column beside a constant and the others."""
    design = np.column_stack([np.ones_like(y), *columns])
    q, r = np.linalg.qr(design)
    inverse = np.linalg.inv(r)
    parameters = inverse @ (q.T @ y)
    residual = y - design @ parameters
    dof = len(y) - design.shape[1]
    sd = math.sqrt(residual @ residual / dof * (inverse[-1] @ inverse[-1]))
    return parameters[-1], 2.0 * tails.t_cdf(-abs(parameters[-1] / sd), dof)


def generalised_esd(tails, values, suspects, significance):
    """Indices that lie apart."""
    left = np.arange(len(values))
    order, over = [], 0
    for i in range(suspects):
        v = values[left]
        n = len(v)
        distance = np.abs(v - v.mean())
        far = distance.argmax()
        statistic = distance[far] / v.std(ddof=1)
        t = tails.t_quantile(1.0 - significance / (2.0 * n), n - 2)
        critical = (n - 1) * t / math.sqrt(n * (n - 2 + t * t))
        order.append(left[far])
        if statistic > critical:
            over = i + 1
        left = np.delete(left, far)
    return order[:over]


def checks(tails, run, line, used, p1, flow, nominal_flow, nominal_t):
    """Every check that needs numbers: values and p-values."""
    low, high = p1.min(), p1.max()
    x = 2.0 * (p1 - low) / (high - low) - 1.0
    y = flow / nominal_flow
    residual = (flow - line.intercept - line.slope * p1) / nominal_flow
    n = len(x)
    bend = x * x
    found = {"straight": ordinary(tails, [x, bend], y)}
    rising = run.rising[used]
    if 2 <= rising.sum() <= n - 2:
        found["hysteresis"] = ordinary(tails, [x, bend, np.where(rising, 0.5, -0.5)], y)
    when = run.time_s[used]
    over = (when - when[0]) / (when[-1] - when[0]) - 0.5
    if abs(np.corrcoef(over, x)[0, 1]) <= 0.98:
        found["steady"] = ordinary(tails, [x, bend, over], y)
    # Repetitions: pressures within 0.1 bar of the lowest of their group.
    order = np.argsort(p1, kind="stable")
    group = np.empty(n, dtype=int)
    lowest, mark = -math.inf, -1
    for i, p in zip(order.tolist(), p1[order].tolist()):
        if p - lowest > 0.1:
            lowest, mark = p, mark + 1
        group[i] = mark
    count = np.bincount(group)
    if mark + 1 < n:
        scatter = residual - (np.bincount(group, residual) / count)[group]
        found["repeatable"] = math.sqrt(scatter @ scatter / (n - mark - 1))
    # One straight line for the lack of fit and the studentised residuals.
    dx, dy = x - x.mean(), y - y.mean()
    square = dx @ dx
    off = dy - dx * (dx @ dy / square)
    square_sum = off @ off
    bent = abs(found["straight"][0]) > 0.005 and found["straight"][1] < SIGNIFICANCE
    if bent and 2 < mark + 1 < n:
        pure = y - (np.bincount(group, y) / count)[group]
        pure_square = pure @ pure
        f = (square_sum - pure_square) / (mark - 1) / (pure_square / (n - mark - 1))
        found["lack of fit"] = f, tails.f_upper(f, mark - 1, n - mark - 1)
    leverage = 1.0 / n + dx * dx / square
    studentised = off / np.sqrt(square_sum / (n - 2) * (1.0 - leverage))
    found["outlier"] = generalised_esd(tails, studentised, max(n // 10, 1), SIGNIFICANCE)
    # Fieller's limits of -intercept/slope.
    v, t2 = line.covariance, nominal_t * nominal_t
    a, b = -line.intercept, line.slope
    p2, p1_, p0 = b * b - t2 * v[1, 1], a * b + t2 * v[0, 1], a * a - t2 * v[0, 0]
    root = math.sqrt(max(p1_ * p1_ - p2 * p0, 0.0))
    found["through zero"] = a / b, (p1_ - root) / p2, (p1_ + root) / p2
    shown, shown_pa = run.shown[used], run.shown_pa[used]
    found["instruments"] = (
        (shown < run.flow_range[0]).any() or (shown > run.flow_range[1]).any(),
        (shown_pa < run.pressure_range[0]).any() or (shown_pa > run.pressure_range[1]).any(),
        (shown < 0.1 * run.flow_range[1]).any(),
        (shown_pa < 0.1 * run.pressure_range[1]).any(),
    )
    return found


def analyse(run, tails=Special):
    """Everything from readings to verdict."""
    # A row for the readings as they are, then one for each source up and one down.
    shifts = np.zeros((13, 6))
    every = np.arange(6)
    shifts[1 + 2 * every, every] = run.sources
    shifts[2 + 2 * every, every] = -run.sources
    p1, p2, flow, per_shown = correct(run, run.shown_pa, run.shown, shifts)
    pressure_u = np.full(
        run.shown.shape,
        math.hypot(run.pressure_noise_pa, run.pressure_resolution_pa / math.sqrt(12.0)) / 1e5,
    )
    flow_u = np.hypot(run.flow_noise * run.shown, run.flow_resolution / math.sqrt(12.0)) * per_shown[0]
    # The meter's gain is a factor of the flow and so of the conductance, which is free.
    up = slice(3, None, 2)
    effects = p1[up] - p1[0], np.broadcast_to(p2[up] - p2[0], flow[up].shape), flow[up] - flow[0]
    choke = choke_ratio(tails, p1[0], p2[0], flow[0], pressure_u, flow_u, effects)
    ratio = p2[0] / p1[0]
    loss = (1.0 - subsonic(ratio[:, None], choke.b)) @ choke.weight
    full = np.maximum(flow[0], 0.0) / np.maximum(1.0 - loss, 0.05)
    limit = 0.5 * np.hypot(flow_u, (flow[0] / p1[0]).max() * pressure_u) / full
    used = loss <= limit
    p1, flow = p1[:, used], flow[:, used]
    line = line_of(run, p1, flow, pressure_u[used], flow_u[used], shifts)
    # Flow at the nominal pressure with its budget.
    at = np.array([1.0, run.nominal_bar])
    value = line.intercept + line.slope * run.nominal_bar
    parts = line.common @ at
    random_variance = at @ line.random @ at
    variance = random_variance + parts @ parts
    dof = variance * variance / (random_variance * random_variance / line.dof) if line.dof < math.inf else math.inf
    factor = tails.t_quantile(0.975, dof) if dof < math.inf else tails.normal_quantile(0.975)
    u = math.sqrt(variance)
    found = checks(tails, run, line, used, p1[0], flow[0], value, factor)
    # Conformity.
    lower, upper = run.nominal_flow * (1.0 - run.tolerance), run.nominal_flow * (1.0 + run.tolerance)
    ends = np.array([(lower - value) / u, (value - upper) / u])
    outside = (tails.t_cdf(ends, dof) if dof < math.inf else tails.normal_cdf(ends)).sum()
    expanded = factor * u
    if lower + expanded <= value <= upper - expanded:
        verdict = "pass"
    elif value < lower - expanded or value > upper + expanded:
        verdict = "fail"
    else:
        verdict = "undecided"
    middle = (p1[0].min() + p1[0].max()) / 2.0
    diameter_um = hole_diameter(line.slope * middle, middle) * 1e6
    return types.SimpleNamespace(
        line=line,
        used=used,
        pressure_u=pressure_u,
        flow_u=flow_u,
        per_shown=per_shown[0, 0],
        slope_u=math.sqrt(line.covariance[1, 1]),
        intercept_u=math.sqrt(line.covariance[0, 0]),
        flow=value,
        u=u,
        parts=parts,
        dof=dof,
        factor=factor,
        expanded=expanded,
        choke=choke,
        checks=found,
        probability=1.0 - outside,
        verdict=verdict,
        conductance=line.slope / 60.0 / (1e5 / 101325.0 * 273.15 / 293.15),
        diameter_um=diameter_um,
    )


def monte_carlo(run, analysis, trials, seed, threads=2, stack=2000):
    """Mean, standard deviation and 95 % interval of the flow at the nominal pressure over the whole chain."""
    from concurrent.futures import ThreadPoolExecutor

    used, line = analysis.used, analysis.line
    shown_pa, shown = run.shown_pa[used], run.shown[used]
    pressure_u, flow_u = analysis.pressure_u[used], analysis.flow_u[used]
    shown_u_pa, shown_u = pressure_u * 1e5, flow_u / analysis.per_shown
    ux2, uy2 = pressure_u * pressure_u, flow_u * flow_u
    widen = math.sqrt(max(line.reduced, 1.0))

    def some(job):
        count, sequence = job
        random = np.random.default_rng(sequence)
        shift = random.standard_normal((count, 6)) * run.sources
        factor = np.full((count, 1), widen)
        if line.dof < math.inf:
            factor /= np.sqrt(random.chisquare(line.dof, (count, 1)) / line.dof)
        pa = shown_pa + factor * shown_u_pa * random.standard_normal((count, len(shown)))
        flow = shown + factor * shown_u * random.standard_normal((count, len(shown)))
        p1, _, corrected, _ = correct(run, pa, flow, shift)
        lines = fit_lines(p1, corrected, ux2, uy2)
        return lines.intercept + lines.slope * run.nominal_bar

    counts = [min(stack, trials - start) for start in range(0, trials, stack)]
    jobs = list(zip(counts, np.random.SeedSequence(seed).spawn(len(counts))))
    with ThreadPoolExecutor(threads) as pool:
        flows = np.concatenate(list(pool.map(some, jobs)))
    flows.sort()
    inside = int(0.95 * trials + 0.5)
    first = max((trials - inside + 1) // 2, 1)
    return flows.mean(), flows.std(ddof=1), flows[first - 1], flows[first + inside - 1]


def median_seconds(work, repetitions, times=1):
    """Of one piece of work, after one that does not count."""
    work()
    seconds = []
    for _ in range(repetitions):
        start = time.perf_counter()
        for _ in range(times):
            work()
        seconds.append((time.perf_counter() - start) / times)
    return sorted(seconds)[len(seconds) // 2]


def odr_seconds(run, repetitions):
    """One line by scipy.odr and thirteen stacked ones by `fit_lines`; none where scipy has no odr (it leaves in 1.19)."""
    import warnings

    warnings.simplefilter("ignore")
    try:
        from scipy import odr
    except ImportError:
        return None
    p1, _, flow, per_shown = correct(run, run.shown_pa, run.shown, np.zeros((13, 6)))
    pressure_u, flow_u = 0.002, run.flow_noise * flow[0]
    model = odr.Model(lambda beta, x: beta[0] + beta[1] * x)
    data = odr.RealData(p1[0], flow[0], sx=pressure_u, sy=flow_u)
    one = median_seconds(lambda: odr.ODR(data, model, beta0=[0.0, 0.04]).run(), repetitions, 20)
    ux2 = np.full_like(flow_u, pressure_u * pressure_u)
    stacked = median_seconds(lambda: fit_lines(p1, flow, ux2, flow_u * flow_u), repetitions, 20)
    return {"odr_one_fit_s": one, "stacked_thirteen_fits_s": stacked}


def summary(a):
    """The figures both programs must agree on."""
    return {
        "slope": a.line.slope,
        "intercept": a.line.intercept,
        "slope_u": a.slope_u,
        "intercept_u": a.intercept_u,
        "covariance": a.line.covariance[0, 1],
        "reduced_chi_square": a.line.reduced,
        "points_used": int(a.used.sum()),
        "flow": a.flow,
        "u": a.u,
        "expanded": a.expanded,
        "coverage_factor": a.factor,
        "conformity_probability": a.probability,
        "verdict": a.verdict,
        "straight": a.checks["straight"][0],
        "hysteresis": a.checks["hysteresis"][0] if "hysteresis" in a.checks else None,
        "steady": a.checks["steady"][0] if "steady" in a.checks else None,
        "repeatable": a.checks.get("repeatable"),
        "through_zero": a.checks["through zero"][0],
        "diameter_um": a.diameter_um,
        "conductance": a.conductance,
        "b": a.choke.value,
        "b_u": a.choke.u,
        "b_low": a.choke.interval[0],
        "b_high": a.choke.interval[1],
    }


def main():
    if len(sys.argv) < 3:
        sys.exit(
            "fit FILE.toml | analyse FILE.toml [REPETITIONS] | monte-carlo FILE.toml [REPETITIONS] | "
            "odr FILE.toml [REPETITIONS] | pandas FILE.csv | loadtxt FILE.csv"
        )
    verb, file, *rest = sys.argv[1:]
    repetitions = int(rest[0]) if rest else 7
    if verb == "fit":
        print(json.dumps(summary(analyse(read(file))), indent=1, default=float))
    elif verb == "analyse":
        run, stats = read(file), Stats()
        result = {
            "special_s": median_seconds(lambda: analyse(run), repetitions, 20),
            "stats_s": median_seconds(lambda: analyse(run, stats), repetitions, 20),
        }
        print(json.dumps(result))
    elif verb == "monte-carlo":
        run = read(file)
        analysis = analyse(run)
        seconds = median_seconds(lambda: monte_carlo(run, analysis, 100_000, 1), repetitions)
        mean, sd, low, high = monte_carlo(run, analysis, 100_000, 1)
        print(json.dumps({"s": seconds, "mean": mean, "u": sd, "low": low, "high": high}, default=float))
    elif verb == "odr":
        print(json.dumps(odr_seconds(read(file), repetitions)))
    elif verb == "pandas":
        import pandas

        print(len(pandas.read_csv(file)))
    elif verb == "loadtxt":
        print(len(np.loadtxt(file, delimiter=",", skiprows=1)))
    else:
        sys.exit(f"{verb} is not known")


if __name__ == "__main__":
    main()
