/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * F. A. Van-Catledge, J. Org. Chem. 45, 4801 (1980): h_X and k_XY from
 * overlap and ionisation data, checked against two agreeing transcriptions.
 * In the paper's notation a dot is a pi electron: N., O., S., P. bring one
 * (pyridine, carbonyl, thione), N:, O:, S:, P: two (pyrrole, furan ...).
 *
 * A. Streitwieser, Molecular Orbital Theory for Organic Chemists (1961), p.
 * 135, read second-hand; it gives k to carbon only, so that two heteroatoms
 * have the product of theirs (a rule of ours).
 */
#include <mho/parameters.h>

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

enum { ROWS = MHO_ROW_LIMIT, ROW_NAME_SIZE = 16 };

struct mho_parameter_set {
  char name[64], source[160];
  int count;
  char row[ROWS][ROW_NAME_SIZE];
  int electrons[ROWS];
  double h[ROWS];
  double k[ROWS][ROWS]; /* upper triangle; 0 where the product rule holds */
};

static const mho_parameter_set van_catledge = {
    .name = "van-catledge",
    .source = "F. A. Van-Catledge, J. Org. Chem. 45, 4801 (1980)",
    .count = 13,
    .row = {"C", "B", "N-pyridine", "N-pyrrole", "O-carbonyl", "O-furan", "F",
            "Si", "P-pyridine", "P-pyrrole", "S-thione", "S-thiophene", "Cl"},
    .electrons = {1, 0, 1, 2, 1, 2, 2, 1, 1, 2, 1, 2, 2},
    .h = {0, -0.45, 0.51, 1.37, 0.97, 2.09, 2.71, 0, 0.19, 0.75, 0.46, 1.11,
          1.48},
    .k = {
        {1.00, 0.73, 1.02, 0.89, 1.06, 0.66, 0.52, 0.75, 0.77, 0.76, 0.81, 0.69, 0.62},
        {0, 0.87, 0.66, 0.53, 0.60, 0.35, 0.26, 0.57, 0.53, 0.54, 0.51, 0.44, 0.41},
        {0, 0, 1.09, 0.99, 1.14, 0.80, 0.65, 0.72, 0.78, 0.81, 0.83, 0.78, 0.77},
        {0, 0, 0, 0.98, 1.13, 0.89, 0.77, 0.43, 0.55, 0.64, 0.68, 0.73, 0.80},
        {0, 0, 0, 0, 1.26, 1.02, 0.92, 0.65, 0.75, 0.82, 0.84, 0.85, 0.88},
        {0, 0, 0, 0, 0, 0.95, 0.94, 0.24, 0.31, 0.39, 0.43, 0.54, 0.70},
        {0, 0, 0, 0, 0, 0, 1.04, 0.17, 0.21, 0.22, 0.28, 0.32, 0.51},
        {0, 0, 0, 0, 0, 0, 0, 0.64, 0.62, 0.52, 0.61, 0.40, 0.34},
        {0, 0, 0, 0, 0, 0, 0, 0, 0.63, 0.58, 0.65, 0.48, 0.35},
        {0, 0, 0, 0, 0, 0, 0, 0, 0, 0.63, 0.65, 0.60, 0.55},
        {0, 0, 0, 0, 0, 0, 0, 0, 0, 0, 0.68, 0.58, 0.52},
        {0, 0, 0, 0, 0, 0, 0, 0, 0, 0, 0, 0.63, 0.59},
        {0, 0, 0, 0, 0, 0, 0, 0, 0, 0, 0, 0, 0.68},
    }};

static const mho_parameter_set streitwieser = {
    .name = "streitwieser",
    .source = "A. Streitwieser, Molecular Orbital Theory for Organic Chemists "
              "(1961), p. 135, second-hand",
    .count = 9,
    .row = {"C", "B", "N-pyridine", "N-pyrrole", "O-carbonyl", "O-furan", "F",
            "Cl", "Br"},
    .electrons = {1, 0, 1, 2, 1, 2, 2, 2, 2},
    .h = {0, -1.0, 0.5, 1.5, 1.0, 2.0, 3.0, 2.0, 1.5},
    .k = {{1.0, 0.7, 1.0, 0.8, 1.0, 0.8, 0.7, 0.4, 0.3}},
};

static const mho_parameter_set *const builtin[] = {&van_catledge, &streitwieser};
static const char *const builtin_name[] = {"van-catledge", "streitwieser"};

enum { BUILTIN_COUNT = sizeof builtin / sizeof *builtin };

const char *const *mho_parameters_names(size_t *count)
{
  *count = BUILTIN_COUNT;
  return builtin_name;
}

const mho_parameter_set *mho_parameters_builtin(const char *name)
{
  for (int i = 0; i < BUILTIN_COUNT; i++)
    if (!strcmp(builtin[i]->name, name)) return builtin[i];
  return NULL;
}

const char *mho_parameters_name(const mho_parameter_set *set)
{
  return set->name;
}

const char *mho_parameters_source(const mho_parameter_set *set)
{
  return set->source;
}

int mho_parameters_count(const mho_parameter_set *set) { return set->count; }

int mho_parameters_find(const mho_parameter_set *set, const char *name)
{
  for (int i = 0; i < set->count; i++)
    if (!strcmp(set->row[i], name)) return i;
  return -1;
}

const char *mho_parameters_row_name(const mho_parameter_set *set, int row)
{
  return row >= 0 && row < set->count ? set->row[row] : NULL;
}

double mho_parameters_h(const mho_parameter_set *set, int row)
{
  return set->h[row];
}

bool mho_parameters_k_is_product(const mho_parameter_set *set, int row,
                                 int other)
{
  return (row <= other ? set->k[row][other] : set->k[other][row]) == 0.0;
}

double mho_parameters_k(const mho_parameter_set *set, int row, int other)
{
  if (mho_parameters_k_is_product(set, row, other))
    return set->k[0][row] * set->k[0][other];
  return row <= other ? set->k[row][other] : set->k[other][row];
}

int mho_parameters_electrons(const mho_parameter_set *set, int row)
{
  return set->electrons[row];
}

mho_parameter_set *mho_parameters_copy(const mho_parameter_set *base,
                                       const char *name, const char *source)
{
  mho_parameter_set *set = malloc(sizeof *set);
  if (!set) return NULL;
  *set = *base;
  snprintf(set->name, sizeof set->name, "%s", name);
  snprintf(set->source, sizeof set->source, "%s", source);
  return set;
}

void mho_parameters_free(mho_parameter_set *set) { free(set); }

mho_status mho_parameters_put_row(mho_parameter_set *set, const char *name,
                                  double h, int electrons, double k_carbon,
                                  mho_error *error)
{
  int row = mho_parameters_find(set, name);
  size_t length = strlen(name);
  if (length == 0 || length >= ROW_NAME_SIZE)
    return mho_fail(error, MHO_ERR_RANGE, "model", "row",
                    "the row name '%.40s' is too long; 1 to %d characters are allowed",
                    name, ROW_NAME_SIZE - 1);
  if (row < 0 && set->count == ROWS)
    return mho_fail(error, MHO_ERR_LIMIT, "model", "row",
                    "more than %d rows in a parameter set", ROWS);
  if (!(fabs(h) <= 10.0) || !(k_carbon > 0.0 && k_carbon <= 10.0) || electrons < 0 ||
      electrons > 2)
    return mho_fail(error, MHO_ERR_RANGE, "model", name,
                    "row %s: h is -10 to 10, k to carbon above 0 to 10, electrons 0 to 2",
                    name);
  if (row < 0) {
    row = set->count++;
    memcpy(set->row[row], name, length + 1);
  }
  set->h[row] = h;
  set->electrons[row] = electrons;
  set->k[0][row] = k_carbon;
  return MHO_OK;
}

mho_status mho_parameters_put_k(mho_parameter_set *set, const char *first,
                                const char *second, double k, mho_error *error)
{
  int i = mho_parameters_find(set, first), j = mho_parameters_find(set, second);
  if (i < 0 || j < 0)
    return mho_fail(error, MHO_ERR_REFERENCE, "model", "k",
                    "k of %.20s and %.20s: the set %s has no row '%.20s'", first, second,
                    set->name, i < 0 ? first : second);
  if (!(k > 0.0 && k <= 10.0))
    return mho_fail(error, MHO_ERR_RANGE, "model", "k",
                    "k of %.20s and %.20s is above 0 to 10", first, second);
  set->k[i < j ? i : j][i < j ? j : i] = k;
  return MHO_OK;
}
