# SPDX-License-Identifier: GPL-3.0-or-later
"""SMILES text to Hamiltonian against RDKit's parsing of the same list, in one
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


def main():
    build = sys.argv[1] if len(sys.argv) > 1 else os.path.join(here, "..", "build")
    smiles = molecules()
    with tempfile.NamedTemporaryFile("w", suffix=".smi") as file:
        file.write("".join(s + "\n" for s in smiles))
        file.flush()
        program = os.path.join(build, "tests", "bench_structures")
        ours = json.loads(subprocess.run([program, file.name], capture_output=True, check=True).stdout)
    best = float("inf")
    for _ in range(3):
        start = time.perf_counter()
        for s in smiles:
            Chem.MolFromSmiles(s)
        best = min(best, (time.perf_counter() - start) / len(smiles))
    atoms = sum(Chem.MolFromSmiles(s).GetNumAtoms() for s in smiles) / len(smiles)
    print(f"molecules {len(smiles)}, atoms a molecule {atoms:.1f}")
    print(f"SMILES to Hamiltonian {ours['microseconds']:.2f} us, RDKit's parsing {1e6 * best:.1f} us, "
          f"ratio {1e6 * best / ours['microseconds']:.1f}")


if __name__ == "__main__":
    main()
