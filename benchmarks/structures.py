# SPDX-License-Identifier: GPL-3.0-or-later
"""SMILES text to molecular graph and to Hamiltonian against RDKit's parsing of the same list, in one
run, one thread each, best pass of both.  Build the release preset first.

    /usr/bin/python3 benchmarks/structures.py build
"""
import json
import os
import subprocess
import sys
import tempfile
import time

here = os.path.dirname(os.path.abspath(__file__))
sys.path.insert(0, os.path.join(here, "..", "tests", "structures"))
from molecules import molecules  # noqa: E402
from rdkit import Chem  # noqa: E402


def parse_us(smiles):
    best = float("inf")
    for _ in range(8):
        start = time.perf_counter()
        for s in smiles:
            Chem.MolFromSmiles(s)
        best = min(best, time.perf_counter() - start)
    return 1e6 * best / len(smiles)


def main():
    build = sys.argv[1] if len(sys.argv) > 1 else os.path.join(here, "..", "build")
    smiles = molecules()
    with tempfile.NamedTemporaryFile("w", suffix=".smi") as file:
        file.write("".join(s + "\n" for s in smiles))
        file.flush()
        theirs = parse_us(smiles)  # before and after: the machine is not quiet
        program = os.path.join(build, "tests", "bench_structures")
        ours = json.loads(subprocess.run([program, file.name], capture_output=True, check=True).stdout)
    theirs = min(theirs, parse_us(smiles))
    atoms = sum(Chem.MolFromSmiles(s).GetNumAtoms() for s in smiles) / len(smiles)
    print(f"{len(smiles)} molecules of {atoms:.1f} atoms; RDKit's parsing {theirs:.1f} us")
    for what in ("graph", "hamiltonian"):
        print(f"SMILES to {what} {ours[what + '_us']:.2f} us, ratio {theirs / ours[what + '_us']:.1f}")


if __name__ == "__main__":
    main()
