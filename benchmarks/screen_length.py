#!/usr/bin/python3
# SPDX-License-Identifier: GPL-3.0-or-later
"""How `mho screen` grows with its list and with threads.

    /usr/bin/python3 benchmarks/screen_length.py build/mho [longest, default 100000]

Lists are the demo's candidates over and over, so that every row costs what a real
one does.  Memory is the peak of the process; the store is one SQLite file.
"""
import csv
import os
import subprocess
import sys
import tempfile
import time

LIST = os.path.join(os.path.dirname(__file__), "../molecules/studies/flat-bridges.csv")


def run(mho, path, store, threads):
    start = time.monotonic()
    process = subprocess.Popen([mho, "screen", path, "--store", store, "--threads", str(threads),
                                "--quiet", "--csv", "-o", os.devnull],
                               stderr=subprocess.DEVNULL,
                               env={**os.environ, "OMP_WAIT_POLICY": "passive"})
    _, status, usage = os.wait4(process.pid, 0)
    if status:
        sys.exit(f"mho screen failed: {status}")
    return time.monotonic() - start, usage.ru_utime + usage.ru_stime, usage.ru_maxrss / 1024


def main():
    mho = os.path.abspath(sys.argv[1])
    longest = int(sys.argv[2]) if len(sys.argv) > 2 else 100000
    smiles = [row["smiles"] for row in csv.DictReader(open(LIST, encoding="utf-8"))]
    print(f"{'rows':>9}{'threads':>9}{'s':>9}{'cpu s':>9}{'ms/row':>9}{'MB':>7}{'store MB':>10}")
    rows = 1000
    while rows <= longest:
        with tempfile.TemporaryDirectory() as folder:
            path = os.path.join(folder, "list.smi")
            with open(path, "w", encoding="utf-8") as file:
                file.writelines(f"{smiles[i % len(smiles)]} m{i}\n" for i in range(rows))
            for threads in (1, 2):
                store = os.path.join(folder, f"{threads}.db")
                wall, cpu, memory = run(mho, path, store, threads)
                print(f"{rows:9}{threads:9}{wall:9.2f}{cpu:9.2f}{1e3 * wall / rows:9.3f}"
                      f"{memory:7.0f}{os.path.getsize(store) / 1e6:10.1f}", flush=True)
        rows *= 10


if __name__ == "__main__":
    main()
