/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "screen/errors.h"

#include <math.h>

#define RADIANS_PER_DEGREE 0.017453292519943295769

/* d log10 G / d ln t of a bond before its twist: by k, or by the angle where
 * cos(theta) is small. */
static double per_log_hopping(const mho_molecule *m, const mho_sensitivity_row *row)
{
  const mho_bond *bond = &m->bond[row->index];
  double angle = bond->twist_deg * RADIANS_PER_DEGREE;
  if (row->kind == MHO_PARAMETER_TWIST)
    return -row->derivative_log10_g0 / (sin(angle) * RADIANS_PER_DEGREE);
  double value = bond->explicit_hopping
                     ? bond->hopping_ev
                     : mho_parameters_k(m->parameters, m->site[bond->site[0]].row,
                                        m->site[bond->site[1]].row);
  return row->derivative_log10_g0 * value / cos(angle);
}

/* Square of the change where that bond turns by sigma; 0 for other rows. */
static double turn_square(const mho_molecule *m, const mho_sensitivity_row *row, double sigma_deg)
{
  bool of_bond = row->kind == MHO_PARAMETER_TWIST || row->kind == MHO_PARAMETER_K ||
                 row->kind == MHO_PARAMETER_HOPPING;
  if (!of_bond) return 0;
  const mho_bond *bond = &m->bond[row->index];
  double cosine = mho_cos_deg(bond->twist_deg);
  bool by_angle = fabs(cosine) < 0.5;
  if ((!bond->rotatable && bond->twist_deg == 0) || by_angle != (row->kind == MHO_PARAMETER_TWIST))
    return 0;
  double up = fabs(mho_cos_deg(bond->twist_deg + sigma_deg) - cosine);
  double down = fabs(mho_cos_deg(bond->twist_deg - sigma_deg) - cosine);
  double change = per_log_hopping(m, row) * fmax(up, down);
  return change * change;
}

static int row_of(const mho_molecule *m, int site)
{
  int row = m->site[site].explicit_onsite ? -1 : m->site[site].row;
  return row < MHO_SHARED_ROWS ? row : -1;
}

/* Place in the shared vector of a bond's k: between carbon and another row. */
static int shared_bond(const mho_molecule *m, int bond)
{
  int carbon = mho_parameters_find(m->parameters, "C");
  int first = row_of(m, m->bond[bond].site[0]), second = row_of(m, m->bond[bond].site[1]);
  if (first == second || (first != carbon && second != carbon)) return -1;
  int other = first == carbon ? second : first;
  return other >= 0 ? MHO_SHARED_K + other : -1;
}

static void share(const mho_molecule *m, const mho_sensitivity_row *row,
                  mho_screen_quantities *out)
{
  int carbon = mho_parameters_find(m->parameters, "C"), at = -1;
  float value = (float)row->derivative_log10_g0;
  switch (row->kind) {
  case MHO_PARAMETER_FERMI: at = MHO_SHARED_FERMI; break;
  case MHO_PARAMETER_BETA: at = MHO_SHARED_BETA; break;
  case MHO_PARAMETER_COUPLING:
    at = MHO_SHARED_COUPLING + (row->index == MHO_RIGHT ? out->right_linker : out->left_linker);
    break;
  case MHO_PARAMETER_H: {
    int of = row_of(m, row->index);
    if (of >= 0 && of != carbon) at = MHO_SHARED_H + of;
    break;
  }
  case MHO_PARAMETER_K: at = shared_bond(m, row->index); break;
  default: break;
  }
  if (at >= 0) out->shared[at] += value;
}

void mho_screen_set_errors(const mho_molecule *molecule, const mho_sensitivity *sensitivity,
                           double twist_sigma_deg, mho_screen_quantities *out)
{
  double square = 0;
  for (size_t p = 0; p < sensitivity->count; p++) {
    share(molecule, &sensitivity->row[p], out);
    square += turn_square(molecule, &sensitivity->row[p], twist_sigma_deg);
  }
  if (sensitivity->has_derivatives) {
    mho_screen_set_value(out, MHO_SCREEN_linear_decades, sensitivity->linear_decades);
    mho_screen_set_value(out, MHO_SCREEN_twist_decades, sqrt(square));
  }
  mho_screen_set_value(out, MHO_SCREEN_error_rule, sensitivity->rule);
  if (!sensitivity->has_error) return;
  mho_screen_set_value(out, MHO_SCREEN_error_decades, sensitivity->error_decades);
  if (!(out->has >> MHO_SCREEN_log10_g0 & 1)) return;
  mho_screen_set_value(out, MHO_SCREEN_low_log10_g0, out->log10_g0 - sensitivity->error_decades);
  mho_screen_set_value(out, MHO_SCREEN_high_log10_g0, out->log10_g0 + sensitivity->error_decades);
}
