#!/usr/bin/python3
# SPDX-License-Identifier: GPL-3.0-or-later
"""`conductance --sensitivity` against central differences of `conductance`
itself, moved by its own options and by the angle in the file; which rule is
chosen; the same numbers again for one seed, others for another."""
import csv
import io
import math
import os
import subprocess
import sys
import tempfile

MHO = os.environ["MHO"]
MOLECULES = os.path.join(os.environ["MHO_SOURCE"], "molecules")


def table(*arguments):
    text = subprocess.run([MHO, "conductance", "--csv", "--exact", *arguments], check=True,
                          capture_output=True, text=True).stdout
    return list(csv.DictReader(io.StringIO(text)))


def log10_g(path, *options):
    return float(table(path, *options)[0]["log10_G0"])


def sensitivity(path, *options):
    return {row["parameter"]: row for row in table("--sensitivity", path, *options)}


def moved(path, twist):
    text = open(path).read()
    assert "twist: 34 deg" in text
    name = os.path.join(tempfile.mkdtemp(), "moved.yaml")
    with open(name, "w") as file:
        file.write(text.replace("twist: 34 deg", f"twist: {twist!r} deg"))
    return name


def main():
    failures = []

    def check(what, got, want, tolerance):
        if not abs(got - want) <= tolerance * max(1, abs(want)):
            failures.append(f"{what}: {got!r}, by differences {want!r}")
    path = os.path.join(MOLECULES, "biphenyl-4-4-diamine.yaml")
    rows = sensitivity(path)
    step = 1e-4
    for parameter, up, down, width in (
            ("fermi_eV", ["--fermi", "1e-4 eV"], ["--fermi=-1e-4 eV"], 2 * step),
            ("beta_eV", ["--beta=-2.6999 eV"], ["--beta=-2.7001 eV"], 2 * step),
            ("ln coupling of both contacts", ["--coupling", "1.0001 eV"],
             ["--coupling", "0.9999 eV"], math.log(1.0001 / 0.9999))):
        want = (log10_g(path, *up) - log10_g(path, *down)) / width
        check(parameter, float(rows[parameter]["derivative_log10_G0"]), want, 1e-6)
    want = (log10_g(moved(path, 34.001)) - log10_g(moved(path, 33.999))) / 0.002
    check("twist", float(rows["twist_deg of c1-d1"]["derivative_log10_G0"]), want, 1e-6)
    linear = math.sqrt(sum(float(r["contribution_decades"]) ** 2 for name, r in rows.items()
                           if not name.startswith("all")))
    check("sum", float(rows["all (linear rule)"]["contribution_decades"]), linear, 1e-12)

    meta = os.path.join(MOLECULES, "benzene-1-3-diamine.yaml")
    one, again, other = (sensitivity(meta, "--seed", s) for s in ("1", "1", "2"))
    if "all (Monte Carlo)" not in one or one != again or one == other:
        failures.append("meta-benzene: not Monte Carlo, or not by its seed")
    print("\n".join(failures) or "all well")
    return 1 if failures else 0


sys.exit(main())
