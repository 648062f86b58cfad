#!/usr/bin/python3
# SPDX-License-Identifier: GPL-3.0-or-later
"""Files written by RDKit against RDKit and against the SMILES they came from:
V2000 and V3000 records give the formulas and hydrogens of RDKit and the sites,
bonds and levels of the SMILES; in space, molfile and XYZ give the levels that
the SMILES gives with the dihedral angles of RDKit.  files.py [SEEDS-FOLDER]
also leaves files to mutate there."""
import json
import os
import subprocess
import sys
import tempfile

from rdkit import Chem, RDLogger
from rdkit.Chem import AllChem
from rdkit.Chem.rdMolDescriptors import CalcMolFormula

from molecules import molecules

RDLogger.DisableLog("rdApp.*")
MHO = os.environ["MHO"]
PERCEIVE = os.path.join(os.environ["MHO_BUILD"], "tests", "perceive")
failures = []

FLEXIBLE = """Nc1ccc(cc1)-c1ccc(N)cc1 Sc1ccc(cc1)-c1ccc(S)cc1 Nc1ccc(C=Cc2ccc(N)cc2)cc1 C=CC=CC=C
Sc1ccc(C#Cc2ccc(S)cc2)cc1 n1ccc(cc1)-c1ccncc1 Cc1cc(N)ccc1-c1ccc(N)cc1 Nc1ccc2c(c1)Cc1cc(N)ccc12
O=[N+]([O-])c1ccc(N)cc1 N#Cc1ccc(C#N)cc1 [C-]#[N+]c1ccc([N+]#[C-])cc1 OC(=O)c1ccc(C(=O)O)cc1
Sc1ccc(-c2cccs2)cc1 CC(=O)Sc1ccc(SC(C)=O)cc1 C1=CC=C2C=CC=C2C=C1
O=C1c2ccccc2C(=O)c2ccccc12 [O-][n+]1ccccc1 C=C=C""".split()


def check(path, *options):
    run = subprocess.run([MHO, "check", "--json", "--quiet", *options, path], capture_output=True, text=True)
    return (json.loads(run.stdout)["molecules"] if run.stdout else []), run.stderr


def parsed(smiles):
    """As RDKit reads it, hydrogens that are written staying atoms."""
    settings = Chem.SmilesParserParams()
    settings.removeHs = False
    molecule = Chem.MolFromSmiles(smiles, settings)
    return molecule


def write_records(path, smiles, v3000):
    with open(path, "w") as out:
        for text in smiles:
            m = parsed(text)
            m.SetProp("_Name", text)
            out.write(Chem.MolToMolBlock(m, forceV3000=v3000) + "$$$$\n")


def compare_graphs(path, smiles):
    run = subprocess.run([PERCEIVE, "records=" + path], capture_output=True, check=True)
    answers = [json.loads(line) for line in run.stdout.splitlines()]
    if len(answers) != len(smiles):
        failures.append(f"{path}: {len(answers)} records of {len(smiles)}")
    for text, ours in zip(smiles, answers):
        theirs = parsed(text)
        hydrogens = [a.GetTotalNumHs(includeNeighbors=True) for a in theirs.GetAtoms()]
        if "error" in ours:
            failures.append(f"{path}: {text}: refused: {ours['error']['message']}")
        elif ours["formula"] != CalcMolFormula(theirs) or ours["hydrogens"] != hydrogens:
            failures.append(f"{path}: {text}: {ours['formula']}, RDKit {CalcMolFormula(theirs)}")
    return len(answers)


def plain(m):
    """Sites without their place in the drawing, bonds without their order."""
    sites = [(s["id"], s["element"], s["onsite_eV"], s["electrons"]) for s in m["sites"]]
    bonds = sorted((*sorted(b["between"]), b["hopping_eV"], b["twist_deg"], b["rotatable"]) for b in m["bonds"])
    return sites, bonds


def compare_models(path, smiles, scratch):
    """The models of the records are those of the SMILES."""
    listed = os.path.join(scratch, "all.smi")
    with open(listed, "w") as out:
        out.writelines(f"{s} {s}\n" for s in smiles)
    first, _ = check(listed)
    second, _ = check(path)
    by_name = {m["name"].split(" ")[0]: m for m in second}
    compared = 0
    for m in first:
        other = by_name.get(m["name"].split(" ")[0])
        if other is None:
            failures.append(f"{path}: {m['name']} is missing")
            continue
        compared += 1
        for key in ("electrons", "charge", "contacts", "linkers"):
            if m[key] != other[key]:
                failures.append(f"{path}: {m['name']}: {key} differ")
        if plain(m) != plain(other):
            failures.append(f"{path}: {m['name']}: sites or bonds differ")
        if any(abs(a - b) > 1e-9 for a, b in zip(m["levels_eV"], other["levels_eV"])):
            failures.append(f"{path}: {m['name']}: levels differ")
    if len(first) != len(second) or compared < len(smiles) // 2:
        failures.append(f"{path}: {len(second)} molecules, {len(first)} as SMILES, {compared} compared")
    return compared


def angle(m, bond):
    """Between the p axes at the ends of a bond, from RDKit's positions, 0 to 90."""
    import numpy as np
    at = np.array(m.GetConformer().GetPositions())
    axes = []
    for a, b in (bond, bond[::-1]):
        others = [n.GetIdx() for n in m.GetAtomWithIdx(a).GetNeighbors() if n.GetIdx() != b]
        side = at[others[0]] - (at[others[1]] if len(others) > 1 else at[a])
        axes.append(np.cross(side, at[b] - at[a]))
    cosine = abs(axes[0] @ axes[1]) / np.linalg.norm(axes[0]) / np.linalg.norm(axes[1])
    return np.degrees(np.arccos(min(1, cosine)))


def compare_geometries(scratch, seeds):
    compared = twists = 0
    for i, text in enumerate(FLEXIBLE):
        m = Chem.AddHs(Chem.MolFromSmiles(text))
        AllChem.EmbedMolecule(m, randomSeed=11)
        AllChem.MMFFOptimizeMolecule(m)
        paths = [os.path.join(scratch, f"{i}.mol"), os.path.join(scratch, f"{i}-3000.mol"),
                 os.path.join(scratch, f"{i}.xyz")]
        Chem.MolToMolFile(m, paths[0])
        Chem.MolToV3KMolFile(m, paths[1])
        Chem.MolToXYZFile(m, paths[2])
        if seeds and i in (0, 4, 6):
            for path in paths:
                with open(path) as source, open(os.path.join(seeds, os.path.basename(path)), "w") as out:
                    out.write(source.read())
        found = [check(path) for path in paths]
        if not all(f[0] for f in found):
            failures.append(f"{text}: refused: {[f[1] for f in found]}")
            continue
        models = [f[0][0] for f in found]
        setting = []
        for bond in models[0]["bonds"]:
            ends = [int("".join(filter(str.isdigit, s.rstrip("b")))) - 1 for s in bond["between"]]
            single = all(len(m.GetAtomWithIdx(a).GetNeighbors()) == 3 for a in ends)
            if bond["rotatable"] and single:
                twists += 1
                if abs(angle(m, ends) - bond["twist_deg"]) > 0.05:
                    failures.append(f"{text}: {bond['between']}: {bond['twist_deg']}, RDKit {angle(m, ends)}")
            if bond["rotatable"]:
                setting += ["--twist", f"{'-'.join(bond['between'])} = {bond['twist_deg']} deg"]
        drawn, errors = check(text, *setting)
        if not drawn:
            failures.append(f"{text}: as a SMILES: {errors}")
            continue
        for model, path in zip(models + drawn, paths + ["SMILES"]):
            levels = model["levels_eV"]
            same = len(levels) == len(models[0]["levels_eV"]) and all(
                abs(a - b) < 2e-4 for a, b in zip(levels, models[0]["levels_eV"]))
            if not same or model["electrons"] != models[0]["electrons"]:
                failures.append(f"{text}: levels of {path} and of the molfile differ")
        compared += 1
    return compared, twists


def main():
    seeds = sys.argv[1] if len(sys.argv) > 1 else None
    # Metals with bonds and the wildcard are what molfiles say otherwise.
    smiles = [s for s in dict.fromkeys(molecules(700)) if "*" not in s and parsed(s) is not None]
    with tempfile.TemporaryDirectory() as scratch:
        for v3000 in (False, True):
            path = os.path.join(scratch, f"v{3 if v3000 else 2}000.sdf")
            write_records(path, smiles, v3000)
            print(os.path.basename(path), compare_graphs(path, smiles), "graphs,",
                  compare_models(path, smiles, scratch), "models")
        print("geometries, twists:", *compare_geometries(scratch, seeds))
        if seeds:
            for name, v3000 in (("two.sdf", False), ("three.sdf", True)):
                write_records(os.path.join(seeds, name), smiles[:200:25], v3000)
    for line in failures[:40]:
        print(line)
    print(len(failures), "failures")
    return bool(failures)


if __name__ == "__main__":
    sys.exit(main())
