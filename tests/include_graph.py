#!/usr/bin/python3
# SPDX-License-Identifier: GPL-3.0-or-later
"""The includes of src/ follow the house: a file includes only headers of its
own stage, of stages before it, or public ones; public headers include only
public ones; and no header includes itself by any way."""
import os
import re
import sys

ROOT = os.environ.get("MHO_SOURCE", os.path.dirname(os.path.dirname(os.path.abspath(__file__))))
HOUSE = ["base", "molecule", "model", "input", "solver", "analysis", "measure", "compare",
         "screen", "report", "study", "cli"]
# Of the earlier siblings, those that a stage must not see.
FORBIDDEN = {"solver": {"input"}, "analysis": {"input"},
             "measure": {"molecule", "model", "input", "solver", "analysis"},
             "compare": {"input"}, "report": {"input"}}
INCLUDE = re.compile(r'^\s*#\s*include\s+[<"]([^>"]+)[>"]', re.M)


def sources():
    for folder in ("include", "src"):
        for path, _, names in os.walk(os.path.join(ROOT, folder)):
            for name in names:
                if name.endswith((".h", ".c", ".inc")):
                    yield os.path.relpath(os.path.join(path, name), ROOT)


def resolve(name):
    for base in ("include", "src"):
        path = os.path.join(base, name)
        if os.path.exists(os.path.join(ROOT, path)):
            return path
    return None


def stage(path):
    parts = path.split(os.sep)
    return parts[1] if parts[0] == "src" else "public"


def problems(graph):
    for path, includes in graph.items():
        for other in includes:
            here, there = stage(path), stage(other)
            if there == "public" or here == there:
                continue
            if here == "public":
                yield f"{path} is public and includes the internal {other}"
            elif HOUSE.index(there) > HOUSE.index(here):
                yield f"{path} includes {other}: {there} comes after {here}"
            elif there in FORBIDDEN.get(here, ()):
                yield f"{path} includes {other}: {here} must not see {there}"


def cycle(graph):
    state = {}

    def visit(path, trail):
        if state.get(path) == "done":
            return None
        if path in trail:
            return trail[trail.index(path):] + [path]
        for other in graph.get(path, ()):
            found = visit(other, trail + [path])
            if found:
                return found
        state[path] = "done"
        return None

    for path in graph:
        found = visit(path, [])
        if found:
            return found
    return None


def read_graph():
    graph = {}
    for path in sources():
        text = open(os.path.join(ROOT, path), encoding="utf-8").read()
        graph[path] = [r for r in map(resolve, INCLUDE.findall(text)) if r]
    return graph


def main():
    # The check itself is checked: these must be refused.
    bad = {"src/base/a.h": ["src/report/table.h"], "include/mho/x.h": ["src/base/text.h"],
           "src/measure/a.c": ["src/solver/plan.h"]}
    assert len(list(problems(bad))) == 3
    assert cycle({"a": ["b"], "b": ["c"], "c": ["a"]})
    graph = read_graph()
    found = list(problems(graph))
    loop = cycle(graph)
    if loop:
        found.append("includes in a circle: " + " -> ".join(loop))
    for line in found:
        print(line)
    print(f"{len(graph)} files, {sum(map(len, graph.values()))} includes, {len(found)} problems")
    return 1 if found else 0


sys.exit(main())
