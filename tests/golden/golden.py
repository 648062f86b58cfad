#!/usr/bin/python3
# SPDX-License-Identifier: GPL-3.0-or-later
"""Command-line tests: a command beside its expected output, errors and exit.

Each file cases/NAME.txt has the lines of a shell command first ("$ ..."), then
what it must give:

    $ mho check broken.yaml
    exit 2
    stdout:
    stderr:
    broken.yaml:3:5: ...

It runs in a scratch copy of cases/files with the bundled molecules in
molecules/.  `golden.py --renew` writes what the program gives now: read the
difference before you commit it.
"""
import glob
import os
import shutil
import subprocess
import sys
import tempfile

HERE = os.path.dirname(os.path.abspath(__file__))
ROOT = os.environ["MHO_SOURCE"]


def run(command, scratch):
    bin_folder = os.path.join(scratch, ".bin")
    os.makedirs(bin_folder, exist_ok=True)
    if not os.path.exists(os.path.join(bin_folder, "mho")):
        os.symlink(os.path.abspath(os.environ["MHO"]), os.path.join(bin_folder, "mho"))
    environment = {"PATH": bin_folder + ":/usr/bin:/bin", "LC_ALL": "C.UTF-8"}
    return subprocess.run(["sh", "-c", command], cwd=scratch, env=environment,
                          capture_output=True, text=True, timeout=60,
                          stdin=subprocess.DEVNULL, errors="replace")


def render(command, result):
    return (f"$ {command}\nexit {result.returncode}\nstdout:\n{result.stdout}"
            f"stderr:\n{result.stderr}")


def main():
    renew = "--renew" in sys.argv
    failed = 0
    cases = sorted(glob.glob(os.path.join(HERE, "cases", "*.txt")))
    for case in cases:
        text = open(case, encoding="utf-8").read()
        command = text.split("\n", 1)[0].removeprefix("$ ")
        with tempfile.TemporaryDirectory() as scratch:
            shutil.copytree(os.path.join(HERE, "files"), scratch, dirs_exist_ok=True)
            shutil.copytree(os.path.join(ROOT, "molecules"), os.path.join(scratch, "molecules"))
            now = render(command, run(command, scratch))
        if renew:
            open(case, "w", encoding="utf-8").write(now)
        elif now != text:
            failed += 1
            print(f"--- {os.path.basename(case)}: expected\n{text}\n--- got\n{now}")
    print(f"{len(cases)} commands, {failed} failures")
    return 1 if failed or not cases else 0


sys.exit(main())
