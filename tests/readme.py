#!/usr/bin/python3
# SPDX-License-Identifier: GPL-3.0-or-later
"""Every command of the README gives the lines that stand below it there.

A block that begins with `$ build/mho` is run in a scratch folder beside the
bundled molecules; `...` stands for lines that are left out.
"""
import os
import re
import subprocess
import sys
import tempfile

MHO = os.path.abspath(os.environ["MHO"])
ROOT = os.path.abspath(os.environ["MHO_SOURCE"])


def main():
    readme = open(os.path.join(ROOT, "README.md"), encoding="utf-8").read()
    blocks = re.findall(r"^```\n\$ (build/mho .*?)\n(.*?)^```$", readme, re.M | re.S)
    if len(blocks) < 4:
        sys.exit(f"only {len(blocks)} examples are found in the README")
    bad = 0
    with tempfile.TemporaryDirectory() as scratch:
        os.symlink(os.path.join(ROOT, "molecules"), os.path.join(scratch, "molecules"))
        os.mkdir(os.path.join(scratch, "build"))
        os.symlink(MHO, os.path.join(scratch, "build/mho"))
        for command, shown in blocks:
            done = subprocess.run(command, shell=True, cwd=scratch, capture_output=True, text=True)
            given = (done.stdout + done.stderr).splitlines()
            for line in shown.splitlines():
                if line and line != "..." and line not in given:
                    bad += 1
                    print(f"{command}\n  no longer gives: {line}")
    print(f"{len(blocks)} examples, {bad} lines that are no longer given")
    return 1 if bad else 0


sys.exit(main())
