#!/usr/bin/python3
# SPDX-License-Identifier: GPL-3.0-or-later
"""Nodes of the program against the polynomial P(E) = adj(E - H)_rl in integers, for
the H that the program prints.

    MHO=build/mho /usr/bin/python3 tests/physics/nodes_check.py

Doubles are integers over a power of two, so that the coefficients of P are exact (D. K.
Faddeev's and U. J. J. Le Verrier's recurrence).  On a small path around each node P
winds as often as its order and the states of that energy that no contact sees (NumPy's
eigenvectors) say; all paths and all states together make the degree of P.
"""
import math
import os

import numpy as np

import outside
from outside import Checks, Program

RADIUS_BITS = 22  # 2^-22 eV: no other zero is that near in these molecules
POINTS = 64

MOLECULES = ['biphenyl-3-3-diamine', 'bipyridine-2-2', 'terphenyl-meta-4-4-diamine',
             'ope3-meta-dithiol', 'fluorenone-2-7-diamine', 'anthraquinone-2-6-dithiol',
             'azulene-5-7', 'tetramethylbiphenyl-4-4-diamine', 'pyrene-1-3-diamine']
# Chains of meta-linked rings, a comb, side groups of their own energy.
SMILES = ['Nc1cccc(c1)-c1cccc(c1)-c1cccc(c1)-c1cccc(N)c1',
          'N' + 'c1cccc(c1)-' * 9 + 'c1cccc(N)c1',
          'NC(=C)C(=C)C(=C)C(=C)N',
          'Nc1ccc(cc1)C(=C(Cl)Cl)c1cc(F)c(N)c(F)c1']


def hamiltonian(m):
    index = {s['id']: i for i, s in enumerate(m['sites'])}
    h = np.diag([s['onsite_eV'] for s in m['sites']]).astype(float)
    for bond in m['bonds']:
        i, j = (index[s] for s in bond['between'])
        h[i, j] = h[j, i] = bond['hopping_eV']
    ends = [index[m['contacts'][side]['sites'][0]] for side in ('left', 'right')]
    return h, ends


def polynomial(h, ends):
    """Integers p[k] and b with P = sum p[k] 2^(b k) x^(d - k), highest first, x = 2^b E."""
    n, bits = len(h), 60
    while any(v * 2.0 ** bits != int(v * 2.0 ** bits) for v in h.flat):
        bits += 1
    rows = [[(j, int(h[i, j] * 2.0 ** bits)) for j in np.nonzero(h[i])[0]] for i in range(n)]
    m = [[int(i == j) for j in range(n)] for i in range(n)]
    found = [m[ends[1]][ends[0]]]
    for k in range(1, n):
        m = [[sum(v * m[t][j] for t, v in rows[i]) for j in range(n)] for i in range(n)]
        c = -sum(m[i][i] for i in range(n)) // k
        for i in range(n):
            m[i][i] += c
        found.append(m[ends[1]][ends[0]])
    while found and not found[0]:
        found.pop(0)
    return found, bits


def winding(p, bits, energy, imaginary):
    """Of P around a point, on a square of half side 2^-RADIUS_BITS eV."""
    half = 1 << (bits - RADIUS_BITS)
    x, y = (int(v * 2.0 ** bits) for v in (energy, imaginary))
    turns, last = 0.0, None
    for k in range(POINTS + 1):
        side, step = divmod(k % POINTS, POINTS // 4)
        along = -half + 2 * half * step // (POINTS // 4)
        u, v = [(half, along), (-along, half), (-half, -along), (along, -half)][side]
        re = im = 0
        for c in p:
            re, im = re * (x + u) - im * (y + v) + c, re * (y + v) + im * (x + u)
        shift = max(re.bit_length(), im.bit_length()) - 60
        now = complex(re >> shift, im >> shift) if shift > 0 else complex(re, im)
        if last is not None:
            turns += np.angle(now / last)
        last = now
    return int(round(turns / (2 * math.pi)))


def unseen_levels(h, ends):
    """Energies of states that vanish on both contacts."""
    level, vector = np.linalg.eigh(h)
    found, k = [], 0
    while k < len(level):
        same = [j for j in range(k, len(level)) if level[j] - level[k] < 1e-9]
        seen = np.linalg.matrix_rank(vector[ends][:, same], tol=1e-9)
        found += [level[k]] * (len(same) - seen)
        k += len(same)
    return found


def check(program, checks, subject, name):
    m = program.check(subject)
    if m['contacts']['left']['sites'] == m['contacts']['right']['sites']:
        return 0
    h, ends = hamiltonian(m)
    table = program.run('transmission', '--nodes', '--json', '--exact', subject)['tables']
    rows = next(iter(table.values()))['rows']
    unseen, total, high = unseen_levels(h, ends), 0, 0
    p, bits = polynomial(h, ends)
    for _, energy, imaginary, order, kind in rows:
        energy += m['fermi_eV']
        imaginary = imaginary or 0
        hidden = sum(abs(e - energy) < 1e-9 for e in unseen) if kind == 'node' else 0
        turns = winding(p, bits, energy, imaginary)
        checks.that(turns == order + hidden, '%s: P winds %d times around %.12g%+.3gi, not %d + %d'
                    % (name, turns, energy, imaginary, order, hidden))
        total += order * (1 if kind == 'node' else 2)
        high = max(high, order)
    checks.that(total + len(unseen) == len(p) - 1,
                '%s: %d zeros and %d unseen states of %d sites' % (name, total, len(unseen), len(h)))
    return high


def main():
    program, checks, high = Program(), Checks(), 0
    for name in MOLECULES:
        path = os.path.join(outside.SOURCE, 'molecules', name + '.yaml')
        high = max(high, check(program, checks, path, name))
    for smiles in SMILES:
        high = max(high, check(program, checks, smiles, smiles))
    checks.that(high >= 10, 'the highest order is %d' % high)
    checks.finish()


main()
