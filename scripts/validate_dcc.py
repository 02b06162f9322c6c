#!/usr/bin/env python3
"""Checks certificates as XML against the open schema of digital calibration certificates, its further rules, and its units.

    scripts/validate_dcc.py FILE.xml ...            schema folder ../shared/reference/dcc, where it is
    scripts/validate_dcc.py --schema DIR FILE.xml ...

Three checks of each file: the schema (dcc.xsd 3.3.0 with SI_Format.xsd, by xmllint, from a folder that this project does not carry),
the Schematron rules of the Python package dcclib, and every unit string by the package dsiunits. The packages are put into a virtual
environment in tests/certificate/.venv, once. Without the schema folder or xmllint that check is left out, and said so loudly.

The XML of every kind of certificate is written by `cargo test --test certificate` to target/tmp/certificates.

Exit status: 0 every check held; 1 one did not; 2 something cannot be run; 3 what was run held, but the schema was left out.
"""

import argparse
import pathlib
import re
import shutil
import subprocess
import sys

ROOT = pathlib.Path(__file__).resolve().parent.parent
VENV = ROOT / "tests" / "certificate" / ".venv"
PACKAGES = ["dcclib==0.4.0", "saxonche==13.*", "dsiunits==3.1.3"]
UNIT = re.compile(r"<si:unit(?:XMLList)?>([^<]*)</si:unit(?:XMLList)?>")
# The D-SI discourages bar; each stands in a hybrid beside kilopascal. Nothing else may be remarked on.
DISCOURAGED = re.compile(r"\\bar")


def main():
    arguments = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    arguments.add_argument("--schema", type=pathlib.Path, default=ROOT.parent / "shared" / "reference" / "dcc")
    arguments.add_argument("--inside", action="store_true", help=argparse.SUPPRESS)
    arguments.add_argument("files", nargs="+", type=pathlib.Path)
    given = arguments.parse_args()
    missing = [str(file) for file in given.files if not file.is_file()]
    if missing:
        print("not there:", ", ".join(missing), file=sys.stderr)
        return 2
    if given.inside:
        return further(given.files)
    ran, held = schema(given.schema, given.files)
    python = environment()
    if python is None:
        return 2
    inner = subprocess.run([python, __file__, "--inside", *map(str, given.files)], check=False)
    if inner.returncode not in (0, 1):
        return 2
    if not held or inner.returncode:
        return 1
    return 0 if ran else 3


def schema(folder, files):
    """By xmllint, without network: whether it was run, and whether every file held."""
    xsd, xmllint = folder / "dcc.xsd", shutil.which("xmllint")
    if not xsd.is_file() or xmllint is None:
        what = "xmllint (Debian: libxml2-utils)" if xsd.is_file() else f"the schema {xsd}"
        print(f"**** NOT CHECKED AGAINST THE SCHEMA: {what} is not here ****", file=sys.stderr)
        return False, True
    held = True
    for file in files:
        command = [xmllint, "--nonet", "--noout", "--schema", str(xsd), str(file)]
        result = subprocess.run(command, capture_output=True, text=True, check=False)
        if result.returncode:
            held = False
            print(f"{file}: schema: {result.stderr.strip()[:2000]}")
        else:
            print(f"{file}: schema holds")
    return True, held


def environment():
    """The Python of the virtual environment, made where it is not there."""
    python = VENV / "bin" / "python"
    wanted = VENV / "packages.txt"
    if not (wanted.is_file() and wanted.read_text() == "\n".join(PACKAGES)):
        for command in ([sys.executable, "-m", "venv", str(VENV)], [str(python), "-m", "pip", "install", "-q", *PACKAGES]):
            if subprocess.run(command, check=False).returncode:
                print("cannot run:", " ".join(command), file=sys.stderr)
                return None
        wanted.write_text("\n".join(PACKAGES))
    return str(python)


def further(files):
    """Schematron and units, with the packages at hand."""
    from dcclib.validation import SchematronValidator
    from dsi_unit import DsiUnit

    held = True
    rules = SchematronValidator.for_dcc()
    for file in files:
        result = [f"{one.role} {one.text} ({one.location})" for one in rules.validate_file(str(file)).failed_assertions]
        for says in result:
            held = False
            print(f"{file}: rule: {says}")
        if not result:
            print(f"{file}: rules hold")
        units = {unit for text in UNIT.findall(file.read_text(encoding="utf-8")) for unit in text.split()}
        wrong = sorted(unit for unit in units if not valid(DsiUnit, unit))
        for unit in wrong:
            held = False
            print(f"{file}: unit {unit!r} is none of the D-SI")
        if not units:
            held = False
            print(f"{file}: has no unit at all")
        elif not wrong:
            print(f"{file}: {len(units)} units hold")
    return 0 if held else 1


def valid(unit_type, unit):
    """Valid, but for a remark on bar, which stands beside kilopascal."""
    parsed = unit_type(unit)
    return bool(parsed.valid) or bool(DISCOURAGED.search(unit) and unit_type(DISCOURAGED.sub(r"\\pascal", unit)).valid)


if __name__ == "__main__":
    sys.exit(main())
