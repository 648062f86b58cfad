#!/usr/bin/python3
# SPDX-License-Identifier: GPL-3.0-or-later
"""The program against NumPy and against published and textbook numbers.

    MHO=build/mho /usr/bin/python3 tests/physics/numpy_check.py

Needs python3-numpy and python3-yaml.  One line a failed check, a count, and
exit status 0 only if every check held.
"""
import copy
import glob
import math
import os

import numpy as np

import outside
from outside import load

# Energies are x in E = alpha + x beta, total pi energy in beta.  Chains and
# rings by the standard closed forms 2cos(k pi/(N+1)), 2cos(2 pi k/N); the
# others computed outside this project by exact arithmetic.
LEVELS = {
    'butadiene': ('1.6180 0.6180 -0.6180 -1.6180', 4.4721),
    'hexatriene': ('1.8019 1.2470 0.4450 -0.4450 -1.2470 -1.8019', 6.9879),
    'benzene': ('2 1 1 -1 -1 -2', 8),
    'naphthalene': ('2.3028 1.6180 1.3028 1 0.6180 '
                    '-0.6180 -1 -1.3028 -1.6180 -2.3028', 13.6832),
    'anthracene': ('2.4142 2 1.4142 1.4142 1 1 0.4142 '
                   '-0.4142 -1 -1 -1.4142 -1.4142 -2 -2.4142', 19.3137),
    'azulene': ('2.3103 1.6516 1.3557 0.8870 0.4773 '
                '-0.4004 -0.7376 -1.5792 -1.8692 -2.0953', 13.3635),
    'fulvene': ('2.1149 1 0.6180 -0.2541 -1.6180 -1.8608', 7.4659),
    'styrene': ('2.1358 1.4142 1 0.6622 -0.6622 -1 -1.4142 -2.1358', 10.4243),
    'biphenyl': ('2.2784 1.8912 1.3174 1 1 0.7046 '
                 '-0.7046 -1 -1 -1.3174 -1.8912 -2.2784', 16.3834),
    # h 0.5, k 1.0: Streitwieser, Molecular Orbital Theory (1961)
    'pyridine': ('2.1074 1.1672 1 -0.8410 -1 -1.9337', None),
    # F. A. Van-Catledge, J. Org. Chem. 45, 4801 (1980)
    'furan': ('2.5480 1.3826 0.6180 -0.8406 -1.6180', None),
    'thiophene': ('2.0222 1.0547 0.6180 -0.9669 -1.6180', None),
    'formaldehyde': ('1.6507 -0.6807', None),
}

# Coulson bond orders (two sites) and pi populations (one site), computed
# outside this project.
DENSITY = {
    'butadiene': {'c1 c2': 0.8944, 'c2 c3': 0.4472},
    'benzene': {'c1 c2': 0.6667},
    'naphthalene': {'c1 c2': 0.7246, 'c2 c3': 0.6032, 'c1 c8a': 0.5547,
                    'c4a c8a': 0.5182},
    'fulvene': {'c5 c6': 0.7586, 'c6': 0.6223},
    'biphenyl': {'c1 d1': 0.3697},
    'azulene': {'c1': 1.1729, 'c3': 1.1729, 'c2': 1.0466, 'c4': 0.8549,
                'c8': 0.8549, 'c6': 0.8700},
}

# Kekule count K and magic numbers M = K |beta g|; conductances go as M^2:
# Geng et al., J. Am. Chem. Soc. 2015.
MAGIC = {
    'benzene': (2, {'c1 c2': 1, 'c1 c3': 0, 'c1 c4': 1}),
    'naphthalene': (3, {'c1 c2': 2, 'c1 c4': 2, 'c2 c3': 1, 'c1 c5': 1,
                        'c1 c7': 1, 'c2 c6': 1, 'c1 c3': 0, 'c1 c6': 0,
                        'c1 c8': 0, 'c2 c7': 0}),
    'anthracene': (4, {'c9 c10': 4, 'c1 c2': 3, 'c1 c4': 3, 'c1 c10': 2,
                       'c2 c9': 2, 'c2 c3': 1, 'c1 c5': 1, 'c1 c7': 1,
                       'c2 c6': 1}),
}


# ---- the bundled molecules against NumPy -----------------------------------

def bundled(checks, program):
    parameters = outside.table()
    files = sorted(glob.glob(os.path.join(outside.SOURCE, 'molecules',
                                          '*.yaml')))
    drawn = 0
    for file in files:
        molecule = load(file)
        if any('chain' in side for side in molecule.get('electrodes', {}).values()):
            continue  # inside_check.py
        found = program.check(file)
        label = os.path.basename(file)
        matrices = [outside.hamiltonian_of_check(found)]
        # A second H comes from files that list their sites; what a SMILES
        # should give is judged in tests/structures.
        if 'smiles' in molecule:
            drawn += 1
        else:
            matrix, electrons = outside.hamiltonian(molecule, *parameters)
            compare_reading(checks, label, found, molecule, electrons)
            checks.near(matrices[0], matrix, 1e-13 * np.abs(matrix).max(),
                        label + ': H')
            matrices.append(matrix)
        compare_levels(checks, label, found, matrices[-1],
                       molecule.get('fermi', '0 eV'))
        compare_transmission(checks, program, file, matrices, found)
    checks.that(drawn and len(files) - drawn >= 20,
                'at least 20 bundled molecules by sites, some by SMILES')


def compare_reading(checks, label, found, molecule, electrons):
    checks.that([(s['id'], s['element']) for s in found['sites']]
                == [(s['id'], s['element']) for s in molecule['sites']],
                label + ': sites')
    checks.that([(b['between'], b['twist_deg']) for b in found['bonds']]
                == [(b['between'], outside.quantity(b.get('twist', '0 deg')))
                    for b in molecule['bonds']], label + ': bonds')
    checks.that(found['electrons'] == electrons
                == sum(s['electrons'] for s in found['sites']),
                label + ': electrons')
    for name, side in molecule['electrodes'].items():
        contact = found['contacts'][name]
        checks.that(contact['sites'] == side['sites'] and contact['coupling_eV']
                    == outside.quantity(side['coupling']),
                    '%s: %s contact' % (label, name))


def compare_levels(checks, label, found, matrix, fermi):
    levels = np.linalg.eigvalsh(matrix)
    homo, lumo = levels[found['electrons'] // 2 - 1:][:2]
    tolerance = 1e-12 * np.abs(matrix).max()
    checks.near(found['levels_eV'], levels, tolerance, label + ': levels')
    checks.near(found['homo_eV'], homo, tolerance, label + ': HOMO')
    checks.near(found['lumo_eV'], lumo, tolerance, label + ': LUMO')
    checks.near(found['fermi_eV'],
                (homo + lumo) / 2 if fermi == 'midgap'
                else outside.quantity(fermi), tolerance, label + ': E_F')


def compare_transmission(checks, program, file, matrices, found):
    """Amplitudes agree to 5e-10, T so to 1e-9; or to NumPy's own error, which
    rules near a node."""
    label = os.path.basename(file)
    ids = [s['id'] for s in found['sites']]
    sides = [found['contacts'][s] for s in ('left', 'right')]
    left, right = [[ids.index(x) for x in s['sites']] for s in sides]
    gamma = [s['coupling_eV'] for s in sides]
    rows = program.transmission(file, -3.0, 3.0, 61)
    checks.near([r[0] for r in rows], np.linspace(-3, 3, 61), 1e-12,
                label + ': grid of energies')
    floor = 1e-13 * math.sqrt(gamma[0] * gamma[1])
    for energy, t, log in rows:
        what = '%s at %g eV: ' % (label, energy)
        checks.that(log is None if t == 0
                    else log is not None and abs(log - math.log10(t)) < 1e-12,
                    what + 'log10 T')
        for matrix in matrices:
            want = math.sqrt(outside.transmission(
                matrix, left, right, gamma, found['fermi_eV'] + energy))
            checks.near(math.sqrt(t), want, 5e-10 * want + floor,
                        what + 'sqrt(T)')


# ---- Hueckel tables --------------------------------------------------------

def hueckel(checks, program):
    for name, (x, total) in LEVELS.items():
        found = program.check(os.path.join(outside.DATA, name + '.yaml'))
        want = [float(v) for v in x.split()]
        got = -np.array(found['levels_eV'])  # beta = -1 eV
        checks.near(got, want, 5.1e-5, name + ': x of the levels')
        if total is not None:
            half = found['electrons'] // 2
            checks.near(2 * got[:half].sum(), total, 5.1e-5,
                        name + ': total pi energy')
        ids = [s['id'] for s in found['sites']]
        p = outside.density(outside.hamiltonian_of_check(found),
                            found['electrons'])
        for sites, value in DENSITY.get(name, {}).items():
            i, j = [ids.index(s) for s in (sites.split() * 2)[:2]]
            checks.near(p[i, j], value, 5.1e-5, '%s: p of %s' % (name, sites))


# ---- transport -------------------------------------------------------------

def contacted(molecule, left, right, gamma, **keys):
    """A copy of a molecule with the contacts put on; gamma in eV."""
    result = dict(copy.deepcopy(molecule), **keys)
    if not isinstance(gamma, tuple):
        gamma = (gamma, gamma)
    result['electrodes'] = {
        side: {'sites': sites.split(), 'coupling': '%r eV' % g}
        for side, sites, g in zip(('left', 'right'), (left, right), gamma)}
    return result


def chain(hoppings):
    """Carbon chain with the hoppings given, in eV; beta = -1 eV."""
    return {'name': 'chain', 'beta': '-1 eV',
            'sites': [{'id': 'c%d' % i, 'element': 'C'}
                      for i in range(len(hoppings) + 1)],
            'bonds': [{'between': ['c%d' % i, 'c%d' % (i + 1)],
                       'hopping': '%r eV' % t}
                      for i, t in enumerate(hoppings)]}


def ends(molecule, gamma):
    sites = molecule['sites']
    return contacted(molecule, sites[0]['id'], sites[-1]['id'], gamma)


def rings_at_midgap(checks, program):
    """T = 4y^2/(1+y^2)^2, y = Gamma |g|/2, g = 1/H; values derived by hand."""
    def expect(name, left, right, gamma, energy, value):
        file = program.write(contacted(load(name), left, right, gamma))
        checks.near(program.at(file, energy), value, 5.1e-9 if value else 1e-28,
                    '%s %s,%s at Gamma %g and %g |beta|'
                    % (name, left, right, gamma, energy))
    for gamma, value in ((0.1, 0.00249688), (0.5, 0.06059172),
                         (1.0, 0.22145329), (2.0, 0.64)):
        expect('benzene', 'c1', 'c4', gamma, 0.0, value)
        expect('benzene', 'c1', 'c2', gamma, 0.0, value)
        expect('benzene', 'c1', 'c3', gamma, 0.0, 0)
    expect('benzene', 'c1', 'c4', 0.5, 0.2, 0.06666858)
    expect('benzene', 'c1', 'c3', 0.5, 0.2, 0.00068961)
    expect('benzene', 'c1', 'c2', 0.5, 0.2, 0.06411444)
    for pairs, value in (('c1 c4', 0.01762080), ('c2 c6 c1 c5', 0.00443458),
                         ('c2 c7 c1 c8 c1 c3', 0)):
        sites = pairs.split()
        for left, right in zip(sites[::2], sites[1::2]):
            expect('naphthalene', left, right, 0.2, 0.0, value)


def magic_numbers(checks, program):
    """Gamma -> 0: T = (Gamma M / K beta)^2, so conductances go as M^2."""
    for name, (structures, pairs) in MAGIC.items():
        for pair, m in pairs.items():
            left, right = pair.split()
            file = program.write(contacted(load(name), left, right, 1e-4))
            checks.near(math.sqrt(program.at(file)) / 1e-4 * structures, m,
                        1e-6, '%s %s: magic number' % (name, pair))


def chains(checks, program):
    """End contacts, E = 0: N even by hand from g = 1/beta, N odd exactly 1."""
    for sites in range(2, 9):
        for gamma, even in ((0.2, 0.03921184), (1.0, 0.64), (2.0, 1.0)):
            file = program.write(ends(chain([-1.0] * (sites - 1)), gamma))
            checks.near(program.at(file), 1 if sites % 2 else even,
                        1e-12 if sites % 2 else 5.1e-9,
                        'chain of %d, Gamma %g' % (sites, gamma))
    # Alternating, double bonds at both ends, 0.8 : 1; the decay tends to
    # 2 ln(1/0.8) per repeat.  Derived: g = (0.8)^(n-1)/beta.
    for n, value in enumerate((9.9501869e-3, 6.379569e-3, 4.0876243e-3,
                               2.6180074e-3), 1):
        file = program.write(ends(chain(([-1.0, -0.8] * n)[:-1]), 0.1))
        checks.near(program.at(file), value, 5.1e-8 * value,
                    'alternating polyene, n = %d' % n)


def twisted_biphenyl(checks, program):
    """g = cos(theta)/4 beta: the twist law, and where it stops."""
    flat = contacted(load('biphenyl'), 'c4', 'd4', 0.2)
    bond = next(b for b in flat['bonds'] if b['between'] == ['c1', 'd1'])
    t = {}
    for angle, value in ((0, 0.00249688), (30, 0.00187324), (60, 0.00062480),
                         (90, 0)):
        bond['twist'] = '%d deg' % angle
        file = program.write(flat)
        t[angle] = program.at(file, 0.3)
        checks.near(program.at(file), value, 5.1e-9 if angle < 90 else 0,
                    'biphenyl at %d deg' % angle)
    checks.near(t[60] / t[0], 0.228, 5.1e-4,
                'biphenyl, T(60 deg)/T(0) at 0.3 |beta|')


def azulene_nodes(checks, program):
    """Contacts 5,7 have two nodes in the gap, x = 0 and -0.375, contacts 4,7
    and 2,6 none; computed outside this project."""
    def gap(pair):
        file = program.write(contacted(load('azulene'), *pair, 0.5))
        rows = program.transmission(file, -0.45, 0.4, 171)
        return np.array([r[:2] for r in rows]).T
    energy, t = gap(('c5', 'c7'))
    nodes = [k for k in range(1, 170) if t[k - 1] > t[k] < t[k + 1]]
    checks.near(energy[nodes], [0, 0.375], 1e-9, 'azulene 5,7: nodes')
    checks.near(t[nodes], [0, 0], [1e-28, 1e-6], 'azulene 5,7: T at nodes')
    for pair in (('c2', 'c6'), ('c4', 'c7')):
        checks.that(gap(pair)[1].min() > 0.01, 'azulene %s,%s: no node' % pair)


def carboxylates(checks, program):
    """Two equal oxygens a contact: off resonance the channels add as amplitudes,
    4 : 1 in T for two contacts; opposite amplitudes cancel by symmetry."""
    t = {}
    for name, keys in (('independent', {'channels': 'independent'}),
                       ('one', {'channels': 'one', 'amplitude': [1, 1]}),
                       ('opposite', {'channels': 'one', 'amplitude': [1, -1]})):
        molecule = contacted(load('terephthalate'), 'o1 o2', 'o3 o4', 1e-5)
        molecule['electrodes']['left'].update(keys)
        if name != 'opposite':
            molecule['electrodes']['right'].update(keys)
        t[name] = program.at(program.write(molecule))
    checks.near(t['one'] / t['independent'], 4, 1e-6,
                'terephthalate: coherent against independent')
    checks.near(t['opposite'], 0, 1e-28 * 1e-10, 'terephthalate: opposite')


def single_level(checks, program):
    """Breit-Wigner form by hand, its thermal average by trigamma outside this
    project; both contacts on one site."""
    level = {'name': 'level', 'electrons': 2, 'bonds': [],
             'sites': [{'id': 'a', 'onsite': '-0.5 eV'}]}
    file = program.write(contacted(level, 'a', 'a', (0.02, 0.05)))
    checks.near(program.at(file), 0.0039804956, 5.1e-11, 'level at 0.5 eV')
    checks.near(program.at(file, -0.5), 0.81632653, 5.1e-9, 'level at 0')
    checks.near(program.conductance(file), 0.0040915293, 5.1e-11,
                'level at 0.5 eV, 300 K')
    file = program.write(dict(load(file), fermi='-0.5 eV'))
    checks.near(program.conductance(file), 0.48151537, 5.1e-9,
                'level at 0, 300 K')


def oligophenyls(checks, program):
    """The default couplings, twist and E_F; computed outside this project."""
    for file, value in (('benzene-1-4', 6.9e-3), ('biphenyl-4-4', 1.04e-3),
                        ('terphenyl-4-4', 1.75e-4)):
        path = os.path.join(outside.SOURCE, 'molecules', file + '-diamine.yaml')
        checks.near(program.at(path), value, 0.01 * value, file + '-diamine')


if __name__ == '__main__':
    outside.run_groups(bundled, hueckel, rings_at_midgap, magic_numbers, chains,
                       twisted_biphenyl, azulene_nodes, carboxylates, single_level,
                       oligophenyls)
