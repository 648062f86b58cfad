#!/usr/bin/python3
# SPDX-License-Identifier: GPL-3.0-or-later
"""Traces to a logarithmic histogram: ours against what NumPy offers.

Makes about 300 MB of invented traces (fewer with --megabytes), checks that
the counts agree, then compares times.  NumPy reads with loadtxt and with
fromstring, both, and bins log10 with np.histogram; both sides on one thread.
Runs alternate, and a ratio is the median over pairs, its range beside it.
`bound` is the share of the speed at which the same bytes can be read at all:
a file through a buffer (inflated where it is packed), an array by its sum.

    traces.py BUILD_FOLDER [--megabytes N] [--repeats N] [--json FILE]
"""
import argparse
import gzip
import json
import os
import statistics
import subprocess
import sys
import tempfile
import time

for library in "OMP", "OPENBLAS":
    os.environ[f"{library}_NUM_THREADS"] = "1"
import numpy as np

BINS, LOW, HIGH = 800, -7.0, 1.0


def timed(work, repeats=1):
    times = []
    for _ in range(repeats):
        start = time.perf_counter()
        result = work()
        times.append(time.perf_counter() - start)
    return min(times), result


def ours(program, mode, path):
    lines = subprocess.run([program, mode, path], check=True, capture_output=True,
                           text=True).stdout.split()
    return float(lines[0]), np.array([int(x) for x in lines[1:]])


def read_through(path):
    buffer = bytearray(1 << 18)
    with gzip.open(path) if path.endswith(".gz") else open(path, "rb", buffering=0) as file:
        while file.readinto(buffer):
            pass


def compare(name, against, size, mine, theirs, bound, repeats):
    """mine and theirs give seconds and counts, bound seconds."""
    agree(name, mine()[1], theirs()[1])
    times = [(mine()[0], theirs()[0], bound()) for _ in range(repeats)]
    ratios = sorted(b / a for a, b, _ in times)
    seconds = statistics.median(a for a, _, _ in times)
    return {"case": name, "against": against, "megabytes": round(size, 1), "seconds": seconds,
            "numpy_seconds": statistics.median(b for _, b, _ in times), "MB_per_s": size / seconds,
            "ratio": statistics.median(ratios), "ratio_range": [ratios[0], ratios[-1]],
            "bound_share": statistics.median(c / a for a, _, c in times)}


def binned(g):
    return np.histogram(np.log10(g), bins=BINS, range=(LOW, HIGH))[0]


def agree(name, counts, reference):
    """log10 may put a sample on an edge into the next bin; no more than that."""
    moved = int(np.abs(np.cumsum(counts) - np.cumsum(reference)).sum())
    if counts.sum() != reference.sum() or moved > 1e-4 * reference.sum():
        sys.exit(f"{name}: counts differ from NumPy's ({moved} moved); no times")


def make(megabytes):
    """Pulls with a contact, a plateau in half of them, and tunnelling."""
    random = np.random.default_rng(1)
    points, traces = 2000, max(1, int(megabytes * 1e6 / 19 / 2000))
    x = np.linspace(-0.5, 1.5, points)
    mu = random.normal(-3.0, 0.3, (traces, 1))
    length = np.where(random.random((traces, 1)) < 0.5, random.normal(0.5, 0.1, (traces, 1)), 0)
    y = np.where(x < 0, 0.0, np.where(x < length, mu, -1.0 - 5.0 * (x - length)))
    y = np.maximum(y, -5.9) + random.normal(0, 0.08, y.shape)
    return np.tile(x, traces), (10.0 ** y).ravel(), points


def write_text(path, columns, points, fmt):
    with open(path, "w") as file:
        for start in range(0, len(columns[0]), points):
            rows = np.stack([c[start:start + points] for c in columns], axis=1)
            file.write((fmt * len(rows)) % tuple(rows.ravel()))
            if len(columns) == 1:
                file.write("\n")


def main():
    parser = argparse.ArgumentParser()
    parser.add_argument("build")
    parser.add_argument("--megabytes", type=float, default=300)
    parser.add_argument("--repeats", type=int, default=3)
    parser.add_argument("--json")
    options = parser.parse_args()
    program = os.path.join(options.build, "benchmarks", "bench_traces")
    x, g, points = make(options.megabytes)
    rows = []
    with tempfile.TemporaryDirectory() as folder:
        def path(name):
            return os.path.join(folder, name)

        def case(name, file, load, against):
            at = path(file)
            rows.append(compare(name, against, os.path.getsize(at) / 1e6,
                                lambda: ours(program, "read", at),
                                lambda: timed(lambda: binned(load())),
                                lambda: timed(lambda: read_through(at))[0], options.repeats))

        def text(file):
            with open(path(file), "rb") as opened:
                return np.fromstring(opened.read(), sep=" ")

        def load(file, **column):
            return np.loadtxt(path(file), **column)

        write_text(path("one.txt"), [g], points, "%.6e\n")
        case("text", "one.txt", lambda: text("one.txt"), "fromstring + histogram")
        case("text", "one.txt", lambda: load("one.txt"), "loadtxt + histogram")
        write_text(path("two.txt"), [x, g], points, "%.4f %.6e\n")
        case("two columns", "two.txt", lambda: text("two.txt")[1::2], "fromstring + histogram")
        case("two columns", "two.txt", lambda: load("two.txt", usecols=1), "loadtxt + histogram")
        with open(path("one.txt"), "rb") as plain, \
                gzip.open(path("one.txt.gz"), "wb", compresslevel=1) as packed:
            packed.write(plain.read())
        case("gzip", "one.txt.gz",
             lambda: np.fromstring(gzip.open(path("one.txt.gz")).read(), sep=" "),
             "gzip + fromstring + histogram")
        np.save(path("one.npy"), g.reshape(-1, points))
        case("npy float64", "one.npy", lambda: np.load(path("one.npy")).ravel(), "load + histogram")
        g.tofile(path("one.raw"))
        rows.append(compare("binning", "log10 + histogram", g.nbytes / 1e6,
                            lambda: ours(program, "bin", path("one.raw")),
                            lambda: timed(lambda: binned(g), 3),
                            lambda: timed(g.sum, 3)[0], options.repeats))
        rows[-1]["ns_per_point"] = rows[-1]["seconds"] / len(g) * 1e9
    for row in rows:
        print(f"{row['case']:12s} {row['megabytes']:6.1f} MB {row['MB_per_s']:6.0f} MB/s, "
              f"{100 * row['bound_share']:3.0f} % of the bound  {row['ratio']:5.1f} x "
              f"({row['ratio_range'][0]:.1f} to {row['ratio_range'][1]:.1f}) {row['against']}")
    if options.json:
        with open(options.json, "w") as file:
            json.dump(rows, file, indent=1)


if __name__ == "__main__":
    main()
