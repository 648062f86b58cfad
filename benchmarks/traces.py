#!/usr/bin/python3
# SPDX-License-Identifier: GPL-3.0-or-later
"""Traces to a logarithmic histogram: ours against what NumPy offers.

Makes about 300 MB of invented traces (fewer with --megabytes), checks that
the counts agree, then compares times.  NumPy reads with loadtxt and with
fromstring, both, and bins log10 with np.histogram.

    traces.py BUILD_FOLDER [--megabytes N] [--json FILE]
"""
import argparse
import gzip
import json
import os
import subprocess
import sys
import tempfile
import time

os.environ.setdefault("OMP_WAIT_POLICY", "passive")
import numpy as np

BINS, LOW, HIGH = 800, -7.0, 1.0


def best(work, repeats=2):
    times = []
    for _ in range(repeats):
        start = time.perf_counter()
        result = work()
        times.append(time.perf_counter() - start)
    return min(times), result


def ours(program, mode, path):
    seconds, counts = [], None
    for _ in range(3):
        lines = subprocess.run([program, mode, path], check=True, capture_output=True,
                               text=True).stdout.split()
        seconds.append(float(lines[0]))
        counts = np.array([int(x) for x in lines[1:]])
    return min(seconds), counts


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
    parser.add_argument("--json")
    options = parser.parse_args()
    program = os.path.join(options.build, "benchmarks", "bench_traces")
    x, g, points = make(options.megabytes)
    rows = []
    with tempfile.TemporaryDirectory() as folder:
        def path(name):
            return os.path.join(folder, name)

        def case(name, file, load, against):
            mine, counts = ours(program, "read", path(file))
            theirs, reference = best(lambda: binned(load()))
            agree(name, counts, reference)
            size = os.path.getsize(path(file)) / 1e6
            rows.append({"case": name, "against": against, "megabytes": round(size, 1),
                         "seconds": mine, "numpy_seconds": theirs,
                         "MB_per_s": size / mine, "ratio": theirs / mine})

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
        mine, counts = ours(program, "bin", path("one.raw"))
        theirs, reference = best(lambda: binned(g))
        agree("binning", counts, reference)
        rows.append({"case": "binning", "against": "log10 + histogram",
                     "megabytes": round(g.nbytes / 1e6, 1), "seconds": mine,
                     "numpy_seconds": theirs, "MB_per_s": g.nbytes / 1e6 / mine,
                     "ratio": theirs / mine, "ns_per_point": mine / len(g) * 1e9})
    for row in rows:
        print(f"{row['case']:20s} {row['megabytes']:7.1f} MB {row['MB_per_s']:8.0f} MB/s  "
              f"{row['ratio']:6.1f} x {row['against']}")
    if options.json:
        with open(options.json, "w") as file:
            json.dump(rows, file, indent=1)


if __name__ == "__main__":
    main()
