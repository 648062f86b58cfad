#!/usr/bin/python3
# SPDX-License-Identifier: GPL-3.0-or-later
"""Figures of twist, interference, transmission and what to change: what is drawn
is what the table of the same call says, nothing leaves the picture, and the same
call gives the same bytes.  Laws of the numbers themselves stand beside: Kirchhoff,
cuts, orbitals that add up to T."""
import csv
import io
import math
import os
import re
import subprocess
import sys
import tempfile
import xml.etree.ElementTree as tree

MHO = os.path.abspath(os.environ["MHO"])
MOLECULES = os.path.join(os.environ["MHO_SOURCE"], "molecules")
SVG = "{http://www.w3.org/2000/svg}"
LINK = "{http://www.w3.org/1999/xlink}href"
failures = []


def expect(condition, what):
    if not condition:
        failures.append(what)
        print("FAILED:", what)


def bundled(name):
    return os.path.join(MOLECULES, name + ".yaml")


def call(*arguments):
    done = subprocess.run([MHO, *arguments], capture_output=True, text=True, timeout=120,
                          stdin=subprocess.DEVNULL)
    expect(done.returncode == 0, f"{arguments}: {done.stderr}")
    return done.stdout


def table(*arguments):
    return list(csv.DictReader(io.StringIO(call(*arguments, "--csv", "--exact"))))


def draw(scratch, *arguments):
    """Rows of the table and the root of its picture, which two calls draw alike."""
    path = os.path.join(scratch, "figure.svg")
    rows = table(*arguments, "--figure", path)
    first = open(path, "rb").read()
    call(*arguments, "--figure", path, "--quiet")
    expect(open(path, "rb").read() == first, f"{arguments}: the same bytes twice")
    return rows, tree.fromstring(first)


def titles(root, kind):
    return [group.find(SVG + "title").text for group in root.iter(SVG + "g")
            if group.get("class") == kind]


def shapes(root, kind):
    """Note and fill of each mark."""
    found = []
    for group in root.iter(SVG + "g"):
        if group.get("class") == kind:
            shape = group.find(SVG + "circle") if kind == "site" else group.find(SVG + "path")
            found.append((group.find(SVG + "title").text, shape.get("fill")))
    return found


def check_inside(root, what):
    """Texts lie in the picture; a character is about 0.62 of the font size."""
    width, height = float(root.get("width")), float(root.get("height"))
    for text in root.iter(SVG + "text"):
        size = float(text.get("font-size")) * 0.62 * len(text.text or "")
        x, y = float(text.get("x")), float(text.get("y"))
        left = x - size / 2 if text.get("text-anchor") == "middle" else x
        expect(left > -1 and left + size < width + 1 and 8 < y < height,
               f"{what}: '{text.text}' is clipped")


def check_no_overlap(root, what):
    """No label of a drawing covers another, nor the name of a site."""
    boxes = []
    for text in root.iter(SVG + "text"):
        if text.get("text-anchor") != "middle" or text.get("font-size") not in ("10", "11"):
            continue
        half = 0.31 * float(text.get("font-size")) * len(text.text)
        x, y = float(text.get("x")), float(text.get("y"))
        for other, ox, oy, ohalf in boxes:
            expect(abs(x - ox) > 0.85 * (half + ohalf) or abs(y - oy) > 7,
                   f"{what}: '{text.text}' covers '{other}'")
        boxes.append((text.text, x, y, half))


def sign_of(fill):
    return -1 if "hatch" in fill else 1


# --- currents ------------------------------------------------------------------


def check_currents(scratch):
    for name, options, contacts in (("biphenyl-4-4-diamine", [], ("n1", "n2")),
                                    ("naphthalene-2-6-dithiol", ["--at", "0.3 eV"], ("S1", "S8")),
                                    ("benzene-1-3-diamine", ["--at", "0.5 eV"], ("n1", "n3"))):
        rows, root = draw(scratch, "transmission", "--currents", *options, bundled(name))
        net, most = {}, max(float(row["current"]) for row in rows)
        for row in rows:
            flow = float(row["current"])
            expect(flow >= 0, f"{name}: currents point where they flow")
            net[row["from"]] = net.get(row["from"], 0) + flow
            net[row["to"]] = net.get(row["to"], 0) - flow
        for site, sum_ in net.items():
            wanted = {contacts[0]: 1, contacts[1]: -1}.get(site, 0)
            expect(abs(sum_ - wanted) < 1e-9 * max(1, most), f"{name}: Kirchhoff at {site}: {sum_}")
        table_ = {(row["from"], row["to"]): float(row["current"]) for row in rows}
        shown = titles(root, "bond")
        expect(len(shown) == sum(flow >= 0.01 * most for flow in table_.values()),
               f"{name}: one arrow a current")
        for title in shown:
            start, end, value = re.fullmatch(r"(\S+) to (\S+): (\S+) of T", title).groups()
            expect(math.isclose(float(value), table_[start, end], rel_tol=1e-5), f"{name}: {title}")
        check_inside(root, name)
        check_no_overlap(root, name)
    # A meta ring at half an eV: a current goes round it, the least of its bonds.
    rounds = titles(root, "ring")
    ring = [float(row["current"]) for row in rows if "n" not in row["from"] + row["to"]]
    expect(len(ring) == 6 and len(rounds) == 1, "one ring, one ring current")
    expect(math.isclose(float(rounds[0].split()[2]), min(ring), rel_tol=1e-5), "its value")
    _, root = draw(scratch, "transmission", "--currents", bundled("benzene-1-4-diamine"))
    for group in root.iter(SVG + "g"):
        if group.get("class") == "bond":
            points = re.findall(r"[ML](-?[\d.]+) (-?[\d.]+)", group.find(SVG + "path").get("d"))
            expect(float(points[3][0]) > float(points[0][0]), "arrows point from left to right")
    expect(not titles(root, "ring"), "nothing goes round a para ring")


def check_orbitals():
    for name in ("biphenyl-4-4-diamine", "azulene-2-6-dithiol", "terephthalic-acid"):
        for energy in ("0 eV", "-0.7 eV"):
            parts = table("transmission", "--orbitals", "--at", energy, bundled(name))
            whole = float(table("transmission", "--at", energy, bundled(name))[0]["transmission"])
            sum_ = sum(float(row["diagonal"]) + float(row["interference"]) for row in parts)
            largest = max(abs(float(row["diagonal"])) for row in parts)
            expect(abs(sum_ - whole) < 1e-9 * max(whole, largest), f"{name}: orbitals add up to T")
            expect([int(row["level"]) for row in parts] == list(range(1, len(parts) + 1)), "levels")


# --- what to change ---------------------------------------------------------------


def check_sensitivity(scratch):
    for name in ("biphenyl-4-4-diamine", "azulene-2-6-dithiol", "benzene-1-3-diamine", "ope3-dithiol"):
        rows, root = draw(scratch, "conductance", "--sensitivity", bundled(name))
        derivative = {row["parameter"]: float(row["derivative_log10_G0"]) for row in rows
                      if row["derivative_log10_G0"]}
        marks = shapes(root, "site")
        donors = {p[5:]: -0.1 * d for p, d in derivative.items() if p.startswith("h of ")}
        least = 0.01 * max(map(abs, donors.values()))
        expect(len(marks) == sum(abs(d) > least for d in donors.values()), f"{name}: marks of sites")
        for title, fill in marks:
            site, value = re.fullmatch(r"donor at (\S+): (\S+) decades", title).groups()
            value = float(value.replace("−", "-"))
            expect(math.isclose(value, donors[site], rel_tol=0.06), f"{name}: {title}")
            expect(sign_of(fill) == math.copysign(1, donors[site]), f"{name}: shape at {site}")
        check_inside(root, name)
        check_no_overlap(root, name)
    rows, root = draw(scratch, "conductance", "--sensitivity", bundled("biphenyl-4-4-diamine"))
    (title, fill), = shapes(root, "bond")
    k, = (float(row["derivative_log10_G0"]) for row in rows if row["parameter"] == "k of c1-d1")
    expect(title.startswith("weaker c1-d1: −") and "hatch" in fill, "a twist lowers G: hatched")
    expect(math.isclose(float(title.split("−")[1].split()[0]), 0.1 * k, rel_tol=0.06), "by how much")


def check_modifications(scratch):
    for name in ("biphenyl-4-4-diamine", "benzene-1-3-diamine"):
        rows, root = draw(scratch, "interference", "--modify", bundled(name))
        best = {}
        for row in rows:
            change = float(row["change_decades"]) if row["change_decades"] else 0
            if abs(change) > abs(best.get(row["site"], (0, ""))[0]):
                best[row["site"]] = change, row["change"]
        most = max(abs(change) for change, _ in best.values())
        marks = shapes(root, "site")
        expect(len(marks) == sum(abs(c) > 0.01 * most for c, _ in best.values()), f"{name}: sites")
        for title, fill in marks:
            what, site, value = re.fullmatch(r"(.+) at (\S+): (\S+) decades", title).groups()
            change, word = best[site]
            expect(what == word, f"{name}: {title} is the largest at {site}, not {word}")
            expect(math.isclose(float(value.replace("−", "-")), change, rel_tol=0.06), title)
            expect(sign_of(fill) == math.copysign(1, change), f"{name}: shape at {site}")
        check_inside(root, name)
        check_no_overlap(root, name)


# --- pairs -------------------------------------------------------------------------


def check_pairs(scratch):
    azulene = "c1ccc2cccc2cc1"
    rows, root = draw(scratch, "interference", "--from", "C2", azulene)
    marks = dict(shapes(root, "site"))
    nodes = 0
    for row in rows:
        other = row["site_j"] if row["site_i"] == "C2" else row["site_i"]
        if not row["transmission"] or float(row["transmission"]) == 0:
            nodes += 1
            continue
        found = [t for t in marks if t.startswith(other + ": ")]
        expect(len(found) == 1, f"a disc at {other}")
        value = float(found[0].split(" T ")[1])
        expect(math.isclose(value, float(row["transmission"]), rel_tol=1e-5), f"T at {other}")
        expect(sign_of(marks[found[0]]) == math.copysign(1, float(row["green_per_eV"])),
               f"sign at {other}")
    words = [text.text for text in root.iter(SVG + "text")]
    expect(words.count("node") == nodes and nodes > 0, "nodes are told in words")
    check_inside(root, "pairs")
    rows, root = draw(scratch, "interference", azulene)
    signs = {"+": 0, "−": 0, "o": 0}
    for row in rows:
        exact = not row["transmission"] or float(row["transmission"]) == 0
        signs["o" if exact else "+" if float(row["green_per_eV"]) > 0 else "−"] += 2
    drawn = ["".join(text.itertext()).strip() for text in root.iter(SVG + "text")]
    for sign, count in signs.items():
        expect(drawn.count(sign) == count, f"matrix: {count} cells marked {sign}, {drawn.count(sign)}")


# --- curves ------------------------------------------------------------------------


def curve_points(group):
    """Pixels of a curve that gnuplot drew; it splits long ones."""
    points = []
    for path in group.iter(SVG + "path"):
        if path.get("d") and "L" in path.get("d"):
            points += [tuple(map(float, pair.split(","))) for pair in
                       re.findall(r"[ML]\s*(-?[\d.]+,-?[\d.]+)", path.get("d"))]
    return points


def plots(root):
    return [(group.find(SVG + "title").text if group.find(SVG + "title") is not None else "", group)
            for group in root.iter(SVG + "g") if (group.get("id") or "").startswith("gnuplot_plot_")]


def check_curves(scratch):
    rows, root = draw(scratch, "twist", "--samples", "31", "--angles", "0 deg, 80 deg", bundled("biphenyl-4-4-diamine"),
                      bundled("biphenyl-4-4-dithiol"))
    names = list(dict.fromkeys(row["molecule"] for row in rows))
    found = plots(root)
    expect([name for name, _ in found] == [n.replace("'", "′") for n in names], "a curve a molecule")
    values = [(float(row["angle_deg"]), math.log10(float(row["conductance_G0"]))) for row in rows]
    pixels = []
    for k, (_, group) in enumerate(found):
        sample = [p for p in curve_points(group)]
        pixels += sample[-31:] if len(sample) > 31 else sample
    expect(len(pixels) == len(values) == 62, f"{len(pixels)} points are drawn of {len(values)}")
    (x0, y0), (x1, y1) = values[0], values[30]
    (px0, py0), (px1, py1) = pixels[0], pixels[30]
    for (x, y), (px, py) in zip(values, pixels):
        expect(abs(px0 + (x - x0) * (px1 - px0) / (x1 - x0) - px) < 1.1 and
               abs(py0 + (y - y0) * (py1 - py0) / (y1 - y0) - py) < 1.1, f"point at {x} deg")


def check_nodes(scratch):
    names = ("azulene-5-7", "benzene-1-3-diamine", "benzene-1-4-diamine")
    _, root = draw(scratch, "transmission", "--energies", "-9 eV, 9 eV", *map(bundled, names))
    wanted = [row for row in table("transmission", "--nodes", *map(bundled, names))
              if row["kind"] == "node" and abs(float(row["energy_eV"])) < 9]
    marks = [use for _, group in plots(root) for use in group.iter(SVG + "use")]
    key = sum(name == "node" for name, _ in plots(root))
    expect(len(wanted) > 6 and key == 1, "the key names the nodes once")
    expect(len(marks) == len(wanted) + key, f"{len(marks) - key} marks for {len(wanted)} nodes")


def main():
    with tempfile.TemporaryDirectory() as scratch:
        for check in (check_currents, check_sensitivity, check_modifications, check_pairs,
                      check_curves, check_nodes):
            check(scratch)
    check_orbitals()
    print(f"{len(failures)} failures")
    return 1 if failures else 0


sys.exit(main())
