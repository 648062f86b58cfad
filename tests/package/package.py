#!/usr/bin/python3
# SPDX-License-Identifier: GPL-3.0-or-later
"""The package as a user takes it: installed into an empty prefix, then found
by pkg-config and by CMake, compiled as C and as C++, linked and run."""
import os
import re
import shutil
import subprocess
import sys
import tempfile

HERE = os.path.dirname(os.path.abspath(__file__))
BUILD = os.environ["MHO_BUILD"]


def run(*command, **more):
    result = subprocess.run(command, capture_output=True, text=True, **more)
    if result.returncode:
        print(" ".join(command), result.stdout, result.stderr, sep="\n")
        sys.exit(1)
    return result.stdout


def library_folder(prefix):
    for path, _, names in os.walk(prefix):
        if "libmho.so" in names:
            return path
    sys.exit("libmho.so is not installed")


def check_documents(prefix):
    """The manual and the completion speak of every verb and option of the help."""
    mho = os.path.join(prefix, "bin/mho")
    manual = open(os.path.join(prefix, "share/man/man1/mho.1"), encoding="utf-8").read()
    completion = os.path.join(prefix, "share/bash-completion/completions/mho")
    verbs = re.findall(r"^  ([a-z]+)  ", run(mho, "--help"), re.M)
    assert len(verbs) >= 9, verbs
    for verb in verbs:
        options = re.findall(r"^ *(?:-., )?(--[a-z-]+)", run(mho, "help", verb), re.M)
        assert options, verb
        page = manual.split(f"\n.SH MHO {verb}\n")[1].split("\n.SH ")[0].replace("\\-", "-")
        missing = [o for o in options if f"\\fB{o}\\fR" not in page]
        words = ['%s' % mho, verb, "--"]
        completed = run("bash", "-c", f". '{completion}'; COMP_WORDS=(\"$@\"); COMP_CWORD=2; _mho \"$1\"; "
                        "echo ${COMPREPLY[@]}", "bash", *words).split()
        if missing or sorted(completed) != sorted(options):
            print(f"mho {verb}: missing in the manual {missing}; completed {completed} for {options}")
            sys.exit(1)


def main():
    scratch = tempfile.mkdtemp()
    prefix = os.path.join(scratch, "prefix")
    run("cmake", "--install", BUILD, "--prefix", prefix)
    folder = library_folder(prefix)
    run(os.path.join(prefix, "bin/mho"), "--version")
    check_documents(prefix)

    environment = dict(os.environ, PKG_CONFIG_PATH=os.path.join(folder, "pkgconfig"),
                       LD_LIBRARY_PATH=folder)
    flags = run("pkg-config", "--define-variable=prefix=" + prefix, "--cflags", "--libs", "mho",
                env=environment).split()
    source = os.path.join(HERE, "consumer.c")
    for compiler, name in ((["cc", "-std=c11"], "c"), (["c++", "-x", "c++"], "cxx")):
        program = os.path.join(scratch, name)
        run(*compiler, source, "-o", program, *flags, "-lm")
        print(run(program, env=environment).strip())

    project = os.path.join(scratch, "project")
    shutil.copytree(os.path.join(HERE, "project"), project)
    shutil.copy(source, project)
    run("cmake", "-G", "Ninja", "-S", project, "-B", os.path.join(project, "build"),
        "-DCMAKE_PREFIX_PATH=" + prefix)
    run("cmake", "--build", os.path.join(project, "build"))
    print(run(os.path.join(project, "build/consumer"), env=environment).strip())

    names = run("nm", "-D", "--defined-only", os.path.join(folder, "libmho.so"))
    foreign = [n for n in re.findall(r" [TDBR] (\S+)", names) if not n.startswith("mho_")]
    internal = [n for n in ("mho_buffer_add", "mho_yaml_read", "mho_spectrum_evaluate")
                if re.search(rf" {n}$", names, re.M)]
    if foreign or internal:
        print("names that should not leave the library:", foreign + internal)
        sys.exit(1)
    shutil.rmtree(scratch)


main()
