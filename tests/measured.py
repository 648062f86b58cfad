#!/usr/bin/python3
# SPDX-License-Identifier: GPL-3.0-or-later
"""`mho histogram`, `mho blink` and a study with traces, from outside: counts
against NumPy's in every kind of file, units, the same bytes at any number of
threads, figures, and what a study does with traces that show a peak, none, or
are broken.  The traces are invented."""
import gzip
import hashlib
import html.parser
import json
import os
import shutil
import subprocess
import sys
import tempfile
import xml.dom.minidom

import numpy as np

MHO = os.path.abspath(os.environ["MHO"])
ROOT = os.environ["MHO_SOURCE"]
STUDIES = os.path.join(ROOT, "molecules/studies")
PULLS = os.path.join(STUDIES, "data/invented-pulls-a.csv.gz")
BLINK = os.path.join(STUDIES, "data/invented-blink.csv.gz")
G0_S = 7.748091729863649e-5  # 2e^2/h, exact constants of 2019
failures = []


def expect(condition, what):
    if not condition:
        failures.append(what)
        print("FAILED:", what)


def mho(*arguments, **more):
    return subprocess.run([MHO, *arguments], capture_output=True, text=True, timeout=120,
                          stdin=subprocess.DEVNULL, **more)


def counts(*arguments):
    done = mho("histogram", "--csv", *arguments)
    expect(done.returncode == 0 and not done.stderr, f"{arguments}: {done.stderr}")
    rows = [line.split(",") for line in done.stdout.splitlines()[1:]]
    return np.array([int(row[1]) for row in rows])


def check_counts(scratch):
    """Against numpy.histogram, 80 bins from 1e-7 to 10 G0."""
    random = np.random.default_rng(7)
    g = 10 ** random.normal(-3, 1, 20000).astype(np.float32).astype(float)
    g = np.float32(g).astype(float)  # what float32 files can hold
    reference = np.histogram(np.log10(g), bins=80, range=(-7, 1))[0]
    path = os.path.join(scratch, "g")

    def same(name, *options):
        ours = counts("--bins", "10", *options, path + name)
        expect((ours == reference).all(), f"{name} {options}: the counts of numpy.histogram")

    np.savetxt(path + ".txt", g, fmt="%.17g")
    with open(path + ".txt", "rb") as plain, gzip.open(path + ".txt.gz", "wb") as packed:
        packed.write(plain.read())
    np.save(path + ".npy", g)
    np.save(path + "32.npy", g.astype(np.float32))
    np.savetxt(path + "log.csv", np.log10(g), fmt="%.17g", header="log10_G0", comments="")
    np.savetxt(path + "nS.csv", np.c_[np.arange(len(g)), g * G0_S * 1e9], fmt="%.17g",
               delimiter=";", header="time_s;conductance_nS", comments="")
    bias, series = 0.1, 1000.0
    current = bias / (1 / (g * G0_S) + series)
    np.savetxt(path + "pA.csv", current * 1e12, fmt="%.17g", header="current_pA", comments="")
    for name in (".txt", ".txt.gz", ".npy", "32.npy", "log.csv", "nS.csv"):
        same(name)
    same("pA.csv", "--bias", "100 mV", "--series-resistance=1 kohm")


def check_threads():
    for arguments in (("histogram", "--peaks", "--json", "--floor=1e-6 G0", PULLS),
                      ("histogram", "--clusters", "--json", "--floor=1e-6 G0", PULLS)):
        one = mho(*arguments, "--threads", "1").stdout
        expect(one and one == mho(*arguments, "--threads", "2").stdout,
               f"{arguments[1]}: the same at one and two threads")
    other = mho("histogram", "--peaks", "--csv", "--seed", "2", "--floor=1e-6 G0", PULLS).stdout
    expect(other != mho("histogram", "--peaks", "--csv", "--floor=1e-6 G0", PULLS).stdout,
           "another seed draws other resamples")
    log10_g0, low, high = map(float, other.splitlines()[1].split(",")[1:4])
    expect(low < -3.0 < high and low < log10_g0 < high, "the interval holds what was put in")


def check_figures(scratch):
    tables = {"histogram": (), "peaks": ("--peaks",), "map": ("--map",), "comb": ("--comb",),
              "linear": ("--linear",), "plateaus": ("--plateaus",)}
    short = os.path.join(scratch, "blink.csv")  # 2000 points are enough here
    with gzip.open(BLINK) as packed, open(short, "wb") as plain:
        plain.write(b"".join(packed.readlines()[:2002]))
    calls = {name: ("histogram", *flags, "--floor=1e-6G0", PULLS) for name, flags in tables.items()}
    calls["blink"] = ("blink", "--levels=2", "--bias=0.1V", short)
    for name, call in calls.items():
        one = os.path.join(scratch, name + "1.svg")
        done = mho(*call, "--quiet", "--figure", one)
        expect(done.returncode == 0 and not done.stderr, f"{name}: {done.stderr}")
        root = xml.dom.minidom.parse(one).documentElement
        expect(root.tagName == "svg" and root.getElementsByTagName("path"), f"{name}: a figure")
    for name in ("peaks", "map"):
        one, two = os.path.join(scratch, name + "1.svg"), os.path.join(scratch, name + "2.svg")
        mho(*calls[name], "--csv", "-o", os.devnull, "--figure", two)
        expect(open(one, "rb").read() == open(two, "rb").read(), f"{name}: the same bytes")
    text = open(os.path.join(scratch, "peaks1.svg"), encoding="utf-8").read()
    expect("0.000997 G0" in text, "the figure tells the peak")
    missing = os.path.join(scratch, "missing.svg")
    done = mho(*calls["blink"], "--figure", missing, env={"PATH": scratch})
    expect(done.returncode == 0 and "gnuplot was not found" in done.stderr and done.stdout,
           "without gnuplot the table is still written")
    expect(not os.path.exists(missing), "and no empty figure is left")


class Sections(html.parser.HTMLParser):
    def __init__(self, path):
        super().__init__()
        self.ids = []
        self.text = open(path, encoding="utf-8").read()
        self.feed(self.text)

    def handle_starttag(self, tag, attrs):
        if tag == "section":
            self.ids.append(dict(attrs)["id"])


def check_study(scratch):
    study = os.path.join(STUDIES, "traces.yaml")
    one, two = os.path.join(scratch, "one"), os.path.join(scratch, "two")
    for folder in (one, two):
        done = mho("run", study, "-o", folder)
        expect(done.returncode == 0, f"the study of traces runs: {done.stderr}")
    for name in os.listdir(one):
        same = open(os.path.join(one, name), "rb").read() == open(os.path.join(two, name), "rb").read()
        expect(same or name == "provenance.json", f"{name}: the same bytes")
    results = json.load(open(os.path.join(one, "results.json")))
    table = results["tables"]["traces"]
    compared = results["tables"]["compare"]
    place = table["columns"].index("log10_G0")
    for row, other in zip(table["rows"], compared["rows"]):
        expect(row[place] == other[compared["columns"].index("measured_log10_G0")],
               "the peak is the measured value")
    csv = mho("histogram", "--peaks", "--csv", "--exact", "--floor=1e-6 G0", PULLS).stdout
    expect(float(csv.splitlines()[1].split(",")[1]) == table["rows"][0][place],
           "the same peak as on the command line")
    report = Sections(os.path.join(one, "report.html"))
    expect("traces" in report.ids and "invented" in report.text, "a section of traces")
    expect({"traces-1.svg", "traces-2.svg"} <= set(os.listdir(one)), "a histogram each")
    provenance = json.load(open(os.path.join(one, "provenance.json")))
    hashes = {os.path.basename(i["file"]): i["sha256"] for i in provenance["inputs"]}
    expect(hashes[os.path.basename(PULLS)] == hashlib.sha256(open(PULLS, "rb").read()).hexdigest(),
           "the hash of the traces")
    expect(provenance["seed"] == 1, "the seed of the bootstrap")


def write_study(scratch, measured, compare="{}"):
    path = os.path.join(scratch, "study.yaml")
    with open(path, "w") as file:
        file.write("study: invented\nmolecules:\n  - {file: biphenyl-4-4-diamine.yaml}\n"
                   f"measured:\n  - {measured}\nquestions:\n  compare: {compare}\n")
    return path


def check_odd_studies(scratch):
    shutil.copy(os.path.join(ROOT, "molecules/biphenyl-4-4-diamine.yaml"), scratch)
    random = np.random.default_rng(11)
    with open(os.path.join(scratch, "tunnel.csv"), "w") as file:
        file.write("distance_nm,conductance_G0\n")
        for _ in range(60):  # contact and tunnelling, no molecule
            x = np.arange(-0.3, 1.4, 0.02)
            y = np.where(x < 0, 0, random.normal(-1.2, 0.4) - random.normal(6, 0.5) * x)
            g = 10 ** (y + random.normal(0, 0.05, x.size)) + random.normal(0, 3e-7, x.size)
            file.writelines(f"{a:.2f},{b:.3e}\n" for a, b in zip(x, g))
            file.write("\n")
    name = "\"biphenyl-4,4'-diamine\""
    folder = os.path.join(scratch, "out")
    for compare in ("{}", f"{{reference: {name}}}"):
        study = write_study(scratch, f"{{molecule: {name}, traces: tun*.csv, floor: 1e-6 G0}}", compare)
        done = mho("run", study, "-o", folder)
        expect(done.returncode == 0, f"traces without a peak: {done.stderr}")
        report = Sections(os.path.join(folder, "report.html"))
        expect("show no peak: there is no measured value" in report.text, "and the report says so")
        expect("comparison" not in report.ids and "traces" in report.ids, "nothing is compared")
    shutil.rmtree(folder)
    with open(os.path.join(scratch, "broken.csv"), "w") as file:
        file.write("distance_nm,conductance_G0\n0.1,1e-3\n0.2,1e-3x\n")
    for measured, message in (
            ("traces: broken.csv", "broken.csv:3:5: '1e-3x' is not a finite decimal number"),
            ("traces: gone*.csv", "study.yaml:5:49: traces: no file matches"),
            ("traces: tunnel.csv, floor: 3 nm", "floor: '3 nm' is a length"),
            ("traces: tunnel.csv, peak: 1e-3 G0", "key 'peak' is not known"),
            ("traces: tunnel.csv, bias: 0.1", "bias: '0.1' has no unit; write '0.1 V'")):
        study = write_study(scratch, f"{{molecule: {name}, {measured}}}")
        done = mho("run", study, "-o", folder)
        expect(done.returncode == 2 and message in done.stderr, f"{measured}: {done.stderr}")
        expect(not os.path.exists(folder), f"{measured}: nothing is written")


def main():
    for check in (check_counts, check_figures, check_study, check_odd_studies):
        scratch = tempfile.mkdtemp()
        try:
            check(scratch)
        finally:
            shutil.rmtree(scratch, ignore_errors=True)
    check_threads()
    print(f"{len(failures)} failures")
    return 1 if failures else 0


sys.exit(main())
