#!/usr/bin/python3
# SPDX-License-Identifier: GPL-3.0-or-later
"""`mho run` as people and accidents treat it: the same bytes each time, whole
results or the earlier ones, no gnuplot, interruption, and a report that opens
offline."""
import base64
import csv
import hashlib
import html.parser
import json
import os
import re
import shutil
import signal
import sqlite3
import subprocess
import sys
import tempfile
import time

MHO = os.path.abspath(os.environ["MHO"])
ROOT = os.environ["MHO_SOURCE"]
STUDY = os.path.join(ROOT, "molecules/studies/flat-or-twisted.yaml")
failures = []


def expect(condition, what):
    if not condition:
        failures.append(what)
        print("FAILED:", what)


def mho(*arguments, **more):
    return subprocess.run([MHO, *arguments], capture_output=True, text=True, timeout=120,
                          stdin=subprocess.DEVNULL, **more)


def digest(folder, skip=()):
    return {name: hashlib.sha256(open(os.path.join(folder, name), "rb").read()).hexdigest()
            for name in sorted(os.listdir(folder)) if name not in skip}


class Reader(html.parser.HTMLParser):
    VOID = {"meta", "img", "br"}

    def __init__(self):
        super().__init__()
        self.open, self.sections, self.images, self.links = [], [], [], []

    def handle_starttag(self, tag, attrs):
        attrs = dict(attrs)
        if tag == "section":
            self.sections.append(attrs["id"])
        if tag == "img":
            self.images.append(attrs["src"])
            expect(attrs.get("alt"), "every image says what it shows")
        self.links += [attrs[k] for k in ("src", "href") if k in attrs]
        if tag not in self.VOID:
            self.open.append(tag)

    def handle_endtag(self, tag):
        expect(self.open and self.open.pop() == tag, f"</{tag}> closes what is open")


def check_report(folder):
    text = open(os.path.join(folder, "report.html"), encoding="utf-8").read()
    reader = Reader()
    reader.feed(text)
    expect(not reader.open, "every element is closed")
    expect(reader.sections == ["question", "molecules", "comparison", "predictions", "sensitivity",
                               "twist", "interference", "screening", "transmission", "currents",
                               "warnings",
                               "assumptions", "limits"], f"sections {reader.sections}")
    expect(all(link.startswith("data:") for link in reader.links), "nothing is loaded")
    plain = re.sub(r"data:[^\"]*", "", text).replace('xmlns="http://www.w3.org/2000/svg"', "")
    expect("http" not in plain, "no address in the report")
    # comparison, 2 x T(E), twist and its map, 2 pair matrices; six molecules, what
    # to change in each, how flat one must be, 2 maps of pairs, 2 of changes, currents but for the node
    expect(len(reader.images) == 7 + 6 + 6 + 1 + 2 + 2 + 5, f"{len(reader.images)} images")
    check_levers(folder, text)
    for image in reader.images:
        svg = base64.b64decode(image.split(",", 1)[1])
        expect(svg.rstrip().endswith(b"</svg>"), "figures are whole")
    expect("biphenyl-4,4&#39;-diamine" in text, "names are escaped")


def read_rows(folder, name):
    with open(os.path.join(folder, name + ".csv"), encoding="utf-8") as f:
        return list(csv.DictReader(f))


def check_levers(folder, text):
    """The sentences of twist and interference say what their tables say."""
    twist = read_rows(folder, "twist")
    flat = float(twist[0]["conductance_G0"])
    limit = max(float(row["angle_deg"]) for row in twist
                if float(row["conductance_G0"] or 0) >= 0.8 * flat)
    expect(f"flat to within {limit:g} deg keeps 80 % of the planar conductance" in text,
           f"80 % to {limit} deg")
    drawn = open(os.path.join(folder, "twist-limit-2.svg"), encoding="utf-8").read()
    expect(f">≤ {limit:g}°<" in drawn, "the same on the molecule")
    average, = read_rows(folder, "twist_average")
    expect(average["torsion"] == "biphenyl", "the potential of the molecule file")
    kept = 100 * float(average["motional_average_G0"]) / float(average["planar_G0"])
    expect(f"leaves {kept:.0f} % of the planar conductance" in text, "what thermal motion leaves")
    expect(len(read_rows(folder, "twist_map")) == 46 * 201, "the map over angle and energy")
    pairs = [row for row in read_rows(folder, "interference") if row["molecule"].startswith("benzene")]
    nodes = sum(row["class"].startswith("node") for row in pairs)
    good = sum(row["class"] == "constructive" for row in pairs)
    expect(f"of {len(pairs)} pairs of sites {good} conduct, {nodes} are nodes" in text, "pairs in words")
    own, = (row for row in pairs if {row["site_i"], row["site_j"]} == {"n1", "n3"})
    shift = abs(float(own["overturning_shift_eV"]))
    expect(f"that ends once the Fermi level moves by {shift:.2g} eV" in text, "how far E_F may move")
    for molecule, sum_ in currents_out(folder).items():
        expect(abs(sum_ - 1) < 1e-5, f"{molecule}: what leaves the left contact is T")


def currents_out(folder):
    out = {}
    for row in read_rows(folder, "currents"):
        if row["current"] and row["from"] in ("n1", "n2", "n4") and row["to"].startswith("c"):
            out[row["molecule"]] = out.get(row["molecule"], 0) + float(row["current"])
    return out


def check_tables(folder):
    results = json.load(open(os.path.join(folder, "results.json"), encoding="utf-8"))
    for key in ("schema", "study", "molecules", "tables", "warnings", "limits"):
        expect(key in results, f"results.json has {key}")
    for name, table in results["tables"].items():
        lines = open(os.path.join(folder, name + ".csv"), encoding="utf-8").read().splitlines()
        expect(lines[0] == ",".join(table["columns"]), f"header of {name}.csv")
        expect(len(lines) == len(table["rows"]) + 1, f"rows of {name}.csv")
    compare = results["tables"]["compare"]
    for row in compare["rows"]:
        cell = dict(zip(compare["columns"], row))
        if cell["ratio_computed"] is None:
            continue
        import math
        deviation = math.log10(cell["ratio_computed"] / cell["ratio_measured"])
        expect(abs(deviation - cell["deviation_decades"]) < 1e-12, "deviation is log10 of ratios")
    provenance = json.load(open(os.path.join(folder, "provenance.json"), encoding="utf-8"))
    for item in provenance["inputs"]:
        real = hashlib.sha256(open(item["file"], "rb").read()).hexdigest()
        expect(real == item["sha256"], f"hash of {item['file']}")
    for name in os.listdir(folder):
        if name.endswith(".db"):
            continue
        text = open(os.path.join(folder, name), encoding="utf-8").read()
        expect(name == "provenance.json" or "mho run" not in text, f"no command in {name}")


def check_same_bytes(scratch):
    one, two = os.path.join(scratch, "one"), os.path.join(scratch, "two")
    expect(mho("run", STUDY, "-o", one).returncode == 0, "the demo study runs")
    store = sqlite3.connect(os.path.join(one, "screening.db"))
    expect(store.execute("SELECT count(*) FROM candidate").fetchone()[0] > 100, "a store of candidates")
    store.close()
    counter = int.from_bytes(open(os.path.join(one, "screening.db"), "rb").read()[24:28], "big")
    expect(counter == 2, f"whatever the time, the store is made in two transactions, not {counter}")
    expect(mho("run", STUDY, "-o", two).returncode == 0, "and again")
    expect(digest(one, ["provenance.json"]) == digest(two, ["provenance.json"]), "same bytes")
    before = digest(one)
    expect(mho("run", STUDY, "-o", one).returncode == 0, "replaces an earlier folder")
    expect(digest(one) == before, "with the same bytes, provenance included")
    check_report(one)
    check_tables(one)
    listed = json.load(open(os.path.join(one, "provenance.json")))["files"]
    expect(sorted(listed + ["provenance.json"]) == sorted(os.listdir(one)), "provenance lists the files")
    open(os.path.join(two, "notes.txt"), "w").write("mine")
    done = mho("run", STUDY, "-o", two)
    expect(done.returncode == 2 and "'notes.txt'" in done.stderr and
           os.path.exists(os.path.join(two, "notes.txt")), "a file of somebody else is not thrown away")
    os.remove(os.path.join(two, "notes.txt"))
    open(os.path.join(two, ".hidden"), "w").close()
    expect(mho("run", STUDY, "-o", two).returncode == 0, "hidden files of a desktop do not matter")


def check_no_gnuplot(scratch):
    folder = os.path.join(scratch, "plain")
    done = mho("run", STUDY, "-o", folder, env={"PATH": scratch})
    expect(done.returncode == 0, "without gnuplot the run still ends well")
    names = os.listdir(folder)
    expect("report.html" in names and not any(n.startswith(("transmission", "compare")) and n.endswith(".svg") for n in names),
           "no figures but the drawings of the molecules")
    expect("gnuplot was not found" in open(os.path.join(folder, "report.html")).read(),
           "the report says that figures are missing")


def fake_gnuplot(scratch, body):
    folder = os.path.join(scratch, "fake")
    os.makedirs(folder, exist_ok=True)
    path = os.path.join(folder, "gnuplot")
    with open(path, "w") as f:
        f.write("#!/bin/sh\n" + body)
    os.chmod(path, 0o755)
    return {"PATH": folder + ":/usr/bin:/bin"}


def wait_for_work(scratch):
    """Until a run fills its hidden folder, which a busy machine takes long to reach."""
    for _ in range(300):
        if any(".tmp-" in name for name in os.listdir(scratch)):
            break
        time.sleep(0.1)
    time.sleep(0.3)


def check_failures(scratch):
    folder = os.path.join(scratch, "kept")
    mho("run", STUDY, "-o", folder)
    before = digest(folder)
    broken = mho("run", STUDY, "-o", folder, env=fake_gnuplot(scratch, "exit 1\n"))
    expect(broken.returncode == 1 and "gnuplot" in broken.stderr, "a failing gnuplot is an error")
    expect(digest(folder) == before, "a failed run keeps the earlier results")
    for number in (signal.SIGINT, signal.SIGTERM):
        run = subprocess.Popen([MHO, "run", STUDY, "-o", folder], stderr=subprocess.PIPE,
                               env=fake_gnuplot(scratch, "sleep 1\n"), start_new_session=True)
        wait_for_work(scratch)
        run.send_signal(number)
        _, errors = run.communicate(timeout=30)
        expect(run.returncode == 1 and b"interrupted" in errors, "an interrupted run says so")
        expect(digest(folder) == before, "an interrupted run keeps the earlier results")
    run = subprocess.Popen([MHO, "run", STUDY, "-o", folder],
                           env=fake_gnuplot(scratch, "sleep 5\n"), start_new_session=True)
    wait_for_work(scratch)
    os.killpg(run.pid, signal.SIGKILL)
    run.wait()
    expect(digest(folder) == before, "a killed run keeps the earlier results")
    mho("run", STUDY, "-o", folder)
    left = [name for name in os.listdir(scratch) if ".tmp-" in name]
    expect(not left, f"nothing is left behind: {left}")


def check_disk_full(scratch):
    """Files may not grow beyond a few blocks, as on a full disk."""
    folder = os.path.join(scratch, "full")
    done = subprocess.run(["sh", "-c", f"ulimit -f 40; trap '' XFSZ; '{MHO}' run '{STUDY}' -o '{folder}'"],
                          capture_output=True, text=True)
    expect(done.returncode == 1 and "cannot be written" in done.stderr, "a full disk is an error")
    expect(not os.path.exists(folder), "and leaves no folder")
    expect(not [n for n in os.listdir(scratch) if ".tmp-" in n], "nor a hidden one")


def main():
    for check in (check_same_bytes, check_no_gnuplot, check_failures, check_disk_full):
        scratch = tempfile.mkdtemp()
        try:
            check(scratch)
        finally:
            shutil.rmtree(scratch, ignore_errors=True)
    print(f"{len(failures)} failures")
    return 1 if failures else 0


sys.exit(main())
