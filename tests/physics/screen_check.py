#!/usr/bin/python3
# SPDX-License-Identifier: GPL-3.0-or-later
"""What a screening computes of each candidate, against the commands for one
molecule: the same doubles from `conductance`, `conductance --sensitivity`,
`transmission --nodes` and `check`, over all bundled molecules; and the counts of
the graph against RDKit.

    screen_check.py PROGRAM    (tests/physics/measure.c)
"""
import csv
import glob
import io
import json
import math
import os
import subprocess
import sys

MHO = os.environ["MHO"]
SOURCE = os.environ["MHO_SOURCE"]
TWIST_SIGMA = 8.0
failures = []


def run(*command):
    return subprocess.run(command, capture_output=True, check=True, text=True).stdout


def rows(*arguments):
    return list(csv.DictReader(io.StringIO(run(MHO, *arguments, "--csv", "--exact", "--quiet", *FILES))))


def same(name, what, got, want):
    want = None if want in ("", None) else float(want)
    if got != want:
        failures.append(f"{name}: {what} is {got!r} in a screening, {want!r} alone")


def near(name, what, got, want):
    if (got is None) != (want is None) or (got is not None and abs(got - want) > 1e-9 * (1 + abs(want))):
        failures.append(f"{name}: {what} is {got!r}, expected {want!r}")


def check_conductance(q, row):
    name = q["molecule"]
    for column in ("fermi_eV", "conductance_G0", "log10_G0", "window_low_log10_G0",
                   "window_high_log10_G0", "transmission"):
        same(name, column, q[column], row[column])
    words = set(filter(None, row["warnings"].replace(";", " ").split()))
    if (q["warnings"] == 0) != (not words):
        failures.append(f"{name}: warnings {q['warnings']} and {words}")


def check_error(q, table):
    name = q["molecule"]
    last = next(r for r in table if r["parameter"].startswith("all"))
    same(name, "error", q["error_decades"], last["contribution_decades"])
    if (q["error_rule"] == 1) != ("Monte Carlo" in last["parameter"]):
        failures.append(f"{name}: rule {q['error_rule']} and {last['parameter']}")
    if q["error_decades"] is not None and q["log10_G0"] is not None:
        same(name, "low", q["low"], q["log10_G0"] - q["error_decades"])
        same(name, "high", q["high"], q["log10_G0"] + q["error_decades"])


def check_twist(q, table, m):
    """By the documented formula, from d/dk of every bond that can turn."""
    by_name = {r["parameter"]: r for r in table}
    square = 0.0
    for b in m["bonds"]:
        angle = b["twist_deg"]
        bond = "{}-{}".format(*b["between"])
        row = by_name.get("hopping_eV of " + bond)
        if not (b["rotatable"] or angle) or row is None and "k of " + bond not in by_name:
            continue
        cosine = math.cos(math.radians(angle))
        if abs(cosine) < 0.5 or row is None:
            row = by_name["twist_deg of " + bond]
            if angle == 0:
                return  # flat, in k: the derivative to the angle is zero
            per_log = -float(row["derivative_log10_G0"]) / math.radians(1) / math.sin(math.radians(angle))
        else:
            per_log = float(row["derivative_log10_G0"]) * b["hopping_eV"] / cosine / cosine
        change = max(abs(math.cos(math.radians(angle + s)) - cosine) for s in (-TWIST_SIGMA, TWIST_SIGMA))
        square += (per_log * change) ** 2
    if q["twist_decades"] is not None:
        near(q["molecule"], "twist", q["twist_decades"], math.sqrt(square))


def check_nodes(q, table, m):
    name = q["molecule"]
    one_channel = all(len(c["amplitude"]) == 1 or c["channels"] == "one" for c in m["contacts"].values())
    if q["nodes"] is None:
        if one_channel and "no-pi-path" not in m["warnings"] and m["homo_eV"] is not None:
            failures.append(f"{name}: nodes are missing")
        return
    homo, lumo = m["homo_eV"] - m["fermi_eV"], m["lumo_eV"] - m["fermi_eV"]
    inside = [float(r["energy_eV"]) for r in table
              if r["kind"] == "node" and homo + 1e-10 < float(r["energy_eV"]) < lumo - 1e-10]
    if q["nodes"] != len(inside):
        failures.append(f"{name}: {q['nodes']} nodes in a screening, {len(inside)} alone")
    elif inside:
        nearest = min(inside, key=abs)
        if abs(q["node_eV"] - nearest) > 1e-10:
            failures.append(f"{name}: node at {q['node_eV']!r} in a screening, {nearest!r} alone")


def check_graph(q, text):
    try:
        from rdkit import Chem
    except ImportError:
        return False
    mol = Chem.MolFromSmiles(text)
    systems = []
    for ring in Chem.GetSymmSSSR(mol):
        ring = set(ring)
        for other in [s for s in systems if s & ring]:
            systems.remove(other)
            ring |= other
        systems.append(ring)
    parts = len(Chem.GetMolFrags(mol))
    for what, want in (("heavy_atoms", mol.GetNumHeavyAtoms()), ("ring_systems", len(systems)),
                       ("rings", mol.GetNumBonds() - mol.GetNumAtoms() + parts)):
        if q[what] != want:
            failures.append(f"{q['molecule']}: {what} {q[what]}, RDKit {want}")
    return True


def smiles_of(path):
    for line in open(path, encoding="utf-8"):
        if line.startswith("smiles:"):
            return line.split(":", 1)[1].split("  #")[0].strip().strip('"').strip("'")
    return None


def group(table):
    result = {}
    for row in table:
        result.setdefault(row["molecule"], []).append(row)
    return result


FILES = [f for f in sorted(glob.glob(os.path.join(SOURCE, "molecules", "*.yaml")))
         if "chain:" not in open(f, encoding="utf-8").read()]  # refused by a screening


def main():
    measured = [json.loads(line) for line in run(sys.argv[1], *FILES).splitlines()]
    conductance = group(rows("conductance"))
    sensitivity = group(rows("conductance", "--sensitivity"))
    nodes = group(rows("transmission", "--nodes"))
    checked = json.loads(run(MHO, "check", "--json", "--exact", *FILES))["molecules"]
    drawn = 0
    assert len(measured) == len(checked) == len(FILES) > 100
    for q, m, path in zip(measured, checked, FILES):
        name = q["molecule"]
        assert name == m["name"]
        check_conductance(q, conductance[name][0])
        check_error(q, sensitivity[name])
        check_twist(q, sensitivity[name], m)
        check_nodes(q, nodes.get(name, []), m)
        for what in ("homo_eV", "lumo_eV", "length_nm"):
            same(name, what, q[what], m[what])
        same(name, "rotatable bonds", q["rotatable_bonds"], sum(b["rotatable"] for b in m["bonds"]))
        text = smiles_of(path)
        if text:
            drawn += check_graph(q, text)
    for line in failures:
        print(line)
    print(f"{len(measured)} molecules, {drawn} graphs, {len(failures)} differences")
    return 1 if failures else 0


sys.exit(main())
