# SPDX-License-Identifier: GPL-3.0-or-later
"""What a user would write with NumPy: molecule file -> H -> T(E).

Independent of the program on purpose: PyYAML instead of its reader, a CSV of
the published table instead of its rows, dense least squares instead of its
solver.  `Program` runs $MHO, `Checks` counts.
"""
import csv
import json
import math
import os
import subprocess
import sys
import tempfile

os.environ.setdefault('OPENBLAS_NUM_THREADS', '1')
import numpy as np  # noqa: E402  (reads the number of threads)
import yaml  # noqa: E402

SOURCE = os.environ.get('MHO_SOURCE') or os.path.normpath(
    os.path.join(os.path.dirname(os.path.abspath(__file__)), '..', '..'))
DATA = os.path.join(SOURCE, 'tests', 'data')
BETA = -2.7  # eV, the program's stated default
COLUMN = {'C': 'C', 'B': 'B', 'N-pyridine': 'N1', 'N-pyrrole': 'N2',
          'O-carbonyl': 'O1', 'O-furan': 'O2', 'F': 'F', 'Si': 'Si',
          'P-pyridine': 'P1', 'P-pyrrole': 'P2', 'S-thione': 'S1',
          'S-thiophene': 'S2', 'Cl': 'Cl'}
TWO_ELECTRONS = {'N2', 'O2', 'P2', 'S2', 'F', 'Cl'}


class Checks:
    """Counts checks; prints a line for each that fails."""

    def __init__(self):
        self.count = self.failed = 0

    def that(self, holds, what):
        self.count += 1
        if not holds:
            self.failed += 1
            print('FAILED ' + what)

    def near(self, got, want, tolerance, what):
        got, want = np.atleast_1d(got), np.atleast_1d(want)
        good = (got.shape == want.shape
                and bool(np.all(np.abs(got - want) <= tolerance)))
        self.that(good, '%s: %s, expected %s +- %g'
                  % (what, got, want, np.max(tolerance)))

    def finish(self):
        print('%d checks, %d failed' % (self.count, self.failed))
        sys.exit(0 if self.count and not self.failed else 1)


class Refused(Exception):
    """The program did not answer."""


class Program:
    """The command line under test; JSON with all digits."""

    def __init__(self):
        self.path = os.environ['MHO']
        self.folder = tempfile.TemporaryDirectory()
        self.written = 0

    def run(self, *arguments):
        done = subprocess.run([self.path, *arguments], timeout=60,
                              stdout=subprocess.PIPE, stderr=subprocess.PIPE)
        if done.returncode:
            raise Refused('mho %s: exit %d: %s' % (
                ' '.join(arguments), done.returncode,
                done.stderr.decode('utf-8', 'replace').strip()))
        return json.loads(done.stdout)

    def check(self, file):
        return self.run('check', '--json', '--exact', file)['molecules'][0]

    def transmission(self, file, low, high, samples):
        """Rows of energy from E_F, T and log10 T (None where T is 0)."""
        table = self.run('transmission', file, '--energies',
                         '%r eV, %r eV' % (low, high), '--samples',
                         str(samples), '--json', '--exact')
        table = table['tables']['transmission']
        assert table['columns'] == ['molecule', 'energy_eV', 'transmission',
                                    'log10_transmission'], table['columns']
        return [row[1:] for row in table['rows']]

    def at(self, file, energy=0.0):
        """T at one energy: the first of two samples."""
        return self.transmission(file, energy, energy + 0.125, 2)[0][1]

    def conductance(self, file):
        """Thermal conductance at E_F in G0."""
        table = self.run('conductance', file, '--json', '--exact')
        table = table['tables']['conductance']
        return table['rows'][0][table['columns'].index('conductance_G0')]

    def write(self, molecule):
        """A molecule file in the scratch folder, from its mapping."""
        self.written += 1
        path = os.path.join(self.folder.name, '%d.yaml' % self.written)
        with open(path, 'w') as file:
            yaml.dump(json.loads(json.dumps(molecule)), file, sort_keys=False)
        return path


# ---- the model, once more --------------------------------------------------

def quantity(text):
    return float(text.split()[0])


def load(name):
    path = name if os.path.isabs(name) else os.path.join(DATA, name + '.yaml')
    with open(path) as file:
        return yaml.safe_load(file)


def table():
    """h[row], k[row, row] of tests/data/van-catledge.csv."""
    with open(os.path.join(DATA, 'van-catledge.csv')) as file:
        rows = [r for r in csv.reader(file) if not r[0].startswith('#')]
    names = rows[0][1:]
    h = dict(zip(names, map(float, rows[1][1:])))
    k = {}
    for row in rows[2:]:
        for name, value in zip(names, row[1:]):
            if value:
                k[row[0], name] = k[name, row[0]] = float(value)
    return h, k


def hamiltonian(molecule, h, k):
    """H in eV and the pi electrons of a molecule file in the explicit form."""
    beta = quantity(molecule['beta']) if 'beta' in molecule else BETA
    sites = molecule['sites']
    index = {s['id']: i for i, s in enumerate(sites)}
    row = [COLUMN.get(s.get('element')) for s in sites]
    matrix = np.zeros((len(sites), len(sites)))
    for i, s in enumerate(sites):
        matrix[i, i] = (quantity(s['onsite']) if 'onsite' in s
                        else h[row[i]] * beta)
    for b in molecule['bonds']:
        i, j = (index[x] for x in b['between'])
        hopping = (quantity(b['hopping']) if 'hopping' in b
                   else k[row[i], row[j]] * beta)
        if 'twist' in b:
            hopping *= math.cos(math.radians(quantity(b['twist'])))
        matrix[i, j] = matrix[j, i] = hopping
    electrons = molecule.get('electrons')
    if electrons is None:
        electrons = sum({'B': 0}.get(r, 2 if r in TWO_ELECTRONS else 1)
                        for r in row)
    return matrix, electrons


def hamiltonian_of_check(found):
    """H from what `check` printed; hopping_eV is that of the twisted bond."""
    index = {s['id']: i for i, s in enumerate(found['sites'])}
    matrix = np.diag([float(s['onsite_eV']) for s in found['sites']])
    for b in found['bonds']:
        i, j = (index[x] for x in b['between'])
        matrix[i, j] = matrix[j, i] = b['hopping_eV']
    return matrix


def transmission(matrix, left, right, gamma, energy):
    """T by minimal-norm least squares: the finite limit where a state that no
    contact sees lies at E.  left, right: site indices, gamma: their Gammas."""
    n = len(matrix)
    a = energy * np.eye(n) - matrix + 0j
    for sites, g in zip((left, right), gamma):
        for i in sites:
            a[i, i] += 0.5j * g
    columns = np.eye(n)[:, right]
    x = np.linalg.lstsq(a, columns, rcond=1e-13)[0]
    return gamma[0] * gamma[1] * np.sum(np.abs(x[left, :]) ** 2)


def density(matrix, electrons):
    """Bond orders off the diagonal, populations on it."""
    _, c = np.linalg.eigh(matrix)
    occupied = c[:, :electrons // 2]
    return 2 * occupied @ occupied.T


def run_groups(*groups):
    """Calls every group of checks, each of which may be refused, and ends the program."""
    checks, program = Checks(), Program()
    for group in groups:
        try:
            group(checks, program)
        except Refused as refusal:
            checks.that(False, '%s: %s' % (group.__name__, refusal))
    checks.finish()
