#!/usr/bin/python3
# SPDX-License-Identifier: GPL-3.0-or-later
"""Resonances, eigenchannels and chains as electrodes, against NumPy and SciPy.

    MHO=build/mho /usr/bin/python3 tests/physics/inside_check.py

Widths: eigenvectors of H - i Gamma/2.  Eigenchannels: eigenvalues of
Gamma_L^1/2 G Gamma_R G^+ Gamma_L^1/2 (they and T have the same trace).  Chains:
the surface Green's function by decimation (M. P. Lopez Sancho, J. M. Lopez
Sancho and J. Rubio, J. Phys. F 15, 851 (1985)), which knows nothing of the
closed form (D. M. Newns, Phys. Rev. 178, 1123 (1969)) that the program uses;
integrals by the closed form, which has no broadening to smear the edges.
"""
import os
import subprocess

import numpy as np
from scipy.integrate import quad

import outside
from outside import Refused

BOLTZMANN = 8.617333262e-5  # eV/K
ETA = 1e-10  # eV; what it leaves is of its order next to the band's 1 eV


# ---- the same by NumPy -----------------------------------------------------

class Junction:
    """H, contacts and E_F of `mho check --json --exact`."""

    def __init__(self, program, file, surface=None):
        self.surface = surface or decimate
        found = program.check(file)
        ids = [s['id'] for s in found['sites']]
        self.h = outside.hamiltonian_of_check(found)
        self.fermi = found['fermi_eV']
        self.temperature = found['temperature_K']
        self.electrons = found['electrons']
        self.contact = [found['contacts'][side] for side in ('left', 'right')]
        self.vectors = []
        for contact in self.contact:
            unit = np.eye(len(ids))[:, [ids.index(s) for s in contact['sites']]]
            self.vectors.append(unit if contact['channels'] == 'independent'
                                else unit @ np.array([contact['amplitude']]).T)

    def sigma(self, side, energy):
        contact = self.contact[side]
        if 'chain' not in contact:
            return contact['shift_eV'] - 0.5j * contact['coupling_eV']
        chain = contact['chain']
        return chain['joint_eV'] ** 2 * self.surface(
            chain['centre_eV'], chain['hopping_eV'], energy)

    def solve(self, energy):
        """G, and Gamma of both contacts as matrices."""
        sigma = [self.sigma(side, energy) for side in (0, 1)]
        v = self.vectors
        total = sum(s * x @ x.T for s, x in zip(sigma, v))
        g = np.linalg.inv(energy * np.eye(len(self.h)) - self.h - total)
        return g, [-2 * s.imag * x @ x.T for s, x in zip(sigma, v)]

    def transmission(self, energy):
        g, gamma = self.solve(energy)
        return np.trace(gamma[0] @ g @ gamma[1] @ g.conj().T).real


def newns(centre, hopping, energy):
    x = (energy - centre) / 2
    return (x - 1j * np.sqrt(hopping ** 2 - x * x)) / hopping ** 2


def decimate(centre, hopping, energy):
    """Surface Green's function of a semi-infinite chain: every step takes out
    each second site.  Not at the centre itself, where ETA alone divides."""
    z = energy + 1j * ETA
    surface = bulk = complex(centre)
    link = hopping * hopping + 0j  # product of the two couplings
    while abs(link) > 1e-30:
        step = link / (z - bulk)
        surface, bulk = surface + step, bulk + 2 * step
        link = step * step
    return 1 / (z - surface)


def rows(program, *arguments):
    tables = program.run('transmission', *arguments, '--json', '--exact')['tables']
    (table,) = tables.values()
    return [dict(zip(table['columns'], r)) for r in table['rows']]


# ---- molecules -------------------------------------------------------------

def naphthalene(electrodes, **keys):
    ring = {'name': 'a naphthalene with nitrogen',
            'sites': [{'id': 'c%d' % i, 'element': 'C'} for i in range(1, 11)],
            'bonds': [{'between': ['c%d' % i, 'c%d' % (i % 10 + 1)]}
                      for i in range(1, 11)] + [{'between': ['c5', 'c10']}],
            'electrodes': electrodes}
    ring['sites'][2]['element'] = 'N-pyridine'
    return dict(ring, **keys)


def biphenyl(electrodes, twist):
    rings = [('a', range(1, 7)), ('b', range(1, 7))]
    bonds = [{'between': ['%s%d' % (r, i), '%s%d' % (r, i % 6 + 1)]}
             for r, six in rings for i in six]
    bonds.append({'between': ['a4', 'b1'], 'twist': '%r deg' % twist})
    return {'name': 'biphenyl', 'bonds': bonds, 'electrodes': electrodes,
            'sites': [{'id': '%s%d' % (r, i), 'element': 'C'}
                      for r, six in rings for i in six]}


def wide(sites, coupling, **keys):
    return dict({'sites': sites.split(), 'coupling': '%r eV' % coupling}, **keys)


def chain(sites, hopping, joint, centre=0.0, **keys):
    return dict({'sites': sites.split(), 'chain': {
        'centre': '%r eV' % centre, 'hopping': '%r eV' % hopping,
        'joint': '%r eV' % joint}}, **keys)


# ---- checks ----------------------------------------------------------------

def widths(checks, program):
    for left, right in ((wide('c1', 0.5), wide('c6', 0.2)),
                        (wide('c1 c2', 0.4), wide('c7', 1.1)),
                        (wide('c1 c2', 0.4, channels='one', amplitude=[1, -2]),
                         wide('c8 c6', 1e-3, shift='0.1 eV'))):
        file = program.write(naphthalene({'left': left, 'right': right},
                                         fermi='0.3 eV'))
        j = Junction(program, file)
        sigma = [j.sigma(side, 0) for side in (0, 1)]
        value, vector = np.linalg.eig(j.h + sum(
            s * v @ v.T for s, v in zip(sigma, j.vectors)))
        order = np.argsort(value.real)
        value, vector = value[order], vector[:, order]
        taken = [-2 * s.imag * np.sum(np.abs(v.T @ vector) ** 2, axis=0)
                 / np.sum(np.abs(vector) ** 2, axis=0)
                 for s, v in zip(sigma, j.vectors)]
        got = rows(program, '--poles', '--widths', file)
        column = {k: np.array([r[k] for r in got]) for k in list(got[0])[1:]}
        checks.near(column['energy_eV'], value.real - 0.3, 1e-12, 'poles: energy')
        checks.near(column['width_eV'], -2 * value.imag, 1e-12, 'poles: width')
        checks.near(column['left_width_eV'], taken[0], 1e-11, 'poles: left width')
        checks.near(column['right_width_eV'], taken[1], 1e-11, 'poles: right width')
        # the default has the header that it always had
        plain = rows(program, '--poles', file)
        checks.that([list(r) for r in plain]
                    == [['molecule', 'energy_eV', 'width_eV']] * 10,
                    'poles: columns without --widths')


def eigenchannels(checks, program):
    for left, right in ((wide('c1 c2', 0.5), wide('c6 c7', 0.9)),
                        (wide('c1 c2 c4', 1e-3), wide('c6 c7', 2.0)),
                        (chain('c1 c2', -2.0, 0.8), wide('c6 c8 c7', 0.3)),
                        (wide('c1', 0.5), wide('c6 c7', 0.9)),
                        (wide('c1 c2', 0.5, channels='one', amplitude=[2, 1]),
                         wide('c6 c7', 0.9))):
        file = program.write(naphthalene({'left': left, 'right': right}))
        j = Junction(program, file)
        for energy in (-2.9, 0.07):
            g, gamma = j.solve(energy)
            a = [np.sqrt(-2 * j.sigma(s, energy).imag) * j.vectors[s]
                 for s in (0, 1)]
            u, s, vh = np.linalg.svd(a[0].T @ g @ a[1])
            got = rows(program, '--channels', file, '--at', '%r eV' % energy)
            t = np.array([r['transmission'] for r in got])
            # the route of the textbook: no singular values
            full = np.linalg.eigvalsh(
                a[0].T @ g @ gamma[1] @ g.conj().T @ a[0])[::-1][:len(t)]
            size = 1e-7 * full[0]  # of the decimation's ETA where chains are
            size = size if 'chain' in left else 1e-12 * full[0]
            what = 'channels at %g eV: ' % energy
            checks.near(t, full, size, what + 'transmissions')
            checks.near(t.sum(), j.transmission(energy), size, what + 'sum')
            checks.near(t.sum(), rows(program, file, '--at', '%r eV' % energy)
                        [0]['transmission'], 1e-12 * full[0], what + 'sum and T')
            compare_parts(checks, program, j, file, energy, u, vh, what)


def compare_parts(checks, program, j, file, energy, u, vh, what):
    got = rows(program, '--channels', '--parts', file, '--at', '%r eV' % energy)
    pattern = {'left': np.abs(u) ** 2, 'right': np.abs(vh.conj().T) ** 2}
    for index, side in enumerate(('left', 'right')):
        contact = j.contact[index]
        for channel in sorted({r['channel'] for r in got}):
            part = [r['part'] for r in got
                    if r['channel'] == channel and r['contact'] == side]
            want = pattern[side][:, channel - 1]
            if contact['channels'] == 'one':
                square = np.array(contact['amplitude']) ** 2
                want = want[0] * square / square.sum()
            checks.near(part, want, 1e-6, '%sparts of the %s contact' % (what, side))


CHAINS = ((chain('c1', -2.0, -0.7), chain('c6', 1.5, 0.4, 0.3)),
          (chain('c1', -1.0, -0.5), wide('c7', 0.3)),
          (wide('c2', 0.3, shift='0.05 eV'), chain('c6 c8', 3.0, 1.2, -0.4)),
          (chain('c1', -2.5, 1e-3), chain('c6', -2.5, 2e-3)),
          (chain('c1 c2', -2.5, 1.0, channels='one', amplitude=[1, -1]),
           chain('c6', -2.5, 1.0)))


def band(j):
    edges = [(c['centre_eV'] - 2 * abs(c['hopping_eV']),
              c['centre_eV'] + 2 * abs(c['hopping_eV']))
             for c in (x['chain'] for x in j.contact if 'chain' in x)]
    return max(e[0] for e in edges), min(e[1] for e in edges)


def transmission_of_chains(checks, program):
    for left, right in CHAINS:
        file = program.write(naphthalene({'left': left, 'right': right},
                                         fermi='0.2 eV'))
        j = Junction(program, file)
        low, high = band(j)
        for r in rows(program, file, '--energies', '-7 eV, 7 eV', '--samples', '57'):
            energy = r['energy_eV'] + 0.2
            what = 'chains: T at %g eV' % energy
            if not low < energy < high:
                checks.that(r['transmission'] == 0
                            and r['log10_transmission'] is None, what + ' outside')
                continue
            want = j.transmission(energy)
            checks.near(r['transmission'], want, 1e-6 * want + 1e-15, what)


def no_resonance_is_missed(checks, program):
    """Widths of 1e-6 eV: the grid of the plot must come within half of one of
    every resonance in the band."""
    file = program.write(naphthalene({'left': CHAINS[3][0], 'right': CHAINS[3][1]}))
    j = Junction(program, file, newns)
    grid = rows(program, file, '--energies', '-6 eV, 6 eV')
    energy = np.array([r['energy_eV'] for r in grid])
    t = np.array([r['transmission'] for r in grid])
    seen = 0
    for level in np.linalg.eigvalsh(j.h):
        near = np.abs(energy - level) < 1e-4
        if abs(level) < 4.9:
            peak = max(j.transmission(level + x) for x in np.linspace(-6e-6, 6e-6, 601))
            checks.that(near.any() and t[near].max() > 0.9 * peak,
                        'resonance at %g eV: %g of %g' % (level, t[near].max(), peak))
            seen += 1
    checks.that(seen >= 8, 'enough resonances lie in the band')


def thermal(checks, program):
    for left, right in CHAINS[:3] + CHAINS[4:]:
        for fermi in (0.2, -1.9, 2.1, 2.6):
            file = program.write(naphthalene({'left': left, 'right': right},
                                             fermi='%r eV' % fermi))
            j = Junction(program, file, newns)
            kt = BOLTZMANN * j.temperature
            low, high = band(j)
            near = min(max(fermi, low), high)
            low, high = max(low, near - 40 * kt), min(high, near + 40 * kt)
            want = 0.0
            if low < high:
                # E = middle - half cos(u) takes the roots at the edges away
                middle, half = (low + high) / 2, (high - low) / 2

                def integrand(u):
                    e = middle - half * np.cos(u)
                    f = 1 / np.cosh((e - fermi) / (2 * kt)) ** 2 / (4 * kt)
                    return j.transmission(e) * f * half * np.sin(u)
                want = quad(integrand, 0, np.pi, epsabs=0, epsrel=1e-9,
                            limit=400, points=[np.arccos(np.clip(
                                (middle - fermi) / half, -1, 1))])[0]
            got = program.conductance(file)
            checks.near(got, want, 2e-7 * want + 1e-30,
                        'chains: thermal conductance at %g eV' % fermi)


def twist_of_chains(checks, program):
    electrodes = {'left': chain('a1', -2.0, 0.9), 'right': chain('b4', -3.0, 0.8, 0.5)}
    file = program.write(dict(biphenyl(electrodes, 30.0), fermi='0.15 eV'))
    table = program.run('twist', file, '--angles', '0 deg, 80 deg', '--samples', '5',
                        '--json', '--exact')['tables']['twist']
    for row in table['rows']:
        r = dict(zip(table['columns'], row))
        j = Junction(program, program.write(biphenyl(electrodes, r['angle_deg'])))
        want = j.transmission(0.15)
        checks.near(r['transmission'], want, 1e-7 * want,
                    'chains: T at %g deg' % r['angle_deg'])


def round_trip(checks, program):
    left = chain('c1 c2', -2.25, 0.7, 0.125, channels='one', amplitude=[1, -1])
    file = program.write(naphthalene({'left': left, 'right': wide('c6', 0.3)}))
    contacts = program.check(file)['contacts']
    checks.that(contacts['left'] == {
        'sites': ['c1', 'c2'], 'coupling_eV': None, 'shift_eV': None,
        'chain': {'centre_eV': 0.125, 'hopping_eV': -2.25, 'joint_eV': 0.7},
        'channels': 'one', 'amplitude': [1.0, -1.0]}, 'check: %r' % contacts)
    # --coupling puts wide bands in their place
    found = program.run('check', '--json', '--exact', file, '--coupling', '0.4 eV')
    contacts = found['molecules'][0]['contacts']
    checks.that(contacts['left']['coupling_eV'] == contacts['right']['coupling_eV']
                == 0.4 and 'chain' not in contacts['left'], '--coupling')


def bundled(checks, program):
    folder = os.path.join(outside.SOURCE, 'molecules')
    file = os.path.join(folder, 'benzene-para-chains.yaml')
    j = Junction(program, file)
    for energy in (-1.9, -0.5, 0.07, 1.2):
        checks.near(program.at(file, energy), j.transmission(energy), 1e-9,
                    'benzene-para-chains at %g eV' % energy)
    wide_band = program.at(os.path.join(folder, 'benzene-para.yaml'))
    checks.near(program.at(file), wide_band, 1e-15,
                'benzene-para-chains: T at the centre of the band')


def drawn(checks, program):
    """A SMILES with a coupling on one side and a chain on the other."""
    file = program.write({'name': 'drawn', 'smiles': 'Nc1ccc(-c2ccc(S)cc2)cc1', 'electrodes': {
        'left': {'coupling': '0.7 eV'},
        'right': {'chain': {'hopping': '-2 eV', 'joint': '1 eV', 'centre': '0.3 eV'}}}})
    j = Junction(program, file)
    checks.near(j.contact[0]['coupling_eV'], 0.7, 0, 'drawn: coupling')
    for energy in (-1.5, 0.1, 2.0):
        want = j.transmission(energy)
        checks.near(program.at(file, energy), want, 1e-7 * want, 'drawn: T at %g eV' % energy)


def refused(checks, program):
    """What knows no chains says so with its place, and leaves with 2."""
    file = program.write(naphthalene({'left': wide('c1', 0.3),
                                      'right': chain('c6', -1.0, 0.5)}))
    text = open(file).read().splitlines()
    line = next(i for i, t in enumerate(text, 1) if t.strip() == 'chain:') + 1
    for arguments in (['transmission', '--poles'], ['conductance', '--sensitivity'],
                      ['interference'], ['interference', '--rules']):
        done = subprocess.run([program.path, *arguments, file], capture_output=True,
                              text=True, timeout=60)
        checks.that(done.returncode == 2 and not done.stdout
                    and len(done.stderr.splitlines()) == 1
                    and done.stderr.startswith('%s:%d:' % (file, line))
                    and 'wide band' in done.stderr,
                    'mho %s: %r' % (' '.join(arguments), done))
        try:
            program.run(*arguments, file, '--coupling', '0.5 eV', '--json')
        except Refused as refusal:
            checks.that(False, str(refusal))


if __name__ == '__main__':
    outside.run_groups(widths, eigenchannels, transmission_of_chains,
                       no_resonance_is_missed, thermal, twist_of_chains, round_trip,
                       bundled, drawn, refused)
