# SPDX-License-Identifier: GPL-3.0-or-later
"""Twists, the map of all pairs and nodes against NumPy, in one run, one thread each.
Values are compared before times; ratios on stdout and in levers.json.

    /usr/bin/python3 benchmarks/levers.py build
"""
import json
import os
import subprocess
import sys
import tempfile
import time

os.environ["OPENBLAS_NUM_THREADS"] = "1"
import numpy as np  # noqa: E402
import scipy.linalg  # noqa: E402

HERE = os.path.dirname(os.path.abspath(__file__))
SAMPLE = 4000  # of the million that NumPy solves; its time is scaled up


def matrix(build, path):
    check = subprocess.run([os.path.join(build, "mho"), "check", "--json", "--exact", path],
                           capture_output=True, check=True, text=True)
    m = json.loads(check.stdout)["molecules"][0]
    index = {s["id"]: i for i, s in enumerate(m["sites"])}
    h = np.diag([s["onsite_eV"] for s in m["sites"]]).astype(float)
    turn = None
    for b in m["bonds"]:
        i, j = (index[s] for s in b["between"])
        h[i, j] = h[j, i] = b["hopping_eV"]
        if b["rotatable"]:
            turn = (i, j, b["hopping_eV"] / np.cos(np.radians(b["twist_deg"])))
    return h, turn


def batched(h, turn, left, right, gamma, energies, angles):
    """T of every pair of energy and angle by a batched solve."""
    n, count = len(h), len(energies)
    a = np.broadcast_to(-h.astype(complex), (count, n, n)).copy()
    a[:, range(n), range(n)] += energies[:, None]
    a[:, left, left] += 0.5j * gamma
    a[:, right, right] += 0.5j * gamma
    i, j, t = turn
    a[:, i, j] = a[:, j, i] = -t * np.cos(np.radians(angles))
    unit = np.zeros((n, 1), complex)
    unit[left] = 1
    column = np.linalg.solve(a, np.broadcast_to(unit, (count, n, 1)))
    return gamma ** 2 * np.abs(column[:, right, 0]) ** 2


def ours(build, what, path):
    with tempfile.NamedTemporaryFile() as file:
        done = subprocess.run([os.path.join(build, "benchmarks", "bench_levers"), what, path,
                               file.name], capture_output=True, check=True, text=True)
        return json.loads(done.stdout)["seconds"], np.fromfile(file.name)


def twist(build, what, energies, angles, total):
    path = os.path.join(HERE, "..", "molecules", "biphenyl-4-4-diamine.yaml")
    h, turn = matrix(build, path)
    seconds, value = ours(build, what, path)
    pick = np.linspace(0, total - 1, SAMPLE).astype(int)
    start = time.perf_counter()
    theirs = batched(h, turn, *ENDS, 1.0, energies(pick), angles(pick))
    numpy_s = (time.perf_counter() - start) * total / SAMPLE
    keep = theirs > 1e-20
    worst = np.max(np.abs(value[pick] / theirs - 1)[keep])
    assert worst < 1e-8, f"{what}: off by {worst}"
    return {"seconds": seconds, "numpy_solve_s": numpy_s, "ratio": numpy_s / seconds,
            "largest_difference": worst}


def ribbon(rings, contacts=""):
    n = 2 * rings + 1
    lines = ["name: acene", "sites:"]
    lines += [f"  - {{id: {r}{i}, element: C}}" for r in "tb" for i in range(n)]
    lines += ["bonds:"]
    lines += [f"  - {{between: [{r}{i}, {r}{i + 1}]}}" for r in "tb" for i in range(n - 1)]
    lines += [f"  - {{between: [t{i}, b{i}]}}" for i in range(0, n, 2)]
    return "\n".join(lines + [contacts, "fermi: 0.01 eV"]) + "\n"


def pairs(build):
    with tempfile.NamedTemporaryFile("w", suffix=".yaml") as file:
        file.write(ribbon(124))
        file.flush()
        h, _ = matrix(build, file.name)
        seconds, value = ours(build, "pairs", file.name)
        whole, same = ours(build, "all pairs", file.name)
    assert np.allclose(value, same, rtol=1e-9, atol=1e-300)
    n, gamma = len(h), 0.5
    start = time.perf_counter()
    g = np.linalg.inv(0.01 * np.eye(n) - h)
    d = 1 + 0.5j * gamma * np.diag(g)
    t = gamma ** 2 * g ** 2 / np.abs(np.outer(d, d) + (0.5 * gamma * g) ** 2) ** 2
    numpy_s = time.perf_counter() - start
    start = time.perf_counter()
    for j in range(1, 6):  # what a user would write: each pair by itself
        a = 0.01 * np.eye(n) - h + 0j
        a[0, 0] += 0.5j * gamma
        a[j, j] += 0.5j * gamma
        column = np.linalg.solve(a, np.eye(n)[:, :1])
    each_s = (time.perf_counter() - start) / 5 * n * (n - 1) / 2
    theirs = t[np.triu_indices(n, 1)]
    keep = theirs > 1e-16
    worst = np.max(np.abs(value / theirs - 1)[keep])
    assert worst < 1e-5, f"pairs: off by {worst}"
    assert abs(gamma ** 2 * abs(column[5, 0]) ** 2 / t[0, 5] - 1) < 1e-8
    return {"sites": n, "seconds": seconds, "with_nodes_rules_magic_s": whole, "numpy_inverse_s": numpy_s, "ratio": numpy_s / seconds,
            "numpy_each_pair_s": each_s, "ratio_each_pair": each_s / seconds,
            "largest_difference": worst}


def nodes(build, rings):
    """Nodes of an acene, top left to bottom right, as eigenvalues of the pencil
    [[H, v], [w, 0]] - E diag(1, 0)."""
    ends = "electrodes:\n  left: {sites: [t1], coupling: 0.5 eV}\n" \
           f"  right: {{sites: [b{2 * rings - 1}], coupling: 0.5 eV}}"
    with tempfile.NamedTemporaryFile("w", suffix=".yaml") as file:
        file.write(ribbon(rings, ends))
        file.flush()
        h, _ = matrix(build, file.name)
        seconds, value = ours(build, "nodes", file.name)
        gap_s, _ = ours(build, "gap", file.name)
    n = len(h)
    left, right = 1, 2 * (2 * rings + 1) - 2
    a, b = np.zeros((n + 1, n + 1)), np.diag([1.0] * n + [0.0])
    a[:n, :n], a[left, n], a[n, right] = h, 1, 1
    start = time.perf_counter()
    theirs = scipy.linalg.eigvals(a, b)
    scipy_s = time.perf_counter() - start
    levels = np.linalg.eigvalsh(h)
    for energy in value:  # g changes sign there, or E is a level that one contact sees
        if np.min(np.abs(levels - energy)) < 1e-6:
            continue
        g = [np.linalg.solve(e * np.eye(n) - h, np.eye(n)[:, left])[right]
             for e in (energy - 1e-7, energy, energy + 1e-7)]
        assert abs(g[1]) < 1e-3 * max(abs(g[0]), abs(g[2])), f"no node at {energy}"
    return {"sites": n, "nodes": len(value), "seconds": seconds, "gap_alone_s": gap_s,
            "scipy_pencil_s": scipy_s, "ratio": scipy_s / seconds,
            "finite_by_scipy": int(np.sum(np.isfinite(theirs)))}


ENDS = (0, 13)  # the nitrogens of the diamine


def main():
    build = sys.argv[1] if len(sys.argv) > 1 else os.path.join(HERE, "..", "build")
    zero = lambda k: np.zeros(len(k))  # noqa: E731
    result = {
        "1e6 angles": twist(build, "twist", zero, lambda k: 90.0 * k / 999999, 10 ** 6),
        "1e3 x 1e3 map": twist(build, "map", lambda k: -1 + 2.0 * (k // 1000) / 999,
                               lambda k: 90.0 * (k % 1000) / 999, 10 ** 6),
        "pairs": pairs(build), "nodes of 26 sites": nodes(build, 6),
        "nodes of 198 sites": nodes(build, 49)}
    for name, r in result.items():
        print(name + ": " + ", ".join(f"{k} {v:.3g}" for k, v in r.items()))
    with open(os.path.join(build, "levers.json"), "w", encoding="utf-8") as file:
        json.dump(result, file, indent=1)


if __name__ == "__main__":
    main()
