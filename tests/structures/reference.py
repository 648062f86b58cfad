# SPDX-License-Identifier: GPL-3.0-or-later
"""Structures against RDKit: formula, hydrogens, rings, Kekule structures, pi
electrons of aromatic rings; and what spelling must not change.

Where the two differ on purpose, EXPLAINED says why."""
import json
import os
import random
import subprocess
import sys

import numpy as np
from rdkit import Chem, RDLogger
from rdkit.Chem.rdMolDescriptors import CalcMolFormula

from molecules import KNOWN, molecules

RDLogger.DisableLog("rdApp.*")
PERCEIVE = os.path.join(os.environ["MHO_BUILD"], "tests", "perceive")
failures = []


def perceive(smiles, *options):
    text = "".join(line + "\n" for line in smiles)
    run = subprocess.run([PERCEIVE, *options], input=text.encode(), capture_output=True, check=True)
    answers = [json.loads(line) for line in run.stdout.splitlines()]
    assert len(answers) == len(smiles)
    return answers


def expect(smiles, what, ours, theirs):
    if ours != theirs:
        failures.append(f"{smiles}: {what} {ours}, RDKit {theirs}")


# --- facts of the drawing ------------------------------------------------

def compare_graphs(smiles, answers):
    for text, ours in zip(smiles, answers):
        if "error" in ours:
            failures.append(f"{text}: refused: {ours['error']['message']}")
            continue
        # Hydrogens stay atoms, as in our numbering.
        settings = Chem.SmilesParserParams()
        settings.removeHs = False
        theirs = Chem.MolFromSmiles(text, settings)
        expect(text, "formula", ours["formula"], CalcMolFormula(theirs))
        expect(text, "hydrogens", ours["hydrogens"],
               [a.GetTotalNumHs(includeNeighbors=True) for a in theirs.GetAtoms()])
        parts = len(Chem.GetMolFrags(theirs))
        expect(text, "rings", ours["rings"],
               theirs.GetNumBonds() - theirs.GetNumAtoms() + parts)
        expect(text, "ring bonds", ours["ring_bonds"],
               sum(b.IsInRing() for b in theirs.GetBonds()))
        compare_pi(text, ours, theirs)


def pi_electrons(atom):
    """By the Kekule structure of the reference; None where our rule differs."""
    orders = [b.GetBondTypeAsDouble() for b in atom.GetBonds()]
    charge, symbol = atom.GetFormalCharge(), atom.GetSymbol()
    # EXPLAINED: an N-oxide's N+ and O- are counted without their charges, so
    # that N brings two electrons and not one (design: charged rows need a
    # source).
    if symbol == "N" and any(n.GetSymbol() == "O" and n.GetFormalCharge() == -1
                             for n in atom.GetNeighbors()):
        return None
    if max(orders) > 1:
        return 1
    if symbol in "NOSPSeTe":
        return 2
    return {("C", 1): 0, ("C", -1): 2, ("B", 0): 0}.get((symbol, charge))


def compare_pi(text, ours, theirs):
    if "sites" not in ours:
        return
    electrons = {s["atom"]: s["electrons"] for s in ours["sites"]}
    rings = [r for r in theirs.GetRingInfo().AtomRings()
             if all(theirs.GetAtomWithIdx(i).GetIsAromatic() for i in r)]
    Chem.Kekulize(theirs, clearAromaticFlags=True)
    for ring in rings:
        expected = {i: pi_electrons(theirs.GetAtomWithIdx(i)) for i in ring}
        for i, e in expected.items():
            if e is not None:
                expect(text, f"pi electrons of atom {i + 1}", electrons.get(i), e)
        # Hueckel's rule for a ring that stands alone, without C=O in it.
        alone = all(theirs.GetRingInfo().NumAtomRings(i) == 1 for i in ring)
        inside = all(b.GetOtherAtom(theirs.GetAtomWithIdx(i)).GetIdx() in ring
                     for i in ring for b in theirs.GetAtomWithIdx(i).GetBonds()
                     if b.GetBondTypeAsDouble() == 2)
        if alone and inside and None not in expected.values():
            if sum(electrons[i] for i in ring) % 4 != 2:
                failures.append(f"{text}: ring {ring} has no 4n+2 electrons")
    neutral = sum(a.GetFormalCharge() for a in theirs.GetAtoms()) == 0
    radicals = sum(a.GetNumRadicalElectrons() for a in theirs.GetAtoms())
    if neutral and not radicals and ours["electrons"] % 2:
        failures.append(f"{text}: {ours['electrons']} electrons in a closed shell")


# --- what can be kekulised -----------------------------------------------

EXPLAINED = {
    # RDKit refuses neutral nitrogen with five bonds in a ring; OpenSMILES
    # gives nitrogen the valences 3 and 5.
    "five bonds": lambda text: "n(=" in text or "=n" in text,
}


def spoil(text, rng):
    """A ring with a hydrogen or an atom too many or too few."""
    kind = rng.randrange(5)
    if kind == 0:
        return text.replace("[nH]", "n", 1)
    if kind == 1:
        at = [i for i, c in enumerate(text) if c == "n" and text[i - 1:i] != "["]
        if at:
            i = rng.choice(at)
            return text[:i] + "[nH]" + text[i + 1:]
    at = [i for i, c in enumerate(text) if c == "c" and text[max(0, i - 1):i] != "["]
    if not at:
        return text
    i = rng.choice(at)
    return text[:i] + rng.choice(["n", "o", "cc", "s", "[nH]", "[n+]"]) + text[i + 1:]


def compare_kekulisability(smiles):
    rng = random.Random(2)
    aromatic = [Chem.MolToSmiles(Chem.MolFromSmiles(s)) for s in smiles]
    aromatic = [s for s in aromatic if "c1" in s]
    spoiled = sorted({spoil(rng.choice(aromatic), rng) for _ in range(3000)})
    refused = 0
    for text, ours in zip(spoiled, perceive(spoiled)):
        theirs = Chem.MolFromSmiles(text)
        refused += theirs is None
        if ("error" in ours) != (theirs is None) and not any(f(text) for f in EXPLAINED.values()):
            failures.append(f"{text}: ours {'refused' if 'error' in ours else 'accepted'}"
                            f" {ours.get('error', '')}, RDKit the other way")
    if not 300 < refused < len(spoiled) - 300:
        failures.append(f"only {refused} of {len(spoiled)} spoiled rings are bad: no test")
    return len(spoiled), refused


# --- what spelling must not change ---------------------------------------

def spellings(text, rng):
    """Random atom orders: aromatic, Kekule, hydrogens in brackets."""
    molecule = Chem.MolFromSmiles(text)
    seed = rng.randrange(1 << 30)
    yield Chem.MolToRandomSmilesVect(molecule, 1, seed)[0]
    yield Chem.MolToRandomSmilesVect(molecule, 1, seed + 1, allHsExplicit=True)[0]
    yield Chem.MolToRandomSmilesVect(Chem.AddHs(molecule), 1, seed + 3)[0]
    kekule = Chem.Mol(molecule)
    Chem.Kekulize(kekule, clearAromaticFlags=True)
    yield Chem.MolToRandomSmilesVect(kekule, 1, seed + 2, kekuleSmiles=True)[0]


def transmission(answer, energy):
    """NumPy on our Hamiltonian: T = Tr Gamma_L G Gamma_R G^+."""
    index = {s["id"]: i for i, s in enumerate(answer["sites"])}
    h = np.diag([complex(s["onsite"]) for s in answer["sites"]])
    for bond in answer["bonds"]:
        i, j = (index[n] for n in bond["between"])
        h[i, j] = h[j, i] = bond["hopping"]
    gamma = []
    for contact in answer["contacts"]:
        diagonal = np.zeros(len(index))
        for site in contact["sites"]:
            diagonal[index[site]] = contact["coupling"]
        gamma.append(np.diag(diagonal))
    g = np.linalg.inv(energy * np.eye(len(index)) - h + 0.5j * (gamma[0] + gamma[1]))
    return np.trace(gamma[0] @ g @ gamma[1] @ g.conj().T).real


def compare_spellings(smiles, *options):
    rng = random.Random(3)
    original = perceive(smiles, "levels", *options)
    pairs = [(n, other) for n, text in enumerate(smiles) for other in spellings(text, rng)]
    junctions = 0
    for (n, other), answer in zip(pairs, perceive([p[1] for p in pairs], "levels", *options)):
        first = original[n]
        where = f"{smiles[n]} against {other}"
        if "levels" not in first or "levels" not in answer:
            if ("levels" in first) != ("levels" in answer):
                failures.append(f"{where}: one is refused: {first.get('refused')} {answer.get('refused')}")
            continue
        same = len(first["levels"]) == len(answer["levels"]) and np.allclose(
            first["levels"], answer["levels"], rtol=0, atol=1e-11 * len(first["levels"]))
        if not same or first["electrons"] != answer["electrons"]:
            failures.append(f"{where}: levels or electrons differ")
        elif sorted(l["kind"] for l in first["linkers"]) != sorted(l["kind"] for l in answer["linkers"]):
            failures.append(f"{where}: linkers differ")
        elif first["contacts"][0]["sites"] and n % 4 == 0:
            junctions += 1
            for energy in (0.1234, -1.0):
                a, b = transmission(first, energy), transmission(answer, energy)
                if abs(a - b) > 1e-9 * max(a, b) + 1e-24:
                    failures.append(f"{where}: T({energy}) {a} and {b}")
    if junctions < 20:
        failures.append(f"only {junctions} junctions compared: no test")
    return len(pairs), junctions


def main():
    smiles = molecules()
    compare_graphs(smiles, perceive(smiles))
    print("graphs:", len(smiles))
    print("spoiled rings, refused:", *compare_kekulisability(smiles))
    print("spellings, junctions:", *compare_spellings(smiles))
    print("spellings with alkyl groups:",
          *compare_spellings(smiles[len(KNOWN):len(KNOWN) + 200], "alkyl=heteroatom"))
    for line in failures[:40]:
        print(line)
    print(len(failures), "failures")
    return bool(failures)


if __name__ == "__main__":
    sys.exit(main())
