# SPDX-License-Identifier: GPL-3.0-or-later
"""A screening against NumPy and SciPy: the same quantities of the same molecules,
on two processes there and two threads here, in one run.  Values are compared
before times; ratios on stdout and in screen.json.

    /usr/bin/python3 benchmarks/screen.py build [molecules]

The list is invented: five left and five right linkers around two to four of
seven units (1,4- and 1,3-phenylene, 2,5-thienylene, 2,5-pyridylene, ethynylene,
vinylene, 2,6-naphthylene) in all orders, shuffled; without bridging pyridine where a
linker is one.  Both sides start from the Hamiltonian's parameters; ours also
reads the SMILES.
"""
import itertools
import json
import multiprocessing
import os
import random
import struct
import subprocess
import sys
import tempfile
import time

for name in ("OPENBLAS_NUM_THREADS", "OMP_NUM_THREADS"):
    os.environ[name] = "1"
import numpy as np  # noqa: E402
from scipy.optimize import brentq  # noqa: E402

LEFT = ["N", "S", "CS", "N#C", "n1ccc({})cc1"]
RIGHT = ["N", "S", "SC", "C#N", "c{d}ccncc{d}"]
UNIT = ["c{d}ccc({n})cc{d}", "c{d}cccc({n})c{d}", "c{d}ccc({n})s{d}", "c{d}ccc({n})nc{d}",
        "C#C{n}", "C=C{n}", "c{d}ccc%{d}0cc({n})ccc%{d}0c{d}"]
KT = 8.617333262e-5 * 300
WINDOW, LEVELS = 0.5, 401
SIGMA = {"fermi": 0.2, "beta": 0.2, "ln": 0.4, "h": 0.1, "k": 0.05, "twist": 8.0}
TRIALS, SAMPLES = 48, 400


def smiles(left, units, right, depth=2):
    def tail(rest, d):
        if not rest:
            return right.replace("{d}", str(d))
        return rest[0].replace("{d}", str(d)).replace("{n}", tail(rest[1:], d + 1))
    body = tail(units, depth)
    return left.replace("{}", body) if "{}" in left else left + body


def make_list(count):
    every = []
    for n in (2, 3, 4):
        for units in itertools.product(UNIT, repeat=n):
            rings = any("c" in u for u in units)
            for left, right in itertools.product(LEFT, RIGHT):
                pyridyl = left.startswith("n") or right.startswith("c")
                if rings and not (pyridyl and UNIT[3] in units):
                    every.append(smiles(left, units, right))
    random.Random(1).shuffle(every)
    return every[:count]


# --- as a user would write it --------------------------------------------------

class Molecule:
    """Parameters of the Hamiltonian, from `mho check --json`."""

    def __init__(self, m):
        index = {s["id"]: i for i, s in enumerate(m["sites"])}
        self.name, self.fermi, self.beta = m["name"], m["fermi_eV"], m["beta_eV"]
        self.h = np.array([s["onsite_eV"] for s in m["sites"]]) / self.beta
        self.ends = np.array([[index[s] for s in b["between"]] for b in m["bonds"]])
        self.twist = np.array([b["twist_deg"] for b in m["bonds"]])
        self.turns = np.array([b["rotatable"] or b["twist_deg"] != 0 for b in m["bonds"]])
        self.k = np.array([b["hopping_eV"] for b in m["bonds"]]) / self.beta / np.cos(np.radians(self.twist))
        element = [s["element"] for s in m["sites"]]
        carbon = [element[i] == element[j] == "C" for i, j in self.ends]
        self.strength = np.where(carbon, self.k, 1.0)
        self.electrons = m["electrons"]
        contacts = [m["contacts"][side] for side in ("left", "right")]
        self.sites = [index[c["sites"][0]] for c in contacts]
        self.gamma = np.array([c["coupling_eV"] for c in contacts])
        kind = {index[linker["site"]]: linker["kind"] for linker in m["linkers"]}
        self.one_kind = kind[self.sites[0]] == kind[self.sites[1]]


def hamiltonians(m, h, k, twist, beta):
    """[count][N][N] from parameters [count][...]."""
    matrix = np.zeros((len(beta), len(m.h), len(m.h)))
    site = np.arange(len(m.h))
    matrix[:, site, site] = h * beta[:, None]
    i, j = m.ends.T
    matrix[:, i, j] = matrix[:, j, i] = k * beta[:, None] * np.cos(np.radians(twist))
    return matrix


def transmission(m, level, orbital, gamma, energy):
    """T at energy[count][points] from eigenvectors, by the 2x2 problem of the contacts."""
    a, b = (orbital[:, s, :] for s in m.sites)
    inverse = 1.0 / (energy[:, :, None] - level[:, None, :])
    f00, f01, f11 = (np.einsum("cpk,ck->cp", inverse, w) for w in (a * a, a * b, b * b))
    y0, y1 = 0.5 * gamma[:, :1], 0.5 * gamma[:, 1:]
    d = (1 + 1j * y0 * f00) * (1 + 1j * y1 * f11) + y0 * y1 * f01 ** 2
    return 4 * y0 * y1 * f01 ** 2 / np.abs(d) ** 2


POINTS = np.linspace(-24, 24, 97)  # in kT, trapezoid rule
WEIGHT = (POINTS[1] - POINTS[0]) / (4 * np.cosh(POINTS / 2) ** 2)


def log10_g(m, h, k, twist, beta, gamma, fermi):
    """Thermal conductances of many molecules at one Fermi level each."""
    level, orbital = np.linalg.eigh(hamiltonians(m, h, k, twist, beta))
    t = transmission(m, level, orbital, gamma, fermi[:, None] + KT * POINTS + 1e-9)
    return np.log10(t @ WEIGHT)


def steps(m):
    """Every parameter as (which, index, sigma, ends moved)."""
    rows = [("fermi", 0), ("beta", 0)] + ([("ln", 2)] if m.one_kind else [("ln", 0), ("ln", 1)])
    rows += [("h", i) for i in range(len(m.h))] + [("k", b) for b in range(len(m.k))]
    return rows + [("twist", b) for b in np.flatnonzero(m.turns)]


def evaluate(m, rows, shift):
    """log10 G with parameters moved, shift[count][rows]."""
    count = len(shift)
    value = {"fermi": np.full(count, float(m.fermi)), "beta": np.full(count, float(m.beta)),
             "ln": np.zeros((count, 2)), "h": np.tile(m.h, (count, 1)),
             "k": np.tile(m.k, (count, 1)), "twist": np.tile(m.twist, (count, 1))}
    for p, (what, index) in enumerate(rows):
        if what in ("fermi", "beta"):
            value[what] += shift[:, p]
        elif what == "ln":
            value["ln"][:, slice(None) if index == 2 else index] += shift[:, [p] if index == 2 else p]
        else:
            value[what][:, index] += shift[:, p] * (m.strength[index] if what == "k" else 1)
    gamma = m.gamma * np.exp(value["ln"])
    return log10_g(m, value["h"], value["k"], value["twist"], value["beta"], gamma, value["fermi"])


def measure_numpy(m):
    one = lambda a: np.array([a])  # noqa: E731
    level, orbital = np.linalg.eigh(hamiltonians(m, one(m.h), one(m.k), one(m.twist), one(m.beta)))
    gamma = one(m.gamma)
    homo, lumo = level[0, m.electrons // 2 - 1], level[0, m.electrons // 2]
    # 400 energies and more: T once, thermal averages at all Fermi levels
    reach = WINDOW + 24 * KT
    energy = np.linspace(m.fermi - reach, m.fermi + reach, 1601) + 1e-9
    t = transmission(m, level, orbital, gamma, energy[None])[0]
    fermi = m.fermi + np.linspace(-WINDOW, WINDOW, LEVELS)
    x = np.abs(energy[None] - fermi[:, None]) / KT
    f = np.exp(-x)
    window = np.log10((energy[1] - energy[0]) / KT * (f / (1 + f) ** 2) @ t)
    low, high = np.quantile(window, [0.05, 0.95])
    # nodes of the gap: sign changes of the bare Green's function
    weight = orbital[0, m.sites[0]] * orbital[0, m.sites[1]]
    green = lambda e: float(np.sum(weight / (e - level[0])))  # noqa: E731
    scan = np.linspace(homo + 1e-6, lumo - 1e-6, 400)
    g = (weight / (scan[:, None] - level[0])).sum(1)
    nodes = [brentq(green, scan[i], scan[i + 1]) for i in np.flatnonzero(g[1:] * g[:-1] < 0)]
    # one-sided resonances at E_F
    matrix = hamiltonians(m, one(m.h), one(m.k), one(m.twist), one(m.beta))[0].astype(complex)
    for side in range(2):
        matrix[m.sites[side], m.sites[side]] -= 0.5j * m.gamma[side]
    poles = np.linalg.eigvals(matrix)
    near = np.any(np.abs(poles.real - m.fermi) < -poles.imag + 3 * KT)
    # error: derivatives by differences, 48 samples, 400 where they disagree
    rows = steps(m)
    sigma = np.array([SIGMA[what] for what, _ in rows])
    step = 1e-4 * np.diag(sigma)
    middle = window[LEVELS // 2]
    slope = (evaluate(m, rows, step) - evaluate(m, rows, -step)) / (2e-4 * sigma)
    linear = float(np.sqrt(np.sum((slope * sigma) ** 2)))
    normal = np.random.default_rng(1)
    shift = normal.standard_normal((TRIALS, len(rows))) * sigma
    value = evaluate(m, rows, shift)
    error, rule = linear, 0
    if not np.std(value - shift @ slope) <= 0.4 * linear:
        shift = normal.standard_normal((SAMPLES - TRIALS, len(rows))) * sigma
        value = np.sort(np.append(value, evaluate(m, rows, shift)))
        error, rule = 0.5 * (value[335] - value[63]), 1
    return {"log10_G0": middle, "window_low_log10_G0": low, "window_high_log10_G0": high,
            "homo_eV": homo, "lumo_eV": lumo, "nodes": len(nodes), "linear_decades": linear,
            "error_decades": error, "error_rule": rule, "near": bool(near)}


# --- ours ------------------------------------------------------------------------

def layout(build):
    """Members of mho_screen_quantities, as bench_screen prints them."""
    text = subprocess.run([os.path.join(build, "benchmarks", "bench_screen"), "--layout"],
                          capture_output=True, check=True, text=True).stdout
    return json.loads(text)


def measure_ours(build, lines, threads, where):
    done = subprocess.run([os.path.join(build, "benchmarks", "bench_screen"), str(threads), where],
                          input="\n".join(lines) + "\n", capture_output=True, check=True, text=True,
                          env=dict(os.environ, OMP_NUM_THREADS=str(threads)))
    return json.loads(done.stdout)


def read_values(build, where):
    form = layout(build)
    data = open(where, "rb").read()
    rows = []
    for at in range(0, len(data), form["size"]):
        row = {}
        for name, (offset, kind) in form["members"].items():
            row[name] = struct.unpack_from(kind, data, at + offset)[0]
        rows.append(row)
    return rows


def compare(ours, theirs, names):
    """Both must give the same; the samples of Monte Carlo are others."""
    worst = {}
    for a, b, name in zip(ours, theirs, names):
        for what, tolerance in (("log10_G0", 1e-4), ("window_low_log10_G0", 2e-3),
                                ("window_high_log10_G0", 2e-3), ("homo_eV", 1e-9), ("lumo_eV", 1e-9)):
            worst[what] = max(worst.get(what, 0), abs(a[what] - b[what]))
            assert abs(a[what] - b[what]) <= tolerance, f"{name}: {what} {a[what]} {b[what]}"
        worst["linear"] = max(worst.get("linear", 0), abs(a["linear_decades"] / b["linear_decades"] - 1))
        if a["error_rule"] == b["error_rule"]:
            ratio = abs(a["error_decades"] / b["error_decades"] - 1)
            worst["error"] = max(worst.get("error", 0), ratio)
            assert ratio < 0.3, f"{name}: error {a['error_decades']} {b['error_decades']}"
    assert worst["linear"] < 0.01, worst
    # two nodes nearer than the scan's step, or touching zero, escape a search for signs
    missed = sum(a["nodes"] != b["nodes"] for a, b in zip(ours, theirs))
    assert all(a["nodes"] >= b["nodes"] or abs(a["nodes"] - b["nodes"]) % 2 for a, b in zip(ours, theirs))
    return worst, missed


def main():
    build = sys.argv[1] if len(sys.argv) > 1 else "build"
    count = int(sys.argv[2]) if len(sys.argv) > 2 else 60
    lines = make_list(count)
    with tempfile.TemporaryDirectory() as folder:
        listed = os.path.join(folder, "list.smi")
        with open(listed, "w") as file:
            file.write("".join(f"{s} m{i}\n" for i, s in enumerate(lines)))
        checked = subprocess.run([os.path.join(build, "mho"), "check", "--json", "--exact", listed],
                                 capture_output=True, check=True, text=True)
        molecules = [Molecule(m) for m in json.loads(checked.stdout)["molecules"]]
        values = os.path.join(folder, "values")
        measure_ours(build, lines, 2, values)
        ours = read_values(build, values)
        with multiprocessing.Pool(2) as pool:
            pool.map(measure_numpy, molecules[:2])
            start = time.perf_counter()
            theirs = pool.map(measure_numpy, molecules, chunksize=1)
            numpy_s = (time.perf_counter() - start) / count
        repeated = lines * max(1, 400 // count)
        two = measure_ours(build, repeated, 2, values)
        one = measure_ours(build, repeated, 1, values)
        worst, missed = compare(ours, theirs, lines)
    result = {"molecules": count, "mean_sites": float(np.mean([len(m.h) for m in molecules])),
              "monte_carlo": float(np.mean([q["error_rule"] for q in ours])),
              "numpy_s": numpy_s, "ours_two_threads_s": two["seconds"] / two["count"],
              "ours_one_thread_s": one["seconds"] / one["count"],
              "reading_share": two["building"] / two["seconds"] / 2,
              "ratio": numpy_s * two["count"] / two["seconds"],
              "ratio_of_threads": one["seconds"] / two["seconds"],
              "node_counts_that_differ": missed, "largest_differences": worst}
    for name, value in result.items():
        print(f"{name}: {value if isinstance(value, dict) else format(value, '.4g')}")
    with open(os.path.join(build, "screen.json"), "w", encoding="utf-8") as file:
        json.dump(result, file, indent=1)


if __name__ == "__main__":
    main()
