#!/usr/bin/env python3
"""Measures Ebbline against the same whole analyses in numpy, scipy and statsmodels, in one run.

    scripts/benchmark.py            every figure, a few minutes
    scripts/benchmark.py --quick    fewer repetitions, for continuous integration

First both programs analyse the same runs and must agree; then each figure is measured on both in turn, so that a machine
that speeds up or slows down does so for both, and the table gives the medians, the ratio, and what is aimed at. Without
numpy, scipy, pandas and statsmodels in the Python that runs this, a virtual environment is made in tests/benchmarks/.venv.

Exit status: 0 both agree; 1 they do not, or, with --strict, an aim is missed; 2 something cannot be run.

What is measured:

1. analyses a second of a run of 20 points with its whole budget, checks, choke ratio and verdict, one core, in a process
   that is already running (tests/benchmarks/analyse.rs, tests/benchmarks/alternative.py); the alternative once with the
   distributions of scipy.stats, against which the aim is set, and once with the bare functions of scipy.special below them;
2. 100 000 Monte Carlo trials of the whole chain of that run, two threads on either side;
3. `ebbline bench fit FILE`, the whole process from start to end; the alternative starts Python, imports numpy and
   scipy.special, reads the same file and analyses it;
4. a time series of a million rows read and fitted, the whole process and its peak memory; the alternatives only read it;
5. the resting uptake from an hour's session at 10 Hz with three cells and two injections, whole budget, in a process that is already
   running (tests/benchmarks/uptake.rs, tests/benchmarks/uptake_alternative.py, which does a little less, as it says); then without an
   alternative the same hour as a million rows, and 100 000 Monte Carlo trials of two sessions of 20 minutes.

Reasons to doubt it: the machine's other work is in every figure (look at the range, and at how the ratio repeats); the
alternative has been made fast by people who do not live from numpy; the peak memory the system tells of a finished process
is never below what this script itself takes, some 20 MB.
"""

import argparse
import json
import math
import os
import pathlib
import random
import re
import statistics
import subprocess
import sys
import time
import venv

ROOT = pathlib.Path(__file__).resolve().parent.parent
BENCHMARKS = ROOT / "tests" / "benchmarks"
NEEDED = ("numpy", "scipy", "pandas", "statsmodels")
ROWS = 1_000_000
# Figure of ours in the JSON of `bench fit`, name in the alternative's summary, relative tolerance.
TOLERANCE, TOLERANCE_OF_B = 1e-6, 1e-3
# Of uptake, standard uncertainty and that of another day: both solve the same equations, sums in another order.
TOLERANCE_OF_UPTAKE = 1e-8


def main():
    parser = argparse.ArgumentParser(description="Measures Ebbline against the same analysis in numpy and scipy.")
    parser.add_argument("--quick", action="store_true", help="fewer repetitions")
    parser.add_argument("--strict", action="store_true", help="exit with 1 when an aim is missed")
    parser.add_argument("--json", metavar="FILE", help="write the figures to FILE as well")
    arguments = parser.parse_args()
    try:
        sys.exit(measure(arguments))
    except subprocess.CalledProcessError as error:
        print(f"{' '.join(map(str, error.cmd))} ended with status {error.returncode}", file=sys.stderr)
        print(error.stderr or "", file=sys.stderr)
        sys.exit(2)


def measure(arguments):
    python = interpreter()
    program, analyse_bench, monte_carlo_bench, uptake_bench = build()
    alternative = [python, str(BENCHMARKS / "alternative.py")]
    points = BENCHMARKS / "twenty_points.toml"

    for file in (points, BENCHMARKS / "down_to_low.toml"):
        if not agree(program, alternative, file):
            return 1

    rounds = 3 if arguments.quick else 7
    ours, special, stats = [], [], []
    for _ in range(rounds):
        ours.append(figure(analyse_bench, points, r"([\d.]+) analyses a second", arguments.quick))
        theirs = json.loads(run([*alternative, "analyse", points, "7"]))
        special.append(1.0 / theirs["special_s"])
        stats.append(1.0 / theirs["stats_s"])
    chain, chain_alternative = [], []
    for _ in range(rounds):
        chain.append(figure(monte_carlo_bench, points, r"median ([\d.]+) s", arguments.quick))
        drawn = json.loads(run([*alternative, "monte-carlo", points, "3"]))
        chain_alternative.append(drawn["s"])
    if not same_distribution(run([monte_carlo_bench, "--bench", "--quick", points]), drawn):
        return 1
    fit = [program, "bench", "fit", str(points)]
    whole, whole_alternative = in_turn(fit, [*alternative, "fit", str(points)], 15 if arguments.quick else 41)

    series = million_rows(ROOT / "target" / "benchmark")
    long, long_pandas = in_turn(
        [program, "bench", "fit", str(series)], [*alternative, "pandas", str(series.with_suffix(".csv"))], rounds
    )
    text_only = [process([*alternative, "loadtxt", str(series.with_suffix(".csv"))]) for _ in range(1 + rounds // 3)]

    uptakes = measure_uptake(python, uptake_bench, rounds, arguments.quick)
    if uptakes is None:
        return 1
    hour, hour_alternative, hour_unchecked, million, trials = uptakes

    odr = json.loads(run([*alternative, "odr", points]))
    rows = [
        Row("20-point run, whole budget, one core", "1/s", ours, stats, "numpy, scipy.stats", "ratio", 30.0, more=True),
        Row("", "1/s", ours, special, "numpy, scipy.special", None, None, more=True),
        Row("100 000 Monte Carlo trials, two threads", "s", chain, chain_alternative, "numpy, 2 threads", "ours", 0.25),
        Row("bench fit FILE, whole process", "s", seconds(whole), seconds(whole_alternative), "Python, the same file", "ours", 0.020),
        Row("1 000 000 rows read and fitted, whole process", "s", seconds(long), seconds(long_pandas), "pandas, reading only", "ours", 1.0),
        Row("", "s", seconds(long), seconds(text_only), "numpy.loadtxt, reading only", None, None),
        Row("  its peak memory", "MB", megabytes(long), megabytes(long_pandas), "pandas, reading only", "ours", 200.0),
        Row("uptake, one hour at 10 Hz, whole budget", "ms", hour, hour_alternative, "numpy, pandas, statsmodels", "ratio", 8.0),
        Row("", "ms", hour, hour_unchecked, "without its checks of the readings", "ours", 30.0),
        Row("uptake, the hour as 1 000 000 rows", "s", million, None, "", "ours", 1.0),
        Row("uptake, 100 000 trials of two sessions", "s", trials, None, "", "ours", 1.0),
    ]
    print()
    print(f"{'':46} {'unit':>4} {'ours':>10} {'from':>10} {'to':>10} {'other':>10} {'ratio':>7}  aim        against")
    for row in rows:
        print(row.line())
    if odr:
        print(
            f"\nscipy.odr fits one line in {odr['odr_one_fit_s'] * 1e6:.0f} µs; the thirteen stacked fits of the "
            f"alternative take {odr['stacked_thirteen_fits_s'] * 1e6:.0f} µs together, and were used."
        )
    missed = [row for row in rows if not row.met()]
    if arguments.json:
        pathlib.Path(arguments.json).write_text(json.dumps([row.figures() for row in rows], indent=1) + "\n")
    return 1 if missed and arguments.strict else 0


def measure_uptake(python, bench, rounds, quick):
    """Milliseconds of both on the same hour (the alternative with its checks of the readings and without), seconds of a million rows and of
    the trials; none where they do not agree."""
    folder = ROOT / "target" / "benchmark" / "uptake"
    run([bench, "--write", folder])
    number = r"([\d.]+)"
    hour, other, unchecked, million, trials = [], [], [], [], []
    for _ in range(rounds):
        printed = run([bench, "--bench", *(["--quick"] if quick else [])])
        first, second, third = printed.splitlines()
        hour.append(float(re.search(f"median {number} ms", first).group(1)))
        million.append(float(re.search(f"median {number} s", second).group(1)))
        trials.append(float(re.search(f"median {number} s", third).group(1)))
        theirs = json.loads(run([python, BENCHMARKS / "uptake_alternative.py", folder, "3" if quick else "7"]))
        other.append(1e3 * theirs["s"])
        unchecked.append(1e3 * theirs["estimate_s"])
    figures = re.search(f"uptake {number}, u {number}, another day {number}", first).groups()
    off = [abs(float(got) / theirs[name] - 1.0) for got, name in zip(figures, ("uptake", "u", "next_u"))]
    good = max(off) <= TOLERANCE_OF_UPTAKE
    verdict = "agree" if good else "DO NOT AGREE"
    say(f"uptake: both {verdict} on uptake, u and another day's u ({max(off):.1e} apart, {TOLERANCE_OF_UPTAKE:.0e} allowed)")
    return (hour, other, unchecked, million, trials) if good else None


class Row:
    """One figure: ours, the alternative's if there is one, and what is aimed at."""

    def __init__(self, what, unit, ours, other, against, aim_of, aim, more=False):
        self.what, self.unit, self.against, self.more = what, unit, against, more
        self.ours = statistics.median(ours)
        self.other = statistics.median(other) if other else None
        self.least, self.most = min(ours), max(ours)
        self.aim_of, self.aim = aim_of, aim
        # Neighbours in time are compared with one another.
        pairs = [(a / b if more else b / a) for a, b in zip(ours, other or [])]
        self.ratio = statistics.median(pairs) if pairs else None

    def met(self):
        if self.aim_of is None:
            return True
        return self.ratio >= self.aim if self.aim_of == "ratio" else self.ours < self.aim

    def line(self):
        aim = {None: "", "ratio": f"≥ {self.aim} ×", "ours": f"< {self.aim} {self.unit}"}[self.aim_of]
        aim += "" if self.met() else " MISSED"
        numbers = " ".join(f"{v:>10}" for v in map(short, (self.ours, self.least, self.most, self.other)))
        return f"{self.what:46} {self.unit:>4} {numbers} {short(self.ratio):>7}  {aim:10} {self.against}"

    def figures(self):
        keys = ("what", "unit", "against", "ours", "least", "most", "other", "ratio", "aim_of", "aim")
        return {key: getattr(self, key) for key in keys} | {"met": self.met()}


def short(value):
    """Three significant digits, whole numbers whole; nothing for nothing."""
    if value is None:
        return ""
    if value >= 100.0:
        return f"{value:.0f}"
    return f"{value:.{2 - math.floor(math.log10(value))}f}"


def interpreter():
    """A Python that has what the alternative needs."""
    test = "import " + ", ".join(NEEDED)
    if subprocess.run([sys.executable, "-c", test], capture_output=True).returncode == 0:
        return sys.executable
    folder = BENCHMARKS / ".venv"
    python = folder / ("Scripts/python.exe" if os.name == "nt" else "bin/python")
    if not python.exists():
        say(f"making a virtual environment in {folder.relative_to(ROOT)}")
        # What is there already is used; pip fetches the rest.
        venv.create(folder, with_pip=True, system_site_packages=True)
    if subprocess.run([python, "-c", test], capture_output=True).returncode != 0:
        run([python, "-m", "pip", "install", "--quiet", *NEEDED])
    return str(python)


def build():
    """The release binary and the three benchmarks."""
    say("building")
    found = {}
    for what in (["build", "--release", "--bin", "ebbline"], ["bench", "--no-run", "--bench", "analyse", "--bench", "monte_carlo", "--bench", "uptake"]):
        output = run(["cargo", *what, "--message-format=json"], cwd=ROOT)
        for line in output.splitlines():
            message = json.loads(line) if line.startswith("{") else {}
            if message.get("executable"):
                found[message["target"]["name"]] = message["executable"]
    return found["ebbline"], found["analyse"], found["monte_carlo"], found["uptake"]


def agree(program, alternative, file):
    """Whether both programs get the same figures."""
    finished = subprocess.run([program, "bench", "fit", str(file), "--json"], capture_output=True, text=True)
    if finished.returncode not in (0, 1):
        raise subprocess.CalledProcessError(finished.returncode, finished.args, stderr=finished.stderr)
    ours = json.loads(finished.stdout)
    theirs = json.loads(run([*alternative, "fit", file]))
    line, flow, b = ours["line"], ours["flow_at"][0], ours["choke_ratio"]
    checks = {check["check"]: check["value"] for check in ours["checks"]}
    pairs = [
        ("slope", line["slope_l_min_bar"], TOLERANCE),
        ("intercept", line["intercept_l_min"], TOLERANCE),
        ("slope_u", line["slope_u"], TOLERANCE),
        ("intercept_u", line["intercept_u"], TOLERANCE),
        ("covariance", line["covariance"], TOLERANCE),
        ("reduced_chi_square", line["reduced_chi_square"], TOLERANCE),
        ("points_used", line["points_used"], 0.0),
        ("flow", flow["flow_l_min"], TOLERANCE),
        ("u", flow["u"], TOLERANCE),
        ("expanded", flow["expanded"], TOLERANCE),
        ("coverage_factor", flow["coverage_factor"], TOLERANCE),
        ("conformity_probability", ours["conformity_probability"], TOLERANCE),
        ("conductance", ours["sonic_conductance_dm3_s_bar"]["value"], TOLERANCE),
        ("diameter_um", ours["effective_diameter_um"]["value"], TOLERANCE),
        ("straight", checks["straight"], TOLERANCE),
        ("hysteresis", checks["rising = falling"], TOLERANCE),
        ("steady", checks["steady"], TOLERANCE),
        ("repeatable", checks["repeatable"], TOLERANCE),
        ("b", b["value"], TOLERANCE_OF_B),
        ("b_u", b["u"], TOLERANCE_OF_B),
        ("b_low", b["interval_95"][0], TOLERANCE_OF_B),
        ("b_high", b["interval_95"][1], TOLERANCE_OF_B),
    ]
    worst, good = 0.0, ours["verdict"] == theirs["verdict"]
    for name, got, tolerance in pairs:
        want = theirs[name]
        if got is None or want is None:
            good &= got is want
            continue
        off = abs(got - want) / abs(want)
        worst = max(worst, off / tolerance if tolerance else off)
        if off > tolerance:
            good = False
            print(f"{file.name}: {name} is {got!r} here and {want!r} there, {off:.1e} apart", file=sys.stderr)
    verdict = "agree" if good else "DO NOT AGREE"
    say(f"{file.name}: both {verdict} on {len(pairs)} figures and the verdict ({worst:.1e} of the tolerance at most)")
    return good


def same_distribution(printed, theirs):
    """Whether the trials of both have one distribution, as far as 100 000 trials tell."""
    mean, u, low, high = map(float, re.search(r"mean ([\d.]+), u ([\d.]+), 95 % from ([\d.]+) to ([\d.]+)", printed).groups())
    error = theirs["u"] / math.sqrt(100_000.0)
    # Standard errors of a standard deviation and of a 2.5 % quantile of normal values: 0.7 and 2.7 of the mean's.
    off = {
        "mean": (mean - theirs["mean"]) / error,
        "u": (u - theirs["u"]) / (0.71 * error),
        "low": (low - theirs["low"]) / (2.7 * error),
        "high": (high - theirs["high"]) / (2.7 * error),
    }
    # Both sides draw, so the difference has root two of that; four of those happen by chance once in ten thousand.
    good = all(abs(value) < 4.0 * math.sqrt(2.0) for value in off.values())
    words = ", ".join(f"{name} {value:+.1f}" for name, value in off.items())
    say(f"Monte Carlo: both {'agree' if good else 'DO NOT AGREE'}; differences in standard errors: {words}")
    return good


def figure(bench, file, pattern, quick):
    """The figure a benchmark prints."""
    return float(re.search(pattern, run([bench, "--bench", *(["--quick"] if quick else []), file])).group(1))


def in_turn(ours, other, times):
    """Both commands, A B A B …, after one that does not count."""
    process(ours), process(other)
    pairs = [(process(ours), process(other)) for _ in range(times)]
    return [a for a, _ in pairs], [b for _, b in pairs]


def process(command):
    """Seconds from start to end, and peak memory in bytes."""
    start = time.perf_counter()
    child = subprocess.Popen(command, stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL, env=environment())
    _, status, usage = os.wait4(child.pid, 0)
    elapsed = time.perf_counter() - start
    child.returncode = os.waitstatus_to_exitcode(status)
    # 1 is a verdict that is not favourable.
    if child.returncode not in (0, 1):
        raise subprocess.CalledProcessError(child.returncode, command)
    return elapsed, usage.ru_maxrss * (1 if sys.platform == "darwin" else 1024)


def seconds(processes):
    return [elapsed for elapsed, _ in processes]


def megabytes(processes):
    return [peak / 1e6 for _, peak in processes]


def million_rows(folder):
    """An invented time series: twenty levels up and down, held, with the noise of the papers; fixed seed."""
    say(f"writing a series of {ROWS} rows")
    folder.mkdir(parents=True, exist_ok=True)
    draw = random.Random(20)
    levels = [*range(4, 14), *range(13, 3, -1)]
    rate = 100.0
    hold = ROWS / len(levels)
    with open(folder / "series.csv", "w", encoding="utf-8") as table:
        table.write("time_s,ip_bar,flow_l_min\n")
        for i in range(ROWS):
            step = int(i / hold)
            since = (i - step * hold) / rate
            level, before = levels[step], levels[max(step - 1, 0)]
            gauge = level + (before - level) * math.exp(-since / 8.0)
            p1 = gauge + 1.0092
            full = 0.045 * p1 * (0.684255 + 0.000353 * p1) / 0.6878
            flow = full * (1.0 - 2.0 / math.sqrt(1.9e4 * full)) * 1.0732
            shown = gauge + draw.gauss(0.002, 0.002), flow * draw.gauss(1.002, 0.001)
            table.write(f"{i / rate:.2f},{shown[0]:.3f},{shown[1]:.4f}\n")
    text = (BENCHMARKS / "twenty_points.toml").read_text(encoding="utf-8")
    text = text.replace('"twenty_points.csv"', '"series.csv"').replace('rows = "points"', 'rows = "series"')
    text = text.replace('sweep = { column = "sweep" }\n', "")
    file = folder / "series.toml"
    file.write_text(text, encoding="utf-8")
    return file


def environment():
    """One thread for each library, so that a core is a core."""
    names = ("OPENBLAS_NUM_THREADS", "MKL_NUM_THREADS", "OMP_NUM_THREADS", "VECLIB_MAXIMUM_THREADS")
    return os.environ | {name: "1" for name in names}


def run(command, **more):
    command = [str(part) for part in command]
    finished = subprocess.run(command, check=True, stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True, env=environment(), **more)
    return finished.stdout


def say(text):
    print(text, file=sys.stderr, flush=True)


if __name__ == "__main__":
    main()
