/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Torsional potentials, V(theta) = sum_n v_n cos(n theta), up to a constant.
 */
#ifndef MHOLECULE_TORSION_H
#define MHOLECULE_TORSION_H

#include <mho/status.h>

enum { MHO_TORSION_TERMS = 12 };

typedef struct {
  double term_kj_per_mol[MHO_TORSION_TERMS + 1]; /* v_n; v_0 does not matter */
} mho_torsion;

/* A potential of the literature, by the name of its bond. */
typedef struct {
  const char *name, *source;
  double barrier_kj_per_mol[2]; /* at 0 and 90 degrees, or */
  double term_kj_per_mol[MHO_TORSION_TERMS + 1]; /* both barriers are 0: the v_n */
} mho_torsion_row;

MHO_BEGIN_DECLARATIONS

/* The potential of two barriers, at 0 and at 90 degrees above the minimum
 * between them: v_2 = (B0 - B90)/2, v_4 = (B0 + B90 + 2 sqrt(B0 B90))/8, with
 * its minimum at cos 2theta = -v_2/4v_4.  A barrier of 0 makes it v_2 alone,
 * with the minimum there.  Errors: MHO_ERR_RANGE (negative, above 1000). */
MHO_API MHO_MUST_USE mho_status mho_torsion_from_barriers(
    double planar_kj_per_mol, double perpendicular_kj_per_mol,
    mho_torsion *torsion, mho_error *error);

/* Least squares of cosines through a table, even terms only where no angle is
 * beyond 90 degrees.  Angles in degrees, ascending, within 0 to 180.
 * Errors: MHO_ERR_SIZE (fewer than 4 points), MHO_ERR_RANGE (an angle, an
 * energy, or cosines that miss the table by more than 5 % of its range),
 * MHO_ERR_MEMORY. */
MHO_API MHO_MUST_USE mho_status mho_torsion_from_table(
    size_t count, const double *angle_deg, const double *energy_kj_per_mol,
    mho_torsion *torsion, mho_error *error);

/* Reads what a user writes: a name of the table below, two barriers
 * `6.0 kJ/mol, 6.5 kJ/mol`, terms `v2 = -0.25 kJ/mol, v4 = 3.1 kJ/mol`, or the
 * path of a CSV with the columns angle_deg,energy_kJ_per_mol, as seen from the
 * folder of the file `beside` (NULL: from here).
 * Errors: any that mho_status_is_input tells, MHO_ERR_MEMORY. */
MHO_API MHO_MUST_USE mho_status mho_torsion_read(const char *text,
                                                 const char *beside,
                                                 mho_torsion *torsion,
                                                 mho_error *error);

/* Potentials of the literature. */
MHO_API const mho_torsion_row *mho_torsion_table(size_t *count);

/* V in kJ/mol at an angle. */
MHO_API double mho_torsion_energy(const mho_torsion *torsion, double angle_deg);

MHO_END_DECLARATIONS

#endif
