"""The same uptake of one held session in numpy and statsmodels, to measure against.

Written as one would write it who knows both libraries and wants it fast: bins by `add.reduceat`, every source of error moved up and
down as one stack of arrays, slopes by statsmodels' OLS with its HAC covariance (Newey and West, Bartlett's weights) at the bandwidth of
Andrews, the joint weighted solve, the budget, Welch-Satterthwaite, another day. Before, it looks whether a cell was frozen and for
jumps of PO2 that no event explains; the time without these two is told as well. It does less than what it is measured against: it
knows held loops only, cuts at no gap, and does not ask what would have helped, which is six more estimates.

Takes the folder that the benchmark `uptake` writes. Prints the figures and the median times as JSON.
"""

import json
import math
import pathlib
import sys
import time
import types

import numpy as np
import pandas as pd
import statsmodels.api as sm
from scipy import special

STANDARD_BAR = 1.01325
OXYGEN_IN_AIR = 0.209476
NITROGEN_IN_AIR, BODY_VAPOUR_BAR = 0.79, 0.063


def read(folder):
    folder = pathlib.Path(folder)
    stated = types.SimpleNamespace(**json.loads((folder / "session.json").read_text(encoding="utf-8")))
    table = np.loadtxt(folder / "session.csv", delimiter=",", skiprows=1)
    return stated, np.ascontiguousarray(table[:, 0]), np.ascontiguousarray(table[:, 1:].T)


def saturation_bar(kelvin):
    """Wagner and Pruss 1993, equation 1."""
    x = 1.0 - kelvin / 647.096
    root = math.sqrt(x)
    total = -7.85951783 * x + 1.84408259 * x * root - 11.7866497 * x**3 + 22.6807411 * x**3 * root
    total += -15.9618719 * x**4 + 1.80122502 * x**7 * root
    return 220.64 * math.exp(647.096 / kelvin * total)


def bins(time_s, cells, width_s):
    """Mean time, ends, and means of the cells, in bins."""
    if np.any(np.diff(time_s) <= 0.0) or not np.all(np.isfinite(time_s)):
        raise ValueError("times are not in order")
    number = np.floor((time_s - time_s[0]) / width_s)
    first = np.concatenate(([0], np.flatnonzero(np.diff(number)) + 1))
    count = np.diff(np.append(first, len(time_s)))
    means = np.add.reduceat(cells, first, axis=1) / count
    middle = time_s[0] + np.add.reduceat(time_s - time_s[0], first) / count
    return middle, time_s[first], time_s[first + count - 1], means


def agreeing(cells, means, ambient_bar, stated):
    """Mean of the cells that read and agree with their median."""
    faulty = ~((cells > 0.0) & (cells <= 1.05 * ambient_bar))
    keep = faulty.mean(axis=1) <= stated.cell_faults
    off = means[keep] - np.median(means[keep], axis=0)
    limit = stated.cell_limit_bar
    good = (np.abs(off.mean(axis=1)) <= limit) & ((np.abs(off) > limit).mean(axis=1) <= 0.05)
    if good.sum() < 2:
        raise ValueError("the cells disagree")
    return means[keep][good].mean(axis=0)


def frozen(time_s, cells, means, width_s):
    """Whether a cell repeated one value for a minute while the others moved."""
    for index, column in enumerate(cells):
        step = np.diff(column)
        changes = np.flatnonzero(step) + 1
        first, last = np.append(0, changes), np.append(changes - 1, len(column) - 1)
        long = (last - first >= 9) & (time_s[last] - time_s[first] >= 60.0)
        if not long.any():
            continue
        digit = np.abs(step[changes - 1]).min() if len(changes) else 0.0
        others = np.delete(means, index, axis=0).mean(axis=0)
        at = [((time_s[ends[long]] - time_s[0]) // width_s).astype(int) for ends in (first, last)]
        if np.any(np.abs(others[at[1]] - others[at[0]]) > max(0.015, 2.5 * digit)):
            return True
    return False


def jumps(po2):
    """Whether medians of 20 s before and after a place differ beyond the trend around it."""
    sides = np.median(np.lib.stride_tricks.sliding_window_view(po2, 4), axis=1)
    differences = sides[7:] - sides[:-7]
    trend = pd.Series(differences).rolling(67, center=True, min_periods=1).median().to_numpy()
    departures = differences - trend
    noise = 6.0 * 1.4826 * np.median(np.abs(departures))
    return np.any(departures > max(0.02, noise)) or np.any(-departures > max(0.10, noise))


def slope(minutes, values):
    """Slope of a span, its Newey-West standard error and degrees of freedom."""
    n = len(values)
    lever = minutes - minutes.mean()
    design = np.column_stack((np.ones(n), lever))
    plain = sm.OLS(values, design).fit()
    scores = lever * plain.resid
    before = scores[:-1] @ scores[:-1]
    rho = min(max(scores[:-1] @ scores[1:] / before, -0.97), 0.97)
    alpha = 4.0 * rho**2 / ((1.0 - rho) ** 2 * (1.0 + rho) ** 2)
    bandwidth = min(max(1.1447 * (alpha * n) ** (1.0 / 3.0), 1.0), n)
    robust = plain.get_robustcov_results(
        "HAC",
        maxlags=max(math.ceil(bandwidth) - 1, 0),
        weights_func=lambda lags: 1.0 - np.arange(lags + 1) / bandwidth,
        use_correction=True,
    )
    return plain.params[1], robust.bse[1], min(1.5 * n / bandwidth, n - 2.0)


def uptake(stated, time_s, cells, checked=True):
    ambient = stated.barometer_bar[0]
    middle, begin, end, means = bins(time_s, cells, stated.average_over_s)
    if checked and frozen(time_s, cells, means, stated.average_over_s):
        raise ValueError("a cell was frozen")
    po2 = agreeing(cells, means, ambient, stated)
    loop_k = stated.loop_k[0]
    vapour = saturation_bar(loop_k)
    per_k = saturation_bar(loop_k + 0.5) - saturation_bar(loop_k - 0.5)
    dry = ambient - vapour
    minute = (middle - time_s[0]) / 60.0
    body = NITROGEN_IN_AIR * (ambient - BODY_VAPOUR_BAR)
    washed = np.exp(-(stated.time_on_loop_s / 60.0 + minute) / stated.washout_min) * (body - (dry - po2)) / body

    # Segments: the injection in force, PO2 and its slope, washout as the slope weighs it.
    ip, level, rise, noise, dof, minutes, washout = [], [], [], [], [], [], []
    in_force = None
    events = stated.events + [{"at_s": time_s[-1]}]
    for event, after in zip(events, events[1:]):
        in_force = event.get("ip_bar", in_force)
        start, stop = event["at_s"] + stated.dead_time_s, after["at_s"]
        inside = slice(np.searchsorted(begin, start), np.searchsorted(end, stop, side="right"))
        if stop - start < 90.0 or inside.stop - inside.start < 8:
            continue
        if checked and jumps(po2[inside]):
            raise ValueError("PO2 jumps")
        at = minute[inside]
        from_min, to_min = (begin[inside.start] - time_s[0]) / 60.0, (end[inside.stop - 1] - time_s[0]) / 60.0
        b, u, nu = slope(at, po2[inside] / dry)
        weight = np.maximum((at - from_min) * (to_min - at), 0.0)
        ip.append(in_force)
        level.append(po2[inside].mean())
        rise.append(b * dry)
        noise.append(u)
        dof.append(nu)
        minutes.append(to_min - from_min)
        washout.append((weight * washed[inside]).sum() / weight.sum())
    ip, level, rise, noise, dof, minutes, washout = map(np.array, (ip, level, rise, noise, dof, minutes, washout))

    line, rest = stated.line, 1.0 - OXYGEN_IN_AIR
    carbon_dioxide = stated.lung_share * stated.lung_carbon_dioxide_bar

    def dry_gas(shift):
        """Dry litres at standard conditions in a litre of loop, at the first reading."""
        free = dry + shift["barometer"] - per_k * shift["loop_k"] - carbon_dioxide * (1.0 + shift["carbon_dioxide"])
        return free / STANDARD_BAR * 273.15 / (loop_k + shift["loop_k"])

    def observe(shift):
        """Of each segment y and net of y = β·(net − M); shifts are columns, segments rows beside."""
        scale = (1.0 + shift["gain"]) / (dry + shift["barometer"] - per_k * shift["loop_k"])
        fraction, drift = scale * level, scale * rise
        p1 = ip + shift["ip"] + ambient + shift["barometer"]
        gas_k = stated.gas_k[0] + shift["gas_k"]
        flow = line["intercept"] + shift["intercept"] + (line["slope"] + shift["slope"]) * p1
        flow = np.maximum(flow * np.sqrt(293.15 / gas_k), 0.0)
        purity = np.minimum(stated.purity[0] + shift["purity"], 1.0)
        inert = (np.mean(stated.washout_l_min) + shift["washout"]) * washout + (1.0 - purity) * flow
        leak = np.mean(stated.leak_l_min) + shift["leak"]
        net = purity * flow - inert * OXYGEN_IN_AIR / rest - leak * (fraction - OXYGEN_IN_AIR) / rest
        return drift / rest, net, drift, (1.0 - fraction) * leak - inert

    def solve(y, net, weights, prior):
        total = weights.sum()
        mean_net, mean_y = (net @ weights / total), (y @ weights / total)
        off = net - mean_net[..., None]
        spread = (off * off) @ weights
        cross = (off * (y - mean_y[..., None])) @ weights
        beta = (cross + prior_weight * prior) / (spread + prior_weight)
        return beta, mean_net - mean_y / beta, mean_net, mean_y, spread + prior_weight

    names = ("gain", "loop_k", "carbon_dioxide", "barometer", "leak", "purity", "washout", "ip", "gas_k", "intercept", "slope")
    none = dict.fromkeys(names, 0.0)
    y, net, drift, balance = observe(none)
    litres, expanded = stated.loop_volume_l
    prior = 1.0 / (litres * dry_gas(none))
    prior_weight = (litres / (0.5 * expanded) / prior) ** 2
    y_u = noise / rest
    beta, found = prior, np.maximum(net - y / prior, 0.0).mean()
    for _ in range(20):
        wander = stated.wander * beta * found * np.sqrt(np.minimum(2.4 * stated.wander_min / minutes, 1.0))
        weights = 1.0 / (y_u**2 + (1e-5 * beta) ** 2 + wander**2)
        before = beta, found
        beta, found, mean_net, mean_y, stiffness = solve(y, net, weights, prior)
        if abs(found - before[1]) <= 1e-12 * found and abs(beta - before[0]) <= 1e-12 * beta:
            break
    if np.any(drift - 2.0 * noise > beta * balance):
        raise ValueError("a segment vents")

    # Every source moved up and down; the last two by steps that give the change for one unit.
    half = {
        "gain": 0.5 * stated.cell_gain,
        "loop_k": 0.5 * stated.loop_k[1],
        "carbon_dioxide": 1.0 / math.sqrt(3.0),
        "barometer": 0.5 * stated.barometer_bar[1],
        "leak": 0.5 * (stated.leak_l_min[1] - stated.leak_l_min[0]) / math.sqrt(3.0),
        "purity": 0.5 * stated.purity[1],
        "washout": 0.5 * (stated.washout_l_min[1] - stated.washout_l_min[0]) / math.sqrt(3.0),
        "ip": 0.5 * max(event.get("expanded_bar", 0.0) for event in stated.events),
        "gas_k": 0.5 * stated.gas_k[1],
        "intercept": 0.005,
        "slope": 0.0005,
    }
    moved = np.concatenate((np.diag(list(half.values())), -np.diag(list(half.values()))))
    shift = {name: moved[:, i, None] for i, name in enumerate(names)}
    moved_y, moved_net, _, _ = observe(shift)
    moved_prior = prior * dry_gas(none) / dry_gas(shift)[:, 0]
    both = solve(moved_y, moved_net, weights, moved_prior)[1]
    change = dict(zip(names, 0.5 * (both[: len(names)] - both[len(names) :])))
    per_line = np.array((change.pop("intercept") / half["intercept"], change.pop("slope") / half["slope"]))

    # Contributions with their degrees of freedom.
    per_y = (-weights / weights.sum() + mean_y / beta * weights * (net - mean_net) / stiffness) / beta
    own = per_y * y_u
    square = (own**2).sum()
    parts = [(math.sqrt(square), square**2 / (own**4 / dof).sum())]
    parts.append((math.sqrt(((per_y * wander) ** 2).sum()), math.inf))
    parts.append((mean_y / beta * math.sqrt(prior_weight) / stiffness / beta, math.inf))
    parts += [(value, math.inf) for value in change.values()]
    first = math.sqrt(line["intercept_variance"])
    across = line["covariance"] / first
    left = math.sqrt(max(line["slope_variance"] - across**2, 0.0))
    parts += [(per_line @ (first, across), line["random_dof"]), (per_line[1] * left, line["random_dof"])]
    parts += [(per_line @ common, math.inf) for common in line["common"]]
    u, nu = together(parts)
    k = coverage(nu)
    spread = stated.day_spread * found * math.sqrt(2.0)
    next_u, next_nu = together([*parts, (spread, stated.day_spread_weight)])
    next_k = coverage(next_nu)
    return {
        "uptake": found,
        "u": u,
        "dof": nu,
        "interval": (found - k * u, found + k * u),
        "next_u": next_u,
        "next_interval": (max(found - next_k * next_u, 0.0), found + next_k * next_u),
    }


def together(parts):
    """Combined standard uncertainty and effective degrees of freedom (Welch and Satterthwaite)."""
    square = sum(u * u for u, _ in parts)
    by_dof = sum(u**4 / dof for u, dof in parts)
    return math.sqrt(square), square**2 / by_dof if by_dof > 0.0 else math.inf


def coverage(dof):
    return special.stdtrit(dof, 0.975) if math.isfinite(dof) else special.ndtri(0.975)


def main():
    if len(sys.argv) < 2:
        sys.exit("FOLDER [REPETITIONS]")
    stated, time_s, cells = read(sys.argv[1])
    repetitions = int(sys.argv[2]) if len(sys.argv) > 2 else 7
    result = uptake(stated, time_s, cells)
    result["s"] = median_seconds(lambda: uptake(stated, time_s, cells), repetitions)
    result["estimate_s"] = median_seconds(lambda: uptake(stated, time_s, cells, checked=False), repetitions)
    print(json.dumps(result, default=float))


def median_seconds(work, repetitions, times=10):
    seconds = []
    for _ in range(repetitions):
        start = time.perf_counter()
        for _ in range(times):
            work()
        seconds.append((time.perf_counter() - start) / times)
    return sorted(seconds)[len(seconds) // 2]


if __name__ == "__main__":
    main()
