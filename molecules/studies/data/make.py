#!/usr/bin/python3
# SPDX-License-Identifier: GPL-3.0-or-later
"""Writes the invented traces of this folder (see README.md); always the same."""
import gzip
import os
import random

FOLDER = os.path.dirname(os.path.abspath(__file__))


def pulls(name, log10_g0, seed, traces=120, step=0.01):
    """Contact, molecular plateau in six of ten traces, tunnelling, noise."""
    draw = random.Random(seed)
    lines = ["# invented data, no measurement", "distance_nm,conductance_G0"]
    for trace in range(traces):
        has_molecule = draw.random() < 0.6
        mu = draw.gauss(log10_g0, 0.25)
        length = max(0.2, draw.gauss(0.5, 0.12)) if has_molecule else 0.0
        onset = mu - 0.3 if has_molecule else draw.gauss(-1.2, 0.4)
        decay = draw.gauss(6.0, 0.5)
        for i in range(-30, 140):
            x = i * step
            y = 0.0 if x < 0 else mu if x < length else onset - decay * (x - length)
            noise = draw.gauss(0.0, 0.02 if x < 0 else 0.08)
            g = 10 ** (y + noise) + draw.gauss(0.0, 3e-7)
            lines.append(f"{x:.2f},{g:.3e}")
        lines.append("")
    write(name, lines)


def blink(name, seed, points=20000, sampling=1e-4):
    """Two levels, 2 and 3 mG0, mean dwells 20 and 10 ms; current at 0.1 V."""
    draw = random.Random(seed)
    lines = ["# invented data, no measurement; bias 0.1 V", "time_s,current_nA"]
    state, left = 0, draw.expovariate(1 / 0.02)
    for i in range(points):
        if left < i * sampling:
            state = 1 - state
            left += draw.expovariate(1 / (0.02, 0.01)[state])
        g = (2e-3, 3e-3)[state] + draw.gauss(0.0, 2e-4)
        lines.append(f"{i * sampling:.4f},{g * 0.1 * 77480.917:.4f}")
    write(name, lines)


def write(name, lines):
    with open(os.path.join(FOLDER, name), "wb") as file:
        with gzip.GzipFile("", "wb", mtime=0, fileobj=file) as packed:
            packed.write("\n".join(lines).encode() + b"\n")


pulls("invented-pulls-a.csv.gz", -3.0, 1)
pulls("invented-pulls-b.csv.gz", -3.9, 2)
blink("invented-blink.csv.gz", 3)
