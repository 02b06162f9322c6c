#!/usr/bin/env python3
"""Measures how long certificates take, beside reportlab drawing the same tables, in one run.

    scripts/benchmark_certificate.py [--quick] [--strict] [EBBLINE]     target/release/ebbline by default

A book is filled with invented runs, one an orifice, each judged. Then, in turns:

1. `ebbline certificate issue RUN`, the whole process from start to end: the run is read from the book, fitted, set in pages as
   tagged PDF/A-3A with its drawing, its XML and its files inside, recomputed from those, and written (aim: under 100 ms);
2. python with reportlab, the whole process: as many pages of plain tables with the same figures (points, flows over IP, budget,
   checks, from `bench fit --json`), no drawing, no tags, no attachments;
3. a thousand certificates of that book (--quick: fifty), two processes at a time as the machine has cores (aim: under 30 s).

Reasons to doubt it: the alternative does a part of the work only, and the machine's other work is in every figure.

Exit status: 0 measured; 1 with --strict when an aim is missed; 2 something cannot be run.
"""

import argparse
import concurrent.futures
import json
import os
import pathlib
import statistics
import subprocess
import sys
import tempfile
import time
import venv

ROOT = pathlib.Path(__file__).resolve().parent.parent
TARGET = pathlib.Path(os.environ.get("CARGO_TARGET_DIR", ROOT / "target"))
ENVIRONMENT = TARGET / "reportlab"

ALTERNATIVE = """
import json, sys
from reportlab.lib.pagesizes import A4
from reportlab.platypus import Paragraph, SimpleDocTemplate, Table
from reportlab.lib.styles import getSampleStyleSheet
fit = json.load(open(sys.argv[1]))
style = getSampleStyleSheet()
def table(rows):
    heads = [key for key, value in rows[0].items() if not isinstance(value, (list, dict))]
    return Table([heads] + [[str(row[head]) for head in heads] for row in rows], repeatRows=1)
story = [Paragraph("Calibration certificate", style["Title"])]
for name in ("points", "flow_at", "budget", "checks"):
    story += [Paragraph(name, style["Heading2"]), table(fit[name])]
SimpleDocTemplate(sys.argv[2], pagesize=A4).build(story)
"""

SHOP = 'record = "shop"\nname = "Invented Works"\naddress = "1 Slip Road\\nNowhere\\nAQ"\nsignatories = ["B. Invented"]\n'
ACCEPTANCE = 'record = "acceptance"\nid = "A"\nip = "10 bar"\nflow = "0.48 L/min"\ntolerance = "10 %"\n'
RUN = """record = "bench run"
orifice = "{orifice}"
gas = "oxygen"
purpose = "acceptance"
taken = "2026-11-12T09:40:00+00:00"
technician = "B. Invented"
readings = "{orifice}.csv"
rows = "points"

[columns]
pressure = {{ column = "ip", unit = "bar" }}
flow = {{ column = "flow", unit = "L/min" }}
sweep = {{ column = "sweep" }}

[conditions]
temperature = "21.0 °C ± 1.0 °C"
barometer = "1009.2 hPa ± 1.0 hPa"
back_pressure = "0 mbar"

[meter]
kind = "mass"
reads_at = "20 °C, 101.325 kPa"
made_for = "oxygen"
gain = "0.8 %"
zero = "0.0005 L/min"
resolution = "0.0001 L/min"
certificate = "invented-1"
due = 2027-03-01

[transducer]
gain = "0.1 %"
zero = "0.005 bar"
resolution = "0.001 bar"
certificate = "invented-2"
due = 2027-03-01

[acceptance]
ip = "10 bar"
flow = "0.48 L/min"
tolerance = "10 %"
"""


def main():
    parser = argparse.ArgumentParser(description="Measures how long certificates take.")
    parser.add_argument("program", nargs="?", default=str(TARGET / "release" / "ebbline"), metavar="EBBLINE")
    parser.add_argument("--quick", action="store_true", help="fewer certificates")
    parser.add_argument("--strict", action="store_true", help="exit with 1 when an aim is missed")
    arguments = parser.parse_args()
    if not pathlib.Path(arguments.program).exists():
        print(f"there is no {arguments.program}: cargo build --release makes it", file=sys.stderr)
        return 2
    with tempfile.TemporaryDirectory() as folder:
        return measured(arguments, pathlib.Path(folder))


def measured(arguments, folder):
    count = 50 if arguments.quick else 1000
    ebbline = program(arguments.program, folder)
    fill(ebbline, folder, count)
    python = reportlab()
    fit = folder / "fit.json"
    fit.write_text(ebbline("bench", "fit", "R0001", "--json"))
    (folder / "alternative.py").write_text(ALTERNATIVE)
    ours, theirs = [], []
    for turn in range(10 if arguments.quick else 30):
        ours.append(timed([arguments.program, "certificate", "issue", "R0001", "--into", str(folder / "out")], folder))
        if python:
            theirs.append(timed([python, "alternative.py", str(fit), "out.pdf"], folder))
    issue, met = statistics.median(ours), []
    print(f"certificate issue, whole process: {issue * 1e3:.0f} ms median, {min(ours) * 1e3:.0f} to {max(ours) * 1e3:.0f}")
    met.append(aim("under 100 ms", issue < 0.1))
    if python:
        other = statistics.median(theirs)
        print(f"reportlab, the tables alone, whole process: {other * 1e3:.0f} ms median ({other / issue:.1f} times ours)")
    else:
        print("*** LEFT OUT: reportlab cannot be installed here, so there is nothing to compare with ***")
    began = time.monotonic()
    with concurrent.futures.ThreadPoolExecutor(os.cpu_count()) as pool:
        list(pool.map(lambda n: ebbline("certificate", "issue", f"R{n:04}", "--into", "all"), range(1, count + 1)))
    lasted = time.monotonic() - began
    files = len(list((folder / "all").glob("*.pdf")))
    if files != count:
        print(f"{files} certificates of {count} were written", file=sys.stderr)
        return 2
    print(f"{count} certificates of one book, {os.cpu_count()} processes at a time: {lasted:.1f} s")
    met.append(aim(f"under {0.03 * count:.1f} s", lasted < 0.03 * count))
    return 1 if arguments.strict and not all(met) else 0


def aim(words, is_met):
    print(f"  aim {words}: {'MET' if is_met else 'MISSED'}")
    return is_met


def program(path, folder):
    environment = dict(os.environ, EBBLINE_BOOK=str(folder / "book.db"))

    def run(*arguments):
        done = subprocess.run([path, *arguments], cwd=folder, env=environment, capture_output=True, text=True)
        if done.returncode > 1:
            sys.exit(f"{' '.join(arguments)}: {done.stderr}")
        return done.stdout

    return run


def fill(ebbline, folder, count):
    (folder / "shop.toml").write_text(SHOP)
    ebbline("shop", "edit", "./shop.toml")
    ips = [4 + i for i in range(10)] + [12 - i for i in range(9)]
    names = []
    for n in range(1, count + 1):
        orifice = f"B-{n:04}"
        (folder / f"{orifice}.toml").write_text(RUN.format(orifice=orifice))
        rows = [f"{ip:.3f},{0.0466 * (ip + 0.95) * (1 + 2e-4 * ((7 * i + n) % 5 - 2)):.4f},{'rising' if i < 10 else 'falling'}"
                for i, ip in enumerate(ips)]
        (folder / f"{orifice}.csv").write_text("ip,flow,sweep\n" + "\n".join(rows) + "\n")
        (folder / f"o-{orifice}.toml").write_text(
            f'record = "orifice"\nid = "{orifice}"\ndescription = "restrictor, invented"\nserial = "{n}"\n'
            'maker = "invented"\ncustomer = "Invented Club; 2 Quay Street; Nowhere"\nbuild = "short tube"\n')
        names.append(f"./o-{orifice}.toml")
    ebbline("orifice", "add", *names)
    ebbline("bench", "import", *[f"./B-{n:04}.toml" for n in range(1, count + 1)])
    with concurrent.futures.ThreadPoolExecutor(os.cpu_count()) as pool:
        list(pool.map(lambda n: ebbline("bench", "accept", f"R{n:04}"), range(1, count + 1)))


def reportlab():
    python = ENVIRONMENT / "bin" / "python"
    try:
        if not python.exists():
            venv.create(ENVIRONMENT, with_pip=True)
        subprocess.run([python, "-m", "pip", "install", "-q", "reportlab"], check=True, capture_output=True)
    except (OSError, subprocess.CalledProcessError):
        return None
    return str(python)


def timed(command, folder):
    environment = dict(os.environ, EBBLINE_BOOK=str(folder / "book.db"))
    began = time.monotonic()
    done = subprocess.run(command, cwd=folder, env=environment, capture_output=True, text=True)
    if done.returncode != 0:
        sys.exit(f"{' '.join(command)}: {done.stderr}")
    return time.monotonic() - began


if __name__ == "__main__":
    sys.exit(main())
