#!/usr/bin/python3
# SPDX-License-Identifier: GPL-3.0-or-later
"""`mho screen` as people and accidents treat it: lists of every kind, the same
numbers as the commands for one molecule, killed, interrupted, on a full disk,
at any number of threads, with other options, and with what is no store."""
import csv
import io
import json
import os
import random
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
KILLS = int(sys.argv[1]) if len(sys.argv) > 1 else 50
LINKED = ["Nc1ccc(N)cc1", "Nc1cccc(N)c1", "Nc1ccc(cc1)-c1ccc(N)cc1", "Sc1ccc(S)cc1",
          "N#Cc1ccc(C#N)cc1", "Nc1ccc(cc1)C=Cc1ccc(N)cc1"]
BAD = ["c1ccccc1", "Nc1ccc(", "Nc1ccc([Xx])cc1", "[NH2:1]C[NH2:2]"]
failures = []


def expect(condition, what, more=""):
    if not condition:
        failures.append(what)
        print("FAILED:", what, more)


def mho(*arguments, **more):
    return subprocess.run([MHO, *arguments], capture_output=True, text=True, timeout=300,
                          stdin=subprocess.DEVNULL, **more)


def write(path, lines):
    with open(path, "w") as file:
        file.write("".join(line + "\n" for line in lines))


def content(store):
    """Everything in a store, after a check of its integrity and of its rows."""
    database = sqlite3.connect(store)
    try:
        expect(database.execute("PRAGMA integrity_check").fetchall() == [("ok",)],
               "a store is sound")
        if not database.execute("SELECT name FROM sqlite_master").fetchall():
            return [], 0  # killed before it was begun, and rolled back
        tables = [row for table in ("meta", "candidate", "failure")
                  for row in database.execute(f"SELECT * FROM {table} ORDER BY 1")]
        rows = sorted(row for table in ("candidate", "failure")
                      for (row,) in database.execute(f"SELECT row FROM {table}"))
        expect(rows == list(range(1, len(rows) + 1)), "no row is lost or there twice", rows[:5])
    finally:
        database.close()
    return tables, len(rows)


def mixed(count):
    return [f"{(BAD if i % 7 == 3 else LINKED)[i % (4 if i % 7 == 3 else 6)]} m{i % 50}"
            for i in range(count)]


def busy(name, seconds):
    """Writes a list that takes at least so long; returns its rows, and a time."""
    rows = 200
    while True:
        rows *= 2
        write(name, mixed(rows))
        start = time.monotonic()
        mho("screen", name, "--store", "busy.db", "--quiet")
        taken = time.monotonic() - start
        os.remove("busy.db")
        if taken > seconds or rows > 50000:
            return rows, taken


def failed(store):
    return [(row["candidate"], row["line"], row["reason"]) for row in
            csv.DictReader(io.StringIO(mho("screen", store, "--failed", "--csv").stdout))]


def listed(store, *options):
    done = mho("screen", store, "--show", "--csv", *options)
    expect(done.returncode == 0, "--show works", done.stderr)
    return list(csv.DictReader(io.StringIO(done.stdout)))


def check_lists():
    """Every kind of list, good and bad rows alike, is counted, named and kept."""
    write("a.smi", ["SMILES name", "# a comment", LINKED[0] + " para, first", "", BAD[0] + " bare",
                    LINKED[1], LINKED[0] + " para, first", "C? d"])
    write("a.csv", ["id;smiles;price", "x;" + LINKED[0] + ";1", "x;" + LINKED[0] + ";2",
                    "y;" + LINKED[1], ";" + LINKED[2] + ";3", "z;;4", '"q;' + LINKED[0] + ";5",
                    "last;" + LINKED[3] + ";6"])
    write("a.tsv", ["name\tSMILES", "one\t" + LINKED[0]])
    expected = {"a.smi": (3, ["para, first", "para, first", "3"], ["bare", "d"]),
                "a.csv": (4, ["x", "x", "4", "last"], ["3", "5", "6"]),
                "a.tsv": (1, ["one"], [])}
    for name, (good, names, bad) in expected.items():
        done = mho("screen", name, "--store", name + ".db")
        expect(done.returncode == 0, f"{name} is screened", done.stderr)
        expect(f"{good + len(bad)} candidates in {name}\n" in done.stderr, "rows are announced",
               done.stderr)
        expect(sorted(row["candidate"] for row in listed(name + ".db")) == sorted(names),
               f"{name} keeps names and rows", listed(name + ".db"))
        expect([row[0] for row in failed(name + ".db")] == bad, f"{name} keeps bad rows",
               failed(name + ".db"))
        expect(not bad or f"{len(bad)} of {good + len(bad)} rows are bad" in done.stderr,
               "bad rows are counted")
    lines = {row[0]: row[1] for row in failed("a.csv.db")}
    expect(lines == {"3": "4", "5": "6", "6": "7"}, "bad rows have their line", lines)
    for name, text, message in [("b.csv", "name,formula\nx,C\n", "no column 'smiles'"),
                                ("b.smi", "", "no candidates"), ("c.smi", "\n# nothing\n", "no candidates"),
                                ("b.txt", "C\n", "not a list by its ending"),
                                ("b.sdf", "", "empty")]:
        write(name, [])
        open(name, "w").write(text)
        done = mho("screen", name, "--store", "b.db")
        expect(done.returncode == 2 and message in done.stderr, f"{name} is refused", done.stderr)
        expect(not os.path.exists("b.db"), "and begins no store")
    done = mho("screen", "missing.smi", "--store", "b.db")
    expect(done.returncode == 2 and "missing.smi" in done.stderr, "a missing list is told")


def record(smiles, name):
    from rdkit import Chem
    return f"{name}\n" + Chem.MolToMolBlock(Chem.MolFromSmiles(smiles)).split("\n", 1)[1]


def check_structures():
    """An SDF and a folder of molecule files."""
    with open("four.sdf", "w") as file:
        for name, smiles in (("one", LINKED[0]), ("", LINKED[1]), ("one", LINKED[0])):
            file.write(record(smiles, name) + "> <price>\n3\n\n$$$$\n")
        file.write("broken\n\n\n  1  0 nonsense\n$$$$\n" + record(BAD[0], "bare"))
    done = mho("screen", "four.sdf", "--store", "sdf.db")
    expect("5 candidates" in done.stderr and done.returncode == 0, "an SDF is screened", done.stderr)
    expect([row["candidate"] for row in listed("sdf.db")] == ["one", "one", "2"],
           "its records have names or numbers", listed("sdf.db"))
    expect([row[0] for row in failed("sdf.db")] == ["broken", "bare"], "its bad records are kept",
           failed("sdf.db"))
    os.mkdir("folder")
    for name in ("benzene-1-4-diamine.yaml", "azulene-1-3.yaml"):
        shutil.copy(os.path.join(ROOT, "molecules", name), "folder")
    write("folder/bad.yaml", ["name: x", "sites: 3"])
    write("folder/drawn.mol", [record(LINKED[2], "")])
    shutil.copy("four.sdf", "folder/four.sdf")
    write("folder/empty.sdf", [])
    write("folder/notes.txt", ["nothing"])
    done = mho("screen", "folder/", "--store", "folder.db")
    expect(done.returncode == 0 and "10 candidates" in done.stderr, "a folder is screened", done.stderr)
    expect("1 other files are passed over" in done.stderr, "other files are counted")
    expect(sorted(row["candidate"] for row in listed("folder.db")) ==
           ["azulene, 1,3 contacts", "benzene-1,4-diamine", "drawn", "four (record 2)", "one", "one"],
           "by its files", listed("folder.db"))
    expect([row[:2] for row in failed("folder.db")] == [("bad", "2"), ("empty", "1"),
           ("broken", "79"), ("bare", "81")], "bad files are named", failed("folder.db"))
    whole = content("folder.db")
    os.remove("folder.db")
    mho("screen", "folder", "--store", "folder.db", "--resume", "--threads=1")
    expect([t for t in content("folder.db")[0] if t[0] != "list"] ==
           [t for t in whole[0] if t[0] != "list"], "a folder gives the same each time")


def check_numbers():
    """Each candidate has the numbers that the commands for one molecule give."""
    smiles = LINKED + ["Nc1ccc(cc1)C#Cc1ccc(N)cc1", "Nc1ccc2cc(N)ccc2c1", "C1=CC(=CC=C1N)C=O",
                       "Sc1ccc(s1)-c1ccc(S)s1", "[NH2:1]c1cc2ccccc2c([NH2:2])c1"]
    options = ["--beta=-2.6 eV", "--temperature=200 K", "--fermi=homo + 1.4 eV"]
    write("numbers.smi", [f"{s} {s}" for s in smiles])
    done = mho("screen", "numbers.smi", "--store", "numbers.db", "--window=0.4 eV", "--seed=3", *options)
    expect(done.returncode == 0, "the list is screened", done.stderr)
    database = sqlite3.connect("numbers.db")
    database.row_factory = sqlite3.Row
    compared = 0
    for row in database.execute("SELECT * FROM candidate"):
        def table(*arguments):
            whole = json.loads(mho(*arguments, "--json", row["smiles"], *options).stdout)
            (only,) = whole["tables"].values()
            return [dict(zip(only["columns"], values)) for values in only["rows"]]
        (single,) = table("conductance", "--window=0.4 eV")
        pairs = [(row[mine], single[theirs]) for mine, theirs in
                 [("fermi_eV", "fermi_eV"), ("conductance_G0", "conductance_G0"),
                  ("log10_G0", "log10_G0"), ("window_low_log10_G0", "window_low_log10_G0"),
                  ("window_high_log10_G0", "window_high_log10_G0")]]
        if row["transmission"] is not None:
            pairs.append((row["transmission"], single["transmission"]))
        whole = json.loads(mho("check", "--json", row["smiles"], *options).stdout)["molecules"][0]
        pairs += [(row["homo_eV"], whole["homo_eV"]), (row["lumo_eV"], whole["lumo_eV"]),
                  (row["gap_eV"], whole["lumo_eV"] - whole["homo_eV"])]
        last = table("conductance", "--sensitivity", "--seed=3")[-1]
        pairs.append((row["error_decades"], last["contribution_decades"]))
        nodes = [node for node in table("transmission", "--nodes") if node["imaginary_eV"] == 0 and
                 row["homo_eV"] < node["energy_eV"] + row["fermi_eV"] < row["lumo_eV"]]
        expect(row["nodes"] == len(nodes), f"nodes of {row['smiles']}", (row["nodes"], nodes))
        for mine, theirs in pairs:
            expect(mine == theirs, f"{row['smiles']} has the numbers of one molecule", (mine, theirs))
            compared += 1
    expect(compared >= 90, "numbers were compared", compared)


def check_threads():
    write("threads.smi", mixed(120))
    for threads in "1", "2":
        mho("screen", "threads.smi", "--store", threads + ".db", "--threads", threads)
    one, two = (mho("screen", n + ".db", "--show", "--csv", "--exact").stdout for n in "12")
    expect(one == two and one.count("\n") > 50, "the table does not depend on threads")
    expect(content("1.db") == content("2.db"), "nor does the store")
    expect(mho("screen", "1.db", "--failed", "--csv").stdout ==
           mho("screen", "2.db", "--failed", "--csv").stdout, "nor do the bad rows")


def check_killed():
    """Killed at random moments and resumed: nothing lost, nothing twice."""
    total, taken = busy("killed.smi", 0.8)
    command = [MHO, "screen", "killed.smi", "--store", "killed.db", "--resume", "--quiet", "--csv"]
    whole = subprocess.run(command, capture_output=True)
    reference = content("killed.db")
    expect(reference[1] == total and whole.returncode == 0, "the list is screened")
    os.remove("killed.db")
    draw = random.Random(8)
    kills = middle = 0
    while kills < KILLS:
        process = subprocess.Popen(command, stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL)
        time.sleep(draw.random() * 0.6 * taken)
        process.kill()
        kills += process.wait() != 0
        rows = content("killed.db")[1] if os.path.exists("killed.db") and \
            os.path.getsize("killed.db") else 0
        middle += 0 < rows < total
        if rows == total and kills < KILLS:
            expect(content("killed.db") == reference, "a resumed run has the same content")
            os.remove("killed.db")
    done = subprocess.run(command, capture_output=True)
    expect(content("killed.db") == reference, "and so in the end")
    expect(done.stdout == whole.stdout, "and the same table")
    expect(middle >= KILLS // 10, "it was killed amid its work", middle)
    print(f"{kills} kills, {middle} with a part of the rows done")


def check_interrupted():
    total, _ = busy("stop.smi", 1.0)
    process = subprocess.Popen([MHO, "screen", "stop.smi", "--store", "stop.db"], text=True,
                               stdout=subprocess.PIPE, stderr=subprocess.PIPE)
    for _ in range(600):
        time.sleep(0.02)
        if os.path.exists("stop.db") and os.path.getsize("stop.db") > 20000:
            break
    process.send_signal(signal.SIGINT)
    _, errors = process.communicate(timeout=60)
    rows = content("stop.db")[1]
    expect(process.returncode == 1 and 0 < rows < total, "an interruption keeps what is done", rows)
    expect(f"{rows} of {total} rows are kept in stop.db" in errors and "--resume" in errors,
           "and says how to go on", errors)
    shown = mho("screen", "stop.db", "--show")
    expect(f"unfinished: {rows} of {total}" in shown.stdout, "the store says that it is unfinished")


def check_two_writers():
    """Two programs on one store: the second ends, and nothing is there twice."""
    write("two.smi", mixed(300))
    mho("screen", "two.smi", "--store", "one.db")
    command = [MHO, "screen", "two.smi", "--store", "two.db", "--resume", "--quiet", "--csv"]
    both = [subprocess.Popen(command, stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True)
            for _ in range(2)]
    told = [process.communicate(timeout=120)[1] for process in both]
    codes = sorted(process.returncode for process in both)
    expect(codes == [0, 0] or (codes[0] == 0 and ("another program" in "".join(told))),
           "one of two writers ends", (codes, told))
    expect(content("two.db") == content("one.db"), "and the store is whole")


def check_disk_full():
    """A store that may not grow beyond some blocks, as on a full disk."""
    write("full.smi", mixed(400))
    mho("screen", "full.smi", "--store", "whole.db")
    for blocks in (16, 120):  # of 512 bytes
        shutil.rmtree("full", ignore_errors=True)
        os.mkdir("full")
        done = subprocess.run(["sh", "-c", f"ulimit -f {blocks}; '{MHO}' screen full.smi "
                               "--store full/r.db"], capture_output=True, text=True)
        expect(done.returncode == 1 and "full/r.db: cannot be written: File too large" in done.stderr,
               "a full disk ends the work", done.stderr)
        if os.path.exists("full/r.db"):
            rows = content("full/r.db")[1]
            expect(f"{rows} of 400 rows are kept" in done.stderr, "and what is done is kept", done.stderr)
        expect(blocks < 120 or os.path.exists("full/r.db"), "there is something to keep")
        mho("screen", "full.smi", "--store", "full/r.db", "--resume")
        expect(content("full/r.db") == content("whole.db"), "with room again it goes on")


def check_refusals():
    write("r.smi", mixed(8))
    write("other.smi", mixed(9))
    mho("screen", "r.smi", "--store", "r.db", "--goal=minimise length")
    before = open("r.db", "rb").read()
    write("text.db", ["no store"])
    foreign = sqlite3.connect("foreign.db")
    foreign.execute("CREATE TABLE candidate(x)")
    foreign.commit()
    foreign.close()
    shutil.copy("r.db", "newer.db")
    newer = sqlite3.connect("newer.db")
    newer.execute("PRAGMA user_version = 99")
    newer.close()
    for options, message in [
            (["r.smi", "--store", "r.db"], "exists already"),
            (["r.smi", "--store", "r.db", "--resume", "--beta=-2.5 eV"], "beta = -2.7 eV (default)"),
            (["r.smi", "--store", "r.db", "--resume", "--window=0.4 eV"], "window = 0.5 eV"),
            (["r.smi", "--store", "r.db", "--resume", "--seed=2"], "seed = 1"),
            (["r.smi", "--store", "r.db", "--resume", "--goal=maximise gap"], "goal = minimise length"),
            (["other.smi", "--store", "r.db", "--resume"], "another list"),
            (["r.smi", "--store", "text.db", "--resume"], "not a store"),
            (["r.smi", "--store", "foreign.db", "--resume"], "something else"),
            (["r.smi", "--store", "newer.db", "--resume"], "version 99"),
            (["r.smi", "--store", ":memory:"], "not the name of a file"),
            (["newer.db", "--show"], "version 99"), (["text.db", "--failed"], "not a store"),
            (["foreign.db", "--show"], "something else"), (["gone.db", "--show"], "cannot be opened"),
            (["r.db", "--show", "--fermi=midgap"], "belong to the screening"),
            (["r.smi"], "--store"), (["r.smi", "other.smi", "--store", "x.db"], "one is allowed"),
            (["r.db", "--show", "--require", "gap > 2"], "unit"),
            (["r.db", "--show", "--require", "grap > 2 eV"], "gap")]:
        done = mho("screen", *options)
        expect(done.returncode == 2 and message in done.stderr, f"{options} is refused", done.stderr)
        expect(not os.path.exists("gone.db") and not os.path.exists("x.db"), "and makes no file")
    expect(open("r.db", "rb").read() == before, "nothing is overwritten")
    done = mho("screen", "r.smi", "--store", "r.db", "--resume")
    expect(done.returncode == 0 and "goal: minimise length" in done.stdout, "the goal of the store stays",
           done.stderr + done.stdout)
    open("empty.db", "w").close()
    for store in ("empty.db", "fresh.db"):
        done = mho("screen", "r.smi", "--store", store, "--resume", "--goal=minimise length")
        expect(content(store) == content("r.db"), "--resume begins what is missing or empty", done.stderr)
    shutil.copy("r.db", "damaged.db")
    damaged = sqlite3.connect("damaged.db")
    damaged.execute("UPDATE candidate SET warnings = 'unheard-of' WHERE row = 1")
    damaged.commit()
    damaged.close()
    done = mho("screen", "damaged.db", "--show")
    expect(done.returncode == 2 and "row 1" in done.stderr, "damaged content is refused", done.stderr)
    with open("damaged.db", "r+b") as file:
        file.seek(4096)
        file.write(b"\xff" * 8192)
    done = mho("screen", "damaged.db", "--show")
    expect(done.returncode == 2 and "damaged" in done.stderr, "and a damaged file", done.stderr)


def check_show():
    write("show.smi", mixed(60))
    mho("screen", "show.smi", "--store", "show.db", "--require", "length < 1 nm")
    every = listed("show.db", "--require", "length > 0 nm")
    expect(len(every) == 60 - len(failed("show.db")), "every good row is listed", len(every))
    expect([int(row["rank"]) for row in every] == list(range(1, len(every) + 1)), "best first")
    some = listed("show.db", "--require", "gap > 4 eV", "--require", "warnings = none")
    expect(some and all(float(row["gap_eV"]) > 4 and not row["warnings"] for row in some) and
           len(some) == sum(float(row["gap_eV"] or 0) > 4 and not row["warnings"] for row in every),
           "--require filters")
    stored = listed("show.db")
    expect(stored and all(float(row["length_nm"]) < 1 for row in stored), "what the store requires holds")
    gaps = [float(row["gap_eV"] or 99) for row in listed("show.db", "--goal=minimise gap")]
    expect(gaps == sorted(gaps), "--goal ranks")
    expect(len(listed("show.db", "--top=3")) == 3, "--top limits")
    first, again, other = (listed("show.db", "--top=3", f"--seed={seed}") for seed in (1, 1, 2))
    expect(first == again and [r["top_probability"] for r in first] != [r["top_probability"] for r in other]
           and [r["candidate"] for r in first] == [r["candidate"] for r in other],
           "--seed draws the probabilities anew, and changes no place", (first, other))
    names = json.loads(mho("screen", "show.db", "--show", "--json").stdout)["tables"]["screen"]
    expect(names["columns"] == "rank,candidate,smiles,log10_G0,low,high,gap_eV,length_nm,"
           "top_probability,warnings".split(","), "columns are as documented")
    eye = mho("screen", "show.db", "--show").stdout
    expect("the first 10" in eye and "told apart" in eye, "the screen shows the first rows", eye)
    estimate = mho("screen", "show.smi", "--dry-run")
    expect(re.match(r"60 candidates in show.smi\nabout .* (seconds|minutes) and .* MB, from 60 rows "
                    r"computed just now, 6 of them bad; nothing is written\n$", estimate.stdout),
           "a dry run counts and estimates", estimate.stdout)


def check_study():
    """The same screening as a question of a study."""
    write("study.csv", ["name,smiles"] + [f"m{i},{m}" for i, m in enumerate(LINKED + BAD)])
    aim = ["minimise length", "gap > 2 eV"]
    write("study.yaml", ["study: which of them?", "molecules:", f"  - {{name: one, smiles: {LINKED[0]}}}",
                         "questions:", f"  screen: {{list: study.csv, goal: {aim[0]}, require: [{aim[1]}]}}"])
    done = mho("run", "study.yaml", "-o", "results", "--quiet")
    expect(done.returncode == 0, "a study screens", done.stderr)
    alone = mho("screen", "study.csv", "--store", "study.db", "--goal", aim[0], "--require", aim[1],
                "--csv", "--quiet")
    expect(open("results/screen.csv").read() == alone.stdout, "a study ranks as the command does")
    expect(open("results/failures.csv").read() == mho("screen", "study.db", "--failed", "--csv").stdout,
           "a study lists the bad rows")
    expect(content("results/screening.db")[0][-10:] == content("study.db")[0][-10:],
           "a study keeps the store")
    report = open("results/report.html").read()
    ranked = len(alone.stdout.splitlines()) - 1
    expect('id="screening"' in report and f"Best of the {ranked} of 7 candidates that meet" in report,
           "the report says so", ranked)
    for line, wrong in (("list: nothing.csv", "5:18: list: nothing.csv cannot be read"),
                        ("list: study.csv, require: gap > 2 nm", "5:38: require: "),
                        ("list: study.csv, goal: maximise gab", "5:35: goal: "),
                        ("require: gap > 2 eV", "5:11: key 'list' is missing")):
        write("bad.yaml", ["study: x", "molecules:", f"  - {{name: one, smiles: {LINKED[0]}}}",
                           "questions:", f"  screen: {{{line}}}"])
        said = mho("run", "bad.yaml", "-o", "none")
        expect(said.returncode == 2 and wrong in said.stderr and not os.path.exists("none"),
               f"refused: {line}", said.stderr)


def check_precedence():
    """Command option > molecule file > study defaults, for candidates too."""
    os.makedirs("own")
    write("own/own.yaml", ["name: own", "smiles: Nc1ccc(N)cc1", "beta: -2.4 eV"])
    write("own/plain.yaml", ["name: plain", "smiles: Sc1ccc(S)cc1"])
    write("own.yaml", ["study: which of them?", "defaults: {beta: -3 eV}", "molecules:",
                       "  - {file: own/*.yaml}", "questions: {screen: {list: own}}"])
    for option in ([], ["--beta=-2 eV"]):
        done = mho("run", "own.yaml", "-o", "own-results", "--quiet", *option)
        expect(done.returncode == 0, "a study of molecule files screens them", done.stderr)
        alone = {row["molecule"]: row["log10_G0"] for row in rows_of("own-results/conductance.csv")}
        ranked = {row["candidate"]: row for row in rows_of("own-results/screen.csv")}
        expect(len(ranked) == 2 and all(row["log10_G0"] == alone[name] for name, row in ranked.items()),
               "a candidate has the settings of its molecule", (ranked, alone))
        expect(ranked["own"]["smiles"] == "Nc1ccc(N)cc1", "a molecule file's SMILES is listed", ranked)


def rows_of(path):
    with open(path, newline="") as file:
        return list(csv.DictReader(file))


def check_memory():
    """Memory does not grow with the list."""
    peaks = []
    for rows in (5000, 50000):
        write("long.smi", ["C"] * rows)
        process = subprocess.Popen([MHO, "screen", "long.smi", "--store", f"{rows}.db", "--quiet"],
                                   stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL,
                                   env=dict(os.environ, ASAN_OPTIONS="quarantine_size_mb=1"))
        _, status, usage = os.wait4(process.pid, 0)
        process.returncode = status
        expect(status == 0, "a list of nothing but bad rows is done")
        peaks.append(usage.ru_maxrss)
    expect(peaks[1] < peaks[0] + 4096, "memory is that of a batch", peaks)


def main():
    checks = [check_lists, check_structures, check_numbers, check_threads, check_refusals,
              check_show, check_study, check_precedence, check_two_writers, check_disk_full, check_interrupted, check_memory, check_killed]
    for check in checks:
        scratch = tempfile.mkdtemp()
        os.chdir(scratch)
        start = time.monotonic()
        try:
            check()
        finally:
            os.chdir("/")
            shutil.rmtree(scratch, ignore_errors=True)
        print(f"{check.__name__}: {time.monotonic() - start:.1f} s")
    print(f"{len(failures)} failures")
    return 1 if failures else 0


sys.exit(main())
