#!/usr/bin/python3
# SPDX-License-Identifier: GPL-3.0-or-later
"""Every public header compiles alone, as C11 and as C++, without warnings."""
import glob
import os
import subprocess
import sys

ROOT = os.environ["MHO_SOURCE"]
COMPILERS = (["cc", "-std=c11", "-x", "c", "-Wstrict-prototypes"],
             ["c++", "-std=c++17", "-x", "c++"])
failed = 0
headers = sorted(glob.glob(os.path.join(ROOT, "include/mho/*.h")))
for header in headers:
    name = os.path.basename(header)
    for compiler in COMPILERS:
        result = subprocess.run(
            compiler + ["-Wall", "-Wextra", "-Wpedantic", "-Werror", "-fsyntax-only",
                        "-I", os.path.join(ROOT, "include"), "-"],
            input=f"#include <mho/{name}>\n#include <mho/{name}>\nint mho_test_unit;\n", text=True,
            capture_output=True)
        if result.returncode:
            failed += 1
            print(name, compiler[0], result.stderr)
print(f"{len(headers)} headers, {failed} failures")
sys.exit(1 if failed or not headers else 0)
