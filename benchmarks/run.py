#!/usr/bin/python3
# SPDX-License-Identifier: GPL-3.0-or-later
"""T(E) by libmho and as one would write it with NumPy and SciPy.

    cmake --build build --target benchmark       (or run.py DRIVER RESULT.json)

Same process tree, one BLAS thread, medians over repeats taken in turn, set-up
included (levels, compilation of a plan), processor time on both sides.  Plans
are made from the non-zero entries, as a library's user would who wants T(E)
alone; a junction is diagonalised with all its orbitals.  Values are compared
before times are: a difference in log10 T above 1e-6 is shown, and is a failure unless
it is the plain sum over eigenvectors that is off, which loses digits where T is
small.  Slow NumPy variants do fewer energies; all times are an energy.  Ratios
above 1 are in favour of libmho.
"""
import json
import os
import statistics
import subprocess
import sys
import tempfile
import time

import numpy as np
import scipy.sparse as sparse
import scipy.sparse.linalg as sparse_linalg

GAMMA = 0.5
BETA = -2.7
REPEATS = 5
WARM_REPEATS, WARM_SECONDS = 40, 0.05  # on both sides, within one of REPEATS


def ladder(n, rng):
    """Rings in a row with random bonds: a conjugated oligomer's graph."""
    rows = [(i, i + 1, BETA * rng.uniform(0.9, 1.1)) for i in range(n - 1)]
    rows += [(i, i + 5, BETA * rng.uniform(0.9, 1.1)) for i in range(0, n - 5, 6)]
    rows += [(i, i, BETA * rng.choice((0.0, 0.0, 0.5))) for i in range(n)]
    return rows


def chain(n, _):
    return [(i, i + 1, BETA) for i in range(n - 1)]


def ribbon(n, rng):
    """A flake eight sites wide with every second rung: a nanographene's graph."""
    width = 8
    rows = [(i, i + 1, BETA) for i in range(n - 1) if (i + 1) % width]
    rows += [(i, i + width, BETA) for i in range(n - width) if (i + i // width) % 2 == 0]
    return rows + [(i, i, 0.02 * rng.standard_normal()) for i in range(n)]


def dense(n, rows):
    h = np.zeros((n, n))
    for i, j, value in rows:
        h[i, j] = h[j, i] = value
    return h


def effective(case):
    h = dense(case["n"], case["rows"]).astype(complex)
    h[case["left"], case["left"]] -= 0.5j * GAMMA
    h[case["right"], case["right"]] -= 0.5j * GAMMA
    return h


def by_inverse(case, energies):
    h, n = effective(case), case["n"]
    g = np.linalg.inv(energies[:, None, None] * np.eye(n) - h)
    return np.log10(GAMMA ** 2 * abs(g[:, case["left"], case["right"]]) ** 2)


def by_solve(case, energies):
    h, n = effective(case), case["n"]
    source = np.zeros((len(energies), n, 1), complex)
    source[:, case["right"]] = 1
    g = np.linalg.solve(energies[:, None, None] * np.eye(n) - h, source)
    return np.log10(GAMMA ** 2 * abs(g[:, case["left"], 0]) ** 2)


def by_eigh(case, energies):
    levels, orbitals = np.linalg.eigh(dense(case["n"], case["rows"]))
    inverse = 1 / (energies[:, None] - levels)
    a, b = orbitals[case["left"]], orbitals[case["right"]]
    ll, rr, lr = inverse @ (a * a), inverse @ (b * b), inverse @ (a * b)
    sigma = -0.5j * GAMMA
    with np.errstate(divide="ignore"):
        return np.log10(GAMMA ** 2 * abs(
            lr / ((1 - sigma * ll) * (1 - sigma * rr) - sigma ** 2 * lr ** 2)) ** 2)


def by_sparse_lu(case, energies):
    n = case["n"]
    i, j, value = (np.array(x) for x in zip(*case["rows"]))
    h = sparse.coo_matrix((value.astype(complex), (i.astype(int), j.astype(int))), (n, n)).tocsc()
    h = h + sparse.triu(h, 1).T
    h = h + sparse.coo_matrix(([-0.5j * GAMMA] * 2, ([case["left"], case["right"]],) * 2), (n, n))
    source = np.zeros(n, complex)
    source[case["right"]] = 1
    unit = sparse.identity(n, format="csc")
    result = []
    for energy in energies:
        g = sparse_linalg.splu((energy * unit - h).tocsc()).solve(source)[case["left"]]
        result.append(np.log10(GAMMA ** 2 * abs(g) ** 2))
    return np.array(result)


# name, graph, sites, driver's mode, energies, {method: energies}
CASES = [
    ("T(E) N=12", ladder, 12, "sparse", 2000, {by_inverse: 2000, by_solve: 2000, by_eigh: 2000}),
    ("T(E) N=24", ladder, 24, "sparse", 2000, {by_inverse: 2000, by_solve: 2000, by_eigh: 2000}),
    ("N=24, a junction", ladder, 24, "dense", 2000, {by_eigh: 2000}),
    ("T(E) N=48", ladder, 48, "sparse", 2000, {by_inverse: 500, by_solve: 500, by_eigh: 2000}),
    ("T(E) N=200", ladder, 200, "sparse", 2000, {by_inverse: 40, by_solve: 40, by_eigh: 2000}),
    ("T(E) N=1000 oligomer", ladder, 1000, "sparse", 2000,
     {by_inverse: 1, by_solve: 1, by_eigh: 2000, by_sparse_lu: 10}),
    ("T(E) N=1000 ribbon", ribbon, 1000, "sparse", 2000,
     {by_inverse: 1, by_solve: 1, by_eigh: 2000, by_sparse_lu: 10}),
    ("chain 1e4", chain, 10000, "sparse", 400, {by_sparse_lu: 4}),
    ("chain 1e5", chain, 100000, "sparse", 400, {by_sparse_lu: 2}),
]
# floor and stretch of the ratio
TARGETS = {("T(E) N=24", "by_inverse"): (800, 2000), ("T(E) N=24", "by_eigh"): (6, 12),
           ("T(E) N=1000 oligomer", "by_eigh"): (50, 120), ("chain 1e5", "by_sparse_lu"): (1000, 3000)}


def write_case(case, path):
    rows = np.array(case["rows"], float)
    head = [case["n"], case["left"], case["right"], GAMMA, len(case["energies"]), len(rows)]
    np.concatenate([np.array(head, float), case["energies"], rows.ravel()]).tofile(path)


def seconds_warm(method, case, pick):
    """Result and time; short work again at once, as its first time fills the caches."""
    times = []
    while not times or (sum(times) < WARM_SECONDS and len(times) < WARM_REPEATS):
        start = time.process_time()
        values = method(case, pick)
        times.append(time.process_time() - start)
    return values, statistics.median(times[1:] or times)


def run_mho(driver, mode, folder, repeats):
    result = os.path.join(folder, "result")
    text = subprocess.run([driver, mode, os.path.join(folder, "case"), result, str(repeats)],
                          check=True, capture_output=True, text=True).stdout
    report = json.loads(text)
    # NumPy's process is warm by what it did before; so is the second half of ours
    warm = report["times"][len(report["times"]) // 2:]
    return (np.fromfile(result), statistics.median(sum(t) for t in warm),
            statistics.median(t[1] for t in warm), report["methods"])


def measure(driver, name, graph, n, mode, energies, methods):
    rng = np.random.default_rng(n)
    case = {"n": n, "left": 0, "right": n - 1, "rows": graph(n, rng),
            "energies": np.linspace(-1.9637, 2.0171, energies)}
    mho, sweep, other = [], [], {m: [] for m in methods}
    with tempfile.TemporaryDirectory() as folder:
        write_case(case, os.path.join(folder, "case"))
        for _ in range(REPEATS):
            values, seconds, inner, settled = run_mho(driver, mode, folder,
                                                      WARM_REPEATS if n < 100 else 24)
            mho.append(seconds / energies)
            sweep.append(inner / energies)
            for method, count in methods.items():
                pick = case["energies"][:: max(1, energies // count)][:count]
                theirs, spent = seconds_warm(method, case, pick)
                other[method].append(spent / len(pick))
                ours = values[:: max(1, energies // count)][:count]
                case.setdefault("off", {})[method] = float(np.max(abs(theirs - ours)))
    row = {"case": name, "sites": n, "energies": energies, "methods": settled,
           "microseconds": 1e6 * statistics.median(mho),
           "sweep_ns_per_site": 1e9 * statistics.median(sweep) / n, "against": {}}
    for method, times in other.items():
        target = TARGETS.get((name, method.__name__))
        row["against"][method.__name__] = {
            "microseconds": 1e6 * statistics.median(times),
            "ratio": statistics.median(times) / statistics.median(mho),
            "largest_difference_log10": case["off"][method],
            "agrees": case["off"][method] < 1e-6, "floor": target and target[0],
            "stretch": target and target[1]}
    return row


def main():
    driver, path = sys.argv[1], sys.argv[2]
    divide = float(subprocess.run([driver, "divide"], check=True, capture_output=True,
                                  text=True).stdout)
    print(f"one division in a loop of them: {divide} ns\n")
    print(f"{'case':22}{'us/energy':>10}{'ns/site':>9}  {'against':14}{'us/energy':>11}"
          f"{'ratio':>9}  floor/stretch")
    rows = []
    for arguments in CASES:
        row = measure(driver, *arguments)
        row["divider_fraction"] = divide / row["sweep_ns_per_site"]
        rows.append(row)
        for name, other in row["against"].items():
            target = f"{other['floor']}/{other['stretch']}" if other["floor"] else ""
            if not other["agrees"]:
                target += f"  off by {other['largest_difference_log10']:.2g} decades"
            print(f"{row['case']:22}{row['microseconds']:10.3g}{row['sweep_ns_per_site']:9.3g}  "
                  f"{name:14}{other['microseconds']:11.4g}{other['ratio']:9.4g}  {target}",
                  flush=True)
        print(f"{'':22}divider bound reached: {row['divider_fraction']:.0%}; {row['methods']}")
    with open(path, "w") as file:
        json.dump({"division_ns": divide, "rows": rows}, file, indent=1)
    return 0 if all(other["agrees"] or name == "by_eigh"
                    for row in rows for name, other in row["against"].items()) else 1


if __name__ == "__main__":
    sys.exit(main())
