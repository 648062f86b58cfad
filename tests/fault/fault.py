#!/usr/bin/python3
# SPDX-License-Identifier: GPL-3.0-or-later
"""The n-th allocation fails, for every n: the program ends with a message and
exit 1 (or does well without), never with a signal, and leaves nothing behind."""
import os
import shutil
import subprocess
import sys
import tempfile

MHO = os.path.abspath(os.environ["MHO"])
ROOT = os.environ["MHO_SOURCE"]
PRELOAD = sys.argv[1]
STRIDE_LIMIT = 80  # at most that many runs a command
MOLECULE = os.path.join(ROOT, "molecules/benzene-1-3-diamine.yaml")
CHAIN = os.path.join(ROOT, "molecules/benzene-para-chains.yaml")
ACID = os.path.join(ROOT, "molecules/terephthalic-acid.yaml")
GOLDEN = os.path.join(ROOT, "tests/golden/files")
PULLS = os.path.join(GOLDEN, "pulls.csv")
STUDY = os.path.join(GOLDEN, "levers-small.yaml")


def run(arguments, scratch, **variables):
    environment = {"PATH": scratch, "LD_PRELOAD": PRELOAD, **variables}
    return subprocess.run([MHO, *arguments], env=environment, capture_output=True, text=True,
                          errors="replace", timeout=60)


def main():
    failures = runs = 0
    for arguments in (["check", "--json", MOLECULE], ["conductance", "--verbose", CHAIN],
                      ["conductance", "--json", MOLECULE],
                      ["transmission", "--csv", MOLECULE], ["transmission", "--poles", MOLECULE],
                      ["transmission", "--channels", "--parts", ACID],
                      ["transmission", "--nodes", "Nc1cccc(c1)-c1cccc(N)c1"],
                      ["histogram", "--plateaus", "--json", "--floor=1e-6G0", PULLS],
                      ["blink", "--levels=2", "blink.txt"],
                      ["screen", "list.smi", "--store", "r.db", "--threads=1", "--csv"],
                      ["run", STUDY, "-o", "results"],
                      ["run", os.path.join(GOLDEN, "traces.yaml"), "-o", "results"]):
        scratch = tempfile.mkdtemp()
        os.chdir(scratch)
        with open("blink.txt", "w") as file:
            file.writelines(f"{i * 1e-3:.3f} {(1 + i // 40 % 2) * 1e-3 + i % 7 * 1e-5:.5f}\n"
                            for i in range(400))
        with open("list.smi", "w") as file:
            file.write("Nc1ccc(N)cc1 good\nNc1ccc( bad\nNc1cccc(N)c1 good too\n")
        good = run(arguments, scratch, FAIL_COUNT=os.path.join(scratch, "count"))
        total = int(open(os.path.join(scratch, "count")).read())
        shutil.rmtree("results", ignore_errors=True)
        if arguments[0] == "screen":
            os.remove("r.db")
        stride = max(1, total // STRIDE_LIMIT)
        for at in list(range(1, min(total, 40))) + list(range(40, total + 1, stride)):
            variables = {"FAIL_AT": str(at)}
            if at % 2:
                variables["FAIL_ON"] = "1"
            result = run(arguments, scratch, **variables)
            runs += 1
            fine = result.returncode == 0 and result.stdout == good.stdout
            told = result.returncode in (1, 2) and result.stderr.strip()
            left = [n for n in os.listdir(".") if ".tmp-" in n or n == "results"]
            if result.returncode == 0:
                shutil.rmtree("results", ignore_errors=True)
                left = [n for n in left if n != "results"]
            if os.path.exists("r.db"):
                os.remove("r.db")
            if not (fine or told) or left:
                failures += 1
                print(f"allocation {at} of {total} in {arguments[0]}: exit {result.returncode}, "
                      f"left {left}, said {result.stderr[:200]!r}")
        os.chdir("/")
        shutil.rmtree(scratch)
    print(f"{runs} runs, {failures} failures")
    return 1 if failures or runs < 300 else 0


sys.exit(main())
