#!/usr/bin/python3
# SPDX-License-Identifier: GPL-3.0-or-later
"""Make junctions.json: transmissions of junctions in high precision.

    /usr/bin/python3 tests/physics/reference.py        (needs python3-mpmath)

T = Tr[Gamma_L G Gamma_R G^+],  Gamma = sum_c coupling_c v_c v_c^T,
G = (E - H + i (Gamma_L + Gamma_R)/2)^-1, on the exact values of the doubles
in the file, by Gaussian elimination in 80 and again in 140 digits.  Where the
two differ a state that no contact sees lies at E and G does not exist: then
the limit is taken, from both sides, at E +- 1e-60 in 220 digits.

junctions.json, one junction a line:
  name, n, H        n x n, real symmetric, eV
  left, right       lists of channels {coupling (eV), vector (n)}
  points            list of {E (eV), kind, T, kappa}
kind says why the energy is there: level (the double nearest to an eigenvalue
of H), flank, node (nearest to a zero of G_lr), pivot (a leading minor of
E - H vanishes), far, plain, or decoupled (the limit described above).
T is text of 25 digits; "0" where the limit is exactly zero.
kappa = sum |p dlnT/dp| over the non-zero H_ij (i <= j, changed with H_ji), the
couplings and E; null where T is zero, 0 below 1e-20 (at T = 1).  At
`decoupled` it is that of the limit.
"""
import json
import os
import random

from mpmath import eigsy, findroot, matrix, mp, mpc, mpf, nstr

SEED = 20
BETA = -2.7
# h and k of C, N and S rows: F. A. Van-Catledge, J. Org. Chem. 45, 4801 (1980)
H_VALUES = (0, 0, 0, 0, 0.51, 1.37, 1.11)
K_VALUES = (1.0, 1.0, 1.0, 0.9, 1.1, 1.02, 0.89, 0.69)


# ---- the reference ---------------------------------------------------------

def solve(rows, columns):
    """x of rows x = column for each column; partial pivoting."""
    n = len(rows)
    a = [list(row) + [c[i] for c in columns] for i, row in enumerate(rows)]
    for k in range(n):
        p = max(range(k, n), key=lambda i: abs(a[i][k]))
        a[k], a[p] = a[p], a[k]
        if a[k][k] == 0:
            raise ZeroDivisionError
        for i in range(k + 1, n):
            if a[i][k] != 0:
                f = a[i][k] / a[k][k]
                for j in range(k + 1, len(a[k])):
                    if a[k][j] != 0:
                        a[i][j] -= f * a[k][j]
    result = []
    for c in range(n, n + len(columns)):
        x = [mpf(0)] * n
        for i in reversed(range(n)):
            s = a[i][c] - sum(a[i][j] * x[j] for j in range(i + 1, n))
            x[i] = s / a[i][i]
        result.append(x)
    return result


def dot(a, b):
    return sum(x * y for x, y in zip(a, b))


def evaluate(junction, energy, shift, digits):
    """T and kappa at energy + shift."""
    mp.dps = digits
    n, h = junction['n'], junction['H']
    left = [(mpf(c['coupling']), [mpf(x) for x in c['vector']])
            for c in junction['left']]
    right = [(mpf(c['coupling']), [mpf(x) for x in c['vector']])
             for c in junction['right']]
    e = mpf(energy) + mpf(shift)
    rows = [[mpc(-mpf(h[i][j])) for j in range(n)] for i in range(n)]
    for i in range(n):
        rows[i][i] += e
    for g, v in left + right:
        for i in range(n):
            for j in range(n):
                if v[i] and v[j]:
                    rows[i][j] += mpc(0, g * v[i] * v[j] / 2)
    x = solve(rows, [v for _, v in left + right])
    a, b = x[:len(left)], x[len(left):]
    pairs = [(gl * gr, dot(vl, b[d]), c, d)
             for c, (gl, vl) in enumerate(left)
             for d, (gr, _) in enumerate(right)]
    t = sum(w * abs(g) ** 2 for w, g, _, _ in pairs)
    return t, kappa(junction, e, t, left, right, a, b, pairs)


def kappa(junction, e, t, left, right, a, b, pairs):
    """From dG = G dA G: every derivative is a product of solved columns."""
    def through(change):
        return sum(2 * w * (g.conjugate() * change(c, d)).real
                   for w, g, c, d in pairs)
    if t == 0:
        return None
    n, h = junction['n'], junction['H']
    total = abs(e * through(lambda c, d: -dot(a[c], b[d])))
    for i in range(n):
        for j in range(i, n):
            if h[i][j]:
                total += abs(h[i][j] * through(
                    lambda c, d: a[c][i] * b[d][j]
                    + (a[c][j] * b[d][i] if i != j else 0)))
    for side, contact in enumerate((left, right)):
        for k, (coupling, v) in enumerate(contact):
            own = sum(w * abs(g) ** 2 for w, g, c, d in pairs
                      if (c, d)[side] == k)
            inside = coupling * through(
                lambda c, d: mpc(0, -0.5) * dot(a[c], v) * dot(v, b[d]))
            total += abs(own + inside)
    return total / t


def close(p, q, tolerance='1e-27'):
    """(T, kappa) agree; kappa, which vanishes at T = 1, absolutely below 1."""
    (t, k), (u, m) = p, q
    return (k is not None and m is not None
            and abs(t - u) <= mpf(tolerance) * abs(u)
            and abs(k - m) <= mpf(tolerance) * max(abs(m), 1))


def reference(junction, energy, kind):
    try:
        coarse = evaluate(junction, energy, 0, 80)
        fine = evaluate(junction, energy, 0, 140)
        if close(coarse, fine):
            return point(energy, kind, *fine)
        if fine[0] <= coarse[0] * mpf('1e-60'):  # rounding only: exactly zero
            return point(energy, kind, mpf(0), None)
    except ZeroDivisionError:
        pass
    above = evaluate(junction, energy, '1e-60', 220)
    below = evaluate(junction, energy, '-1e-62', 220)
    if close(above, below):
        return point(energy, 'decoupled', *below)
    assert max(above[0], below[0]) < mpf('1e-100'), (junction['name'], energy)
    return point(energy, 'decoupled', mpf(0), None)


def point(energy, kind, t, k):
    return {'E': energy, 'kind': kind, 'T': nstr(t, 25) if t else '0',
            'kappa': k if k is None else float(nstr(k, 6)) if k > 1e-20 else 0.0}


# ---- energies --------------------------------------------------------------

def levels(h):
    mp.dps = 50
    return [float(x) if abs(x) > 1e-30 else 0.0
            for x in eigsy(matrix(h), eigvals_only=True)]


def nodes(junction):
    """Doubles nearest to the real zeros of G_lr of two single sites."""
    if any(len(c) != 1 or sum(map(bool, c[0]['vector'])) != 1
           for c in (junction['left'], junction['right'])):
        return []
    n, h = junction['n'], junction['H']
    l = next(i for i, x in enumerate(junction['left'][0]['vector']) if x)
    r = next(i for i, x in enumerate(junction['right'][0]['vector']) if x)

    def cofactor(e):
        rows = [[(e if i == j else 0) - mpf(h[i][j]) for j in range(n)
                 if j != l] for i in range(n) if i != r]
        return determinant(rows)
    mp.dps = 50
    grid = [mpf(-9) + mpf(k) * mpf('0.3017') for k in range(61)]
    value = [cofactor(e) for e in grid]
    return [float(findroot(cofactor, (grid[k], grid[k + 1]), solver='anderson',
                           tol=mpf('1e-80'), verify=False))
            for k in range(60) if value[k] * value[k + 1] < 0]


def determinant(a):
    result = mpf(1)
    for k in range(len(a)):
        p = max(range(k, len(a)), key=lambda i: abs(a[i][k]))
        if a[p][k] == 0:
            return mpf(0)
        if p != k:
            a[k], a[p], result = a[p], a[k], -result
        result *= a[k][k]
        for i in range(k + 1, len(a)):
            f = a[i][k] / a[k][k]
            for j in range(k + 1, len(a)):
                a[i][j] -= f * a[k][j]
    return result


def energies(junction, rng):
    h = junction['H']
    level = rng.choice(levels(h))
    width = junction['left'][0]['coupling'] + junction['right'][0]['coupling']
    yield round(rng.uniform(-7, 7), 3), 'plain'
    yield level, 'level'
    yield level + rng.choice((-1, 1)) * width * rng.uniform(0.05, 2), 'flank'
    yield rng.choice((h[0][0], h[0][0] + h[0][1], h[0][0] - h[0][1])), 'pivot'
    yield rng.choice((-1, 1)) * 10 ** rng.uniform(1.5, 6), 'far'
    found = nodes(junction)
    if found:
        yield rng.choice(found), 'node'
        yield rng.choice(found) + rng.choice((1e-12, -1e-9, 1e-5)), 'node'


# ---- junctions -------------------------------------------------------------

def unit(n, i):
    return [1 if k == i else 0 for k in range(n)]


def contact(n, sites, coupling, amplitudes=None):
    if amplitudes is None:
        return [{'coupling': coupling, 'vector': unit(n, i)} for i in sites]
    vector = [0] * n
    for i, x in zip(sites, amplitudes):
        vector[i] = x
    return [{'coupling': coupling, 'vector': vector}]


def graph(n, bonds, hopping=BETA):
    h = [[0] * n for _ in range(n)]
    for i, j in bonds:
        h[i][j] = h[j][i] = hopping
    return h


def cycle(*sites):
    return list(zip(sites, sites[1:] + sites[:1]))


def junction(name, h, left, right):
    return {'name': name, 'n': len(h), 'H': h, 'left': left, 'right': right}


RING = cycle(*range(6))
BIPHENYL = RING + cycle(*range(6, 12)) + [(0, 6)]
NAPHTHALENE = cycle(*range(10)) + [(4, 9)]  # 1 2 3 4 4a 5 6 7 8 8a
TEXTBOOK = [
    # name, sites, bonds, contact pairs
    ('benzene', 6, RING, ((0, 3), (0, 2), (0, 1), (2, 2))),
    ('biphenyl', 12, BIPHENYL, ((3, 9), (2, 9), (1, 7), (0, 9))),
    ('naphthalene', 10, NAPHTHALENE, ((0, 3), (1, 6), (1, 7), (4, 9))),
    ('chain of 2', 2, [(0, 1)], ((0, 1),)),
    ('chain of 5', 5, [(i, i + 1) for i in range(4)], ((0, 4), (0, 1), (1, 3))),
    ('chain of 14', 14, [(i, i + 1) for i in range(13)], ((0, 13),)),
    ('ring of 4', 4, cycle(0, 1, 2, 3), ((0, 2), (0, 1))),
    ('star of 4', 4, [(0, 1), (0, 2), (0, 3)], ((1, 2), (0, 1))),
]
EXACT = [0.0, BETA, -BETA, 2 * BETA, -2 * BETA]


def textbook():
    for name, n, bonds, pairs in TEXTBOOK:
        for l, r in pairs:
            for left, right in ((0.5, 0.5), (1e-9, 1e-6), (10.0, 0.003)):
                j = junction('%s %d-%d' % (name, l, r), graph(n, bonds),
                             contact(n, [l], left), contact(n, [r], right))
                yield j, [(e, 'plain') for e in EXACT + [1.25, -1e12]]


def symmetric():
    """Benzene: contacts on one symmetry only, and its symmetry just broken."""
    odd, even = [1, -1], [1, 1]
    for name, left, right in (
            ('odd-odd', contact(6, [1, 5], 0.5, odd),
             contact(6, [2, 4], 0.25, odd)),
            ('odd-even', contact(6, [1, 5], 0.5, odd),
             contact(6, [2, 4], 0.25, even)),
            ('even-even', contact(6, [1, 5], 1e-5, even),
             contact(6, [2, 4], 0.25, even)),
            ('independent', contact(6, [1, 5], 0.5),
             contact(6, [2, 4], 0.25)),
            ('face', contact(6, range(6), 0.125),
             contact(6, range(6), 0.25, [1] * 6))):
        yield (junction('benzene ' + name, graph(6, RING), left, right),
               [(e, 'plain') for e in EXACT + [1.25]])
    for shift in (1e-7, 1e-12):
        h = graph(6, RING)
        h[1][1] = shift
        yield (junction('benzene broken by %g eV' % shift, h,
                        contact(6, [0], 0.5), contact(6, [3], 0.5)),
               [(BETA + x * shift, 'plain') for x in (0, 0.2, 0.25, 0.3, 1)])


def random_hamiltonian(n, rng):
    """A tree with up to three more bonds, at most three bonds a site."""
    h = [[0] * n for _ in range(n)]
    degree = [0] * n

    def join(i, j):
        if i == j or h[i][j] or degree[i] > 2 or degree[j] > 2:
            return
        k = rng.choice(K_VALUES)
        theta = rng.choice((0, 0, 0, 34, rng.uniform(0, 89)))
        h[i][j] = h[j][i] = k * BETA * float(mp.cos(mp.radians(theta)))
        degree[i] += 1
        degree[j] += 1
    for i in range(1, n):
        join(i, rng.choice([j for j in range(i) if degree[j] < 3]))
    for _ in range(rng.randint(0, 3)):
        join(rng.randrange(n), rng.randrange(n))
    for i in range(n):
        h[i][i] = rng.choice(H_VALUES) * BETA or 0
    return h


def random_contacts(n, rng):
    gamma = [10 ** rng.uniform(-9, 1) for _ in range(2)]
    style = rng.choice(('single',) * 6 + ('shared', 'many', 'many', 'one', 'one',
                                          'overlap'))
    if style == 'single' or n < 4:
        l, r = rng.sample(range(n), 2)
        return contact(n, [l], gamma[0]), contact(n, [r], gamma[1])
    if style == 'shared':
        i = rng.randrange(n)
        return contact(n, [i], gamma[0]), contact(n, [i], gamma[1])
    sites = rng.sample(range(n), 4)
    if style == 'many':
        return contact(n, sites[:2], gamma[0]), contact(n, sites[2:], gamma[1])
    if style == 'overlap':
        return (contact(n, sites[:3], gamma[0]),
                contact(n, sites[2:], gamma[1], [1, -1]))
    signed = [rng.choice((1, -1, 0.5, round(rng.uniform(-2, 2), 3)))
              for _ in range(4)]
    return (contact(n, sites[:2], gamma[0], signed[:2]),
            contact(n, sites[2:], gamma[1], signed[2:]))


def self_check():
    """Closed forms: one level, and benzene para at mid-gap."""
    level = junction('level', [[-0.5]], contact(1, [0], 0.25),
                     contact(1, [0], 0.5))
    t, k = evaluate(level, 0.125, 0, 80)
    want = mpf('0.125') / (mpf('0.625') ** 2 + mpf('0.375') ** 2)
    assert close((t, k), (want, k)), t
    ring = junction('ring', graph(6, RING, -1), contact(6, [0], 0.5),
                    contact(6, [3], 0.5))
    t, k = evaluate(ring, 0, 0, 80)
    y = mpf('0.125')  # Gamma |g| / 2 with g = 1 / 2 beta
    assert close((t, k), (4 * y ** 2 / (1 + y ** 2) ** 2, k)), t


def main():
    self_check()
    rng = random.Random(SEED)
    lines = []
    jobs = list(textbook()) + list(symmetric())
    for k in range(240):
        n = rng.randint(2, 14)
        h = random_hamiltonian(n, rng)
        jobs.append((junction('random %d' % k, h, *random_contacts(n, rng)), []))
    for j, fixed in jobs:
        wanted = dict(fixed)
        for e, kind in energies(j, rng):
            wanted.setdefault(e, kind)
        j['points'] = [reference(j, float(e), kind)
                       for e, kind in wanted.items()]
        lines.append(json.dumps(j, separators=(',', ':')))
    path = os.path.join(os.path.dirname(os.path.abspath(__file__)),
                        'junctions.json')
    with open(path, 'w') as file:
        file.write('{"junctions":[\n' + ',\n'.join(lines) + '\n]}\n')


if __name__ == '__main__':
    main()
