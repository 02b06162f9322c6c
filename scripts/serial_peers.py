#!/usr/bin/env python3
"""Tries Ebbline's serial side against programs of others: socat's pseudo-terminals and pymodbus's device.

    scripts/serial_peers.py [EBBLINE]     the program; target/release/ebbline by default

Each peer is started, `instrument try` listens to it with a profile that fits and one that does not, and what it read is
compared with what the peer says. socat is installed with apt-get where it is missing and that can be done; pymodbus goes
into a virtual environment in target/peers. What cannot be had is said loudly and left out; with --strict that fails.

Exit status: 0 all that was tried holds; 1 something does not, or is left out and --strict was given; 2 no program.
"""

import argparse
import json
import os
import pathlib
import shutil
import signal
import subprocess
import sys
import tempfile
import time
import venv

ROOT = pathlib.Path(__file__).resolve().parent.parent
TARGET = pathlib.Path(os.environ.get("CARGO_TARGET_DIR", ROOT / "target"))
# The release this was written against; its interface has changed before.
PYMODBUS = "pymodbus[serial]==3.16.1"
LISTEN = "2 s"
# Longest time for a trial, with the other settings that it tries where a profile does not do well.
PATIENCE_S = 300


def main():
    parser = argparse.ArgumentParser(description="Tries instruments that are programs of others.")
    parser.add_argument("program", nargs="?", default=str(TARGET / "release" / "ebbline"), help="the program")
    parser.add_argument("--strict", action="store_true", help="exit with 1 when a peer cannot be had")
    arguments = parser.parse_args()
    program = shutil.which(arguments.program)
    if program is None:
        print(f"no program at {arguments.program}: build it with `cargo build --release`", file=sys.stderr)
        return 2
    left_out, failed = 0, 0
    with tempfile.TemporaryDirectory(prefix="ebbline-peers-") as folder:
        trial = Trial(pathlib.Path(program).resolve(), pathlib.Path(folder))
        for name, peer in (("socat", with_socat), ("pymodbus", with_pymodbus)):
            try:
                peer(trial)
            except Missing as missing:
                print(f"*** LEFT OUT: {name}: {missing} ***", flush=True)
                left_out += 1
        failed = trial.failed
        print(f"{trial.held} of {trial.held + failed} trials hold, {left_out} peers left out")
    return 1 if failed or (left_out and arguments.strict) else 0


class Missing(Exception):
    """A peer that cannot be had."""


class Trial:
    """Runs `instrument try` and keeps account."""

    def __init__(self, program, folder):
        self.program, self.folder, self.held, self.failed = program, folder, 0, 0

    def of(self, what, profile, check):
        """`check` takes the document and the exit status, and returns what is wrong with them, if anything."""
        file = self.folder / "instrument.toml"
        file.write_text(profile, encoding="utf-8")
        call = [self.program, "--json", "instrument", "try", str(file), "--for", LISTEN]
        home = dict(os.environ, EBBLINE_BOOK=str(self.folder / "no-book.db"))
        try:
            done = subprocess.run(
                call, env=home, capture_output=True, text=True, timeout=PATIENCE_S, stdin=subprocess.DEVNULL
            )
            wrong = check(json.loads(done.stdout), done.returncode)
        except subprocess.TimeoutExpired:
            done, wrong = None, f"not done after {PATIENCE_S} s"
        except (ValueError, KeyError) as error:
            wrong = f"status {done.returncode}, and {error!r} in {done.stdout!r}"
        if wrong is None:
            self.held += 1
            print(f"holds: {what}", flush=True)
        else:
            self.failed += 1
            print(f"DOES NOT HOLD: {what}: {wrong}", flush=True)
            if done is not None:
                print(done.stderr, end="")


def reads(value, unit, least=5, tolerance=0.0):
    """A check that every reading is `value`, or passes it when that is a function of all of them."""

    def check(document, status):
        values = [one["value"] for one in document["values"]]
        if status != 0 or not document["reads_well"]:
            return f"status {status}: {document['says']}"
        if len(values) < least:
            return f"{len(values)} readings, and {least} are the least there should be"
        units = {one["unit"] for one in document["values"]}
        if units != {unit}:
            return f"units {units}"
        if callable(value):
            return value(values)
        off = [one for one in values if abs(one - value) > tolerance]
        return f"{off[0]} is not {value}" if off else None

    return check


def refused(mentions, proposes=None):
    """A check that it does not read well, names a fault, and proposes what would do better."""

    def check(document, status):
        if status != 1 or document["reads_well"] or document["readings"] != 0:
            return f"status {status}: {document['says']}"
        faults = [one["fault"] for one in document["faults"]]
        if mentions not in faults:
            return f"faults {faults}"
        changes = [change for proposal in document["proposals"] for change in proposal["changes"]]
        if proposes and proposes not in [(change["key"], change["to"]) for change in changes]:
            return f"proposals {changes}"
        return None

    return check


def count_up(values):
    """Thousandths that count from 500 to 599 and begin again: none is left out, doubled or cut."""
    steps = [round(value * 1000) for value in values]
    if any(abs(value * 1000 - step) > 1e-9 or not 500 <= step < 600 for value, step in zip(values, steps)):
        return f"a number that was never said: {values}"
    return None if all((b - a) % 100 == 1 for a, b in zip(steps, steps[1:])) else f"not one after the other: {steps}"


def profile(port, protocol, measures="flow", unit="L/min", baud=19_200, frame="8N1"):
    head = {"record": "instrument", "id": "PEER", "measures": measures, "port": str(port), "frame": frame, "unit": unit}
    lines = [f"{key} = {json.dumps(value, ensure_ascii=False)}" for key, value in head.items()]
    lines += [f"baud = {baud}", "", "[protocol]"]
    lines += [f"{key} = {json.dumps(value)}" for key, value in protocol.items()]
    return "\n".join(lines) + "\n"


def lines(ask=None, ends="\r\n"):
    protocol = {"kind": "lines", "every": "50 ms", "ends": ends, "pattern": r"(?P<value>[-+]?\d+(\.\d+)?)"}
    return protocol | ({"ask": ask} if ask else {})


def registers(table, register, number, order, scale=None):
    protocol = {"kind": "modbus-rtu", "device": 1, "table": table, "register": register}
    protocol |= {"type": number, "word_order": order, "every": "50 ms"}
    return protocol | ({"scale": scale} if scale else {})


def with_socat(trial):
    socat = shutil.which("socat") or install("socat")
    stream = r"""i=0; while :; do printf '0.%d L/min\r\n' $((500 + i % 100)); i=$((i + 1)); sleep 0.02; done"""
    with Peer(trial, socat, "stream", stream) as port:
        trial.of("text, streamed", profile(port, lines()), reads(count_up, "L/min", least=20))
        trial.of("the same with another ending", profile(port, lines(ends="\n")), reads(count_up, "L/min", least=20))
    answers = r"""i=0; while read -r line; do case $line in READ\?) printf '0.%d\r\n' $((500 + i % 100)); i=$((i + 1));; esac; done"""
    with Peer(trial, socat, "asked", answers) as port:
        trial.of("text, asked for", profile(port, lines(ask="READ?\n")), reads(count_up, "L/min", least=10))
        trial.of("a question that is not known", profile(port, lines(ask="MEAS?\n")), refused("silence"))


def with_pymodbus(trial):
    python = modbus_python()
    peer = subprocess.Popen(
        [python, ROOT / "scripts" / "modbus_peer.py"], stdin=subprocess.PIPE, stdout=subprocess.PIPE, text=True
    )
    try:
        port = peer.stdout.readline().strip()
        if not port:
            raise Missing("its device does not start; what it says stands above")
        time.sleep(1.0)

        def pressure(what, protocol, check, **more):
            trial.of(what, profile(port, protocol, "pressure", "bar", **more), check)

        pressure("Modbus, i32 of input registers", registers("input", 0, "i32", "big", 0.001), reads(10.5, "bar"))
        # 10.37 as binary32 is 10.3699998856, to ten digits.
        binary = reads(10.3699998856, "bar", tolerance=5e-11)
        pressure("Modbus, f32, high word first", registers("holding", 0, "f32", "big"), binary)
        pressure("Modbus, f32, low word first", registers("holding", 2, "f32", "little"), binary)
        wrong = registers("holding", 2, "f32", "big")
        pressure("Modbus, f32 in the wrong order", wrong, refused("impossible", ("protocol.word_order", "little")))
        pressure("Modbus, a register there is not", registers("holding", 900, "f32", "big"), refused("refused"))
    finally:
        peer.stdin.close()
        end(peer)


class Peer:
    """A pseudo-terminal of socat's with a shell behind it."""

    def __init__(self, trial, socat, name, script):
        self.link = trial.folder / name
        shell = trial.folder / f"{name}.sh"
        shell.write_text(script + "\n", encoding="utf-8")
        # A group of its own, so that the shell ends with it.
        self.process = subprocess.Popen(
            [socat, f"PTY,link={self.link},raw,echo=0", f"EXEC:sh {shell}"],
            stdin=subprocess.DEVNULL,
            start_new_session=True,
        )

    def __enter__(self):
        for _ in range(100):
            if self.link.exists():
                return self.link
            time.sleep(0.05)
        end(self.process, group=True)
        raise Missing("it makes no pseudo-terminal; what it says stands above")

    def __exit__(self, *_):
        end(self.process, group=True)


def end(process, group=False):
    for how in (signal.SIGTERM, signal.SIGKILL):
        try:
            os.killpg(process.pid, how) if group else process.send_signal(how)
            process.wait(5)
            return
        except ProcessLookupError:
            process.wait(5)
            return
        except subprocess.TimeoutExpired:
            continue


def install(package):
    rights = [] if os.geteuid() == 0 else [shutil.which("sudo") or "", "-n"]
    if shutil.which("apt-get") is None or (rights and not rights[0]):
        raise Missing(f"{package} is not installed, and apt-get and the right to use it are not both there")
    for step in (["update", "-q"], ["install", "-qy", package]):
        subprocess.run([*rights, "apt-get", *step], stdout=subprocess.DEVNULL, stderr=subprocess.STDOUT, check=False)
    return shutil.which(package) or missing(f"apt-get did not install {package}")


def missing(why):
    raise Missing(why)


def modbus_python():
    """A Python that has pymodbus in the release asked for."""
    folder = TARGET / "peers"
    python = folder / "bin" / "python"
    asks = [python, "-c", "import pymodbus, serial; print(pymodbus.__version__)"]
    wanted = PYMODBUS.rpartition("==")[2]
    try:
        if not python.exists():
            venv.create(folder, with_pip=True)
        had = subprocess.run(asks, capture_output=True, text=True)
        if had.stdout.strip() != wanted:
            pip = [python, "-m", "pip", "install", "--quiet", "--disable-pip-version-check", PYMODBUS]
            subprocess.run(pip, check=True)
    except (OSError, subprocess.CalledProcessError) as error:
        raise Missing(f"{PYMODBUS} cannot be installed: {error}") from error
    return python


if __name__ == "__main__":
    sys.exit(main())
