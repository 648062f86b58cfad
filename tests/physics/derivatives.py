#!/usr/bin/python3
# SPDX-License-Identifier: GPL-3.0-or-later
"""Make derivatives.json: derivatives of ln T by central differences.

    /usr/bin/python3 tests/physics/derivatives.py       (needs python3-mpmath)

Takes points of junctions.json and moves each parameter by 1e-40 eV in 160
digits, where the error of the difference is below 1e-30.  One point a line:
  junction, E       index in junctions.json, eV
  onsite            [n] dlnT/d eps_i
  hopping           [[i, j, dlnT/d t_ij]], all pairs of the first three rows
                    (also those without a hopping) and all hoppings
  coupling          dlnT/d Gamma_c, left then right channels
  energy            dlnT/dE
"""
import copy
import json
import os
import random

from mpmath import log, mp, mpf

from reference import evaluate

STEP = '1e-40'
DIGITS = 160


def difference(junction, energy, change):
    """d lnT / d p where change(junction, x) adds x to p."""
    value = []
    for sign in (1, -1):
        j = copy.deepcopy(junction)
        shift = change(j, sign * mpf(STEP)) or 0
        value.append(log(evaluate(j, energy, shift, DIGITS)[0]))
    return float((value[0] - value[1]) / (2 * mpf(STEP)))


def add(j, p, q, x):
    j['H'][p][q] = mpf(j['H'][p][q]) + x
    if p != q:
        j['H'][q][p] = j['H'][p][q]


def derivatives(index, junction, energy):
    mp.dps = DIGITS
    n, h = junction['n'], junction['H']
    pairs = [(i, j) for i in range(n) for j in range(i + 1, n) if h[i][j] or i < 3]

    def coupling(j, x, side, c):
        j[side][c]['coupling'] = mpf(j[side][c]['coupling']) + x
    return {
        'junction': index, 'E': energy,
        'onsite': [difference(junction, energy, lambda j, x: add(j, i, i, x))
                   for i in range(n)],
        'hopping': [[p, q, difference(junction, energy,
                                      lambda j, x: add(j, p, q, x))]
                    for p, q in pairs],
        'coupling': [difference(junction, energy,
                                lambda j, x: coupling(j, x, side, c))
                     for side in ('left', 'right')
                     for c in range(len(junction[side]))],
        'energy': difference(junction, energy, lambda j, x: x)}


def main():
    folder = os.path.dirname(os.path.abspath(__file__))
    with open(os.path.join(folder, 'junctions.json')) as file:
        junctions = json.load(file)['junctions']
    rng = random.Random(21)
    wanted = [(k, p['E']) for k, j in enumerate(junctions) if j['n'] <= 9
              for p in j['points']
              if p['kind'] != 'decoupled' and p['kappa'] is not None
              and p['kappa'] < 1e17 and abs(p['E']) < 100]
    lines = [json.dumps(derivatives(k, junctions[k], e), separators=(',', ':'))
             for k, e in sorted(rng.sample(wanted, 80))]
    with open(os.path.join(folder, 'derivatives.json'), 'w') as file:
        file.write('{"points":[\n' + ',\n'.join(lines) + '\n]}\n')


if __name__ == '__main__':
    main()
