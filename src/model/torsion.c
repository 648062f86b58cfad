/* SPDX-License-Identifier: GPL-3.0-or-later */
#include <mho/quantity.h>
#include <mho/torsion.h>

#include <gsl/gsl_multifit.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "base/text.h"

#define BARRIER_MAX 1000.0
#define DEGREE 0.017453292519943295
#define MISFIT 0.05

enum { TABLE_MAX = 10000, TABLE_BYTES = 1 << 20 };

#define KCAL 4.184
#define PER_CM 0.01196266 /* kJ/mol a reciprocal centimetre */

/* What was read in the abstract or text of the source, unless it says memory.
 * cos-terms of a barrier V_n in V_n (1 - cos n angle)/2 are -V_n/2; a flat
 * minimum at 0, another one `syn` above it at 180 and a barrier between them at
 * 90 give v_1 = -syn/2, v_2 = -(barrier - syn/2)/2.  Left out for want of both
 * barriers: 2-phenylpyridine, 2-phenylthiophene, biphenyls with ortho
 * substituents. */
#define VINYL(v2, v4, v6) {[2] = -0.5 * (v2), [4] = -0.5 * (v4), [6] = -0.5 * (v6)}
#define SYN_ANTI(syn, barrier) {[1] = -0.5 * (syn), [2] = -0.5 * ((barrier) - 0.5 * (syn))}

static const mho_torsion_row rows[] = {
    {"biphenyl", "computed, Johansson and Olsen 2008, 8.0 and 8.3 kJ/mol, as quoted in "
                 "doi 10.1007/s00214-018-2383-0", {8.0, 8.3}, {0}},
    {"biphenyl-diffraction", "gas electron diffraction, Bastiansen and Samdal 1985, as quoted "
                             "there", {6.0, 6.5}, {0}},
    {"biphenyl-tsuzuki", "computed, Tsuzuki 1999, 2.28 and 2.13 kcal/mol, as quoted",
     {9.54, 8.91}, {0}},
    {"bipyridine-4-4", "computed, J. Chem. Phys. 123, 134309 (2005), 1.5 to 1.8 and 2.0 to 2.2 "
                       "kcal/mol: the middles", {1.65 * KCAL, 2.1 * KCAL}, {0}},
    {"bipyridine-2-2", "memory: 28 kJ/mol at 90 deg, cis 25 kJ/mol above trans", {0},
     SYN_ANTI(25.0, 28.0)},
    {"phenylpyrrole", "jet spectroscopy, J. Chem. Phys. 109, 7185 (1998), 457 and 748 cm-1",
     {457 * PER_CM, 748 * PER_CM}, {0}},
    {"bithiophene-2-2", "computed, Perkins, Cline and Tschumper, J. Phys. Chem. A 125 (2021), doi "
                        "10.1021/acs.jpca.1c04714: barrier 2, syn 0.4 kcal/mol", {0},
     SYN_ANTI(0.4 * KCAL, 2 * KCAL)},
    {"bifuran-2-2", "computed, the same: barrier 4, syn 2 kcal/mol", {0},
     SYN_ANTI(2 * KCAL, 4 * KCAL)},
    {"styrene", "jet spectroscopy, J. M. Hollas, Modern Spectroscopy, eq. 9.38: V2 1070, V4 -275, "
                "V6 7 cm-1", {0}, VINYL(1070 * PER_CM, -275 * PER_CM, 7 * PER_CM)},
    {"stilbene", "jet spectroscopy, J. Phys. Chem. A 106, 3479 (2002): 3100 cm-1 for both rings "
                 "at once, half of it each", {0}, VINYL(1550 * PER_CM, 0, 0)},
    {"tolane", "jet spectroscopy, S. J. Greaves et al., J. Phys. Chem. A 110, 2114 (2006): 220 to "
               "235 cm-1, between the two rings", {0.0, 2.72}, {0}},
};

enum { ROWS = sizeof rows / sizeof *rows };

const mho_torsion_row *mho_torsion_table(size_t *count)
{
  *count = ROWS;
  return rows;
}

mho_status mho_torsion_from_barriers(double planar, double perpendicular,
                                     mho_torsion *torsion, mho_error *error)
{
  *torsion = (mho_torsion){0};
  if (!(planar >= 0 && planar <= BARRIER_MAX && perpendicular >= 0 &&
        perpendicular <= BARRIER_MAX))
    return mho_fail(error, MHO_ERR_RANGE, "model", "torsion",
                    "torsion: a barrier is 0 to %g kJ/mol", BARRIER_MAX);
  torsion->term_kj_per_mol[2] = 0.5 * (planar - perpendicular);
  if (planar > 0 && perpendicular > 0)
    torsion->term_kj_per_mol[4] =
        (planar + perpendicular + 2 * sqrt(planar * perpendicular)) / 8;
  return MHO_OK;
}

double mho_torsion_energy(const mho_torsion *torsion, double angle_deg)
{
  double sum = 0;
  for (int n = 1; n <= MHO_TORSION_TERMS; n++)
    if (torsion->term_kj_per_mol[n] != 0)
      sum += torsion->term_kj_per_mol[n] * cos(n * angle_deg * DEGREE);
  return sum;
}

/* Least squares of cos(step k theta), k = 0 .. terms - 1. */
static mho_status fit(size_t count, const double *angle, const double *energy, int step,
                      size_t terms, mho_torsion *torsion, mho_error *error)
{
  gsl_matrix *design = gsl_matrix_alloc(count, terms), *covariance = gsl_matrix_alloc(terms, terms);
  gsl_vector *value = gsl_vector_alloc(count), *term = gsl_vector_alloc(terms);
  gsl_multifit_linear_workspace *work = gsl_multifit_linear_alloc(count, terms);
  mho_status status = MHO_OK;
  if (!design || !covariance || !value || !term || !work)
    status = mho_fail(error, MHO_ERR_MEMORY, "model", NULL, "out of memory");
  double chi = 0;
  for (size_t i = 0; status == MHO_OK && i < count; i++) {
    gsl_vector_set(value, i, energy[i]);
    for (size_t k = 0; k < terms; k++)
      gsl_matrix_set(design, i, k, cos(step * (double)k * angle[i] * DEGREE));
  }
  if (status == MHO_OK && gsl_multifit_linear(design, value, term, covariance, &chi, work) != 0)
    status = mho_fail(error, MHO_ERR_NOT_CONVERGED, "model", "torsion",
                      "torsion: no cosines fit the table");
  for (size_t k = 0; status == MHO_OK && k < terms; k++)
    torsion->term_kj_per_mol[step * (int)k] = gsl_vector_get(term, k);
  if (work) gsl_multifit_linear_free(work);
  if (term) gsl_vector_free(term);
  if (value) gsl_vector_free(value);
  if (covariance) gsl_matrix_free(covariance);
  if (design) gsl_matrix_free(design);
  return status;
}

mho_status mho_torsion_from_table(size_t count, const double *angle, const double *energy,
                                  mho_torsion *torsion, mho_error *error)
{
  *torsion = (mho_torsion){0};
  if (count < 4)
    return mho_fail(error, MHO_ERR_SIZE, "model", "torsion",
                    "torsion: the table has %zu points; at least 4 are needed", count);
  double low = energy[0], high = energy[0];
  for (size_t i = 0; i < count; i++) {
    if (!(angle[i] >= 0 && angle[i] <= 180) || (i && !(angle[i] > angle[i - 1])))
      return mho_fail(error, MHO_ERR_RANGE, "model", "torsion",
                      "torsion: angle %zu of the table is not allowed; they ascend within 0 to "
                      "180 deg", i + 1);
    if (!(fabs(energy[i]) <= 1e6))
      return mho_fail(error, MHO_ERR_RANGE, "model", "torsion",
                      "torsion: energy %zu of the table is not allowed; up to 1e6 kJ/mol is",
                      i + 1);
    low = fmin(low, energy[i]);
    high = fmax(high, energy[i]);
  }
  gsl_set_error_handler_off(); /* its default aborts the program */
  int step = angle[count - 1] > 90 ? 1 : 2;
  size_t most = (size_t)(MHO_TORSION_TERMS / step) + 1;
  size_t terms = count - 1 < most ? count - 1 : most;
  mho_status status = fit(count, angle, energy, step, terms, torsion, error);
  double miss = 0;
  for (size_t i = 0; i < count; i++)
    miss = fmax(miss, fabs(torsion->term_kj_per_mol[0] + mho_torsion_energy(torsion, angle[i]) -
                           energy[i]));
  if (status == MHO_OK && miss > MISFIT * (high - low) + 1e-9)
    status = mho_fail(error, MHO_ERR_RANGE, "model", "torsion",
                      "torsion: %zu cosines miss the table by %.3g kJ/mol; at most 5 %% of its "
                      "range is allowed", terms, miss);
  return status;
}

static mho_status refuse(const char *text, const char *reason, mho_error *error)
{
  return mho_fail(error, MHO_ERR_SYNTAX, "model", "torsion",
                  "torsion: '%.60s' is not understood (%.200s); write a name such as biphenyl, two "
                  "barriers '6 kJ/mol, 6.5 kJ/mol', terms 'v2 = 1 kJ/mol, v4 = 3 kJ/mol' or a CSV "
                  "file", text, reason);
}

static mho_status read_file(const char *path, mho_torsion *torsion, mho_error *error)
{
  static const char header[] = "angle_deg,energy_kJ_per_mol";
  char *text = NULL;
  size_t size = 0, count = 0;
  mho_status status = mho_read_file(path, TABLE_BYTES, "model", &text, &size, error);
  if (status != MHO_OK) return status;
  double *value = malloc(2 * TABLE_MAX * sizeof *value);
  if (!value) status = mho_fail(error, MHO_ERR_MEMORY, "model", NULL, "out of memory");
  const char *at = text + strcspn(text, "\r\n");
  long line = 1;
  if (status == MHO_OK && strncmp(text, header, sizeof header - 1))
    status = mho_fail_at(error, MHO_ERR_SYNTAX, "model", path, 1, 1, "torsion",
                         "the header is not understood; write %s", header);
  while (status == MHO_OK && *at) {
    line += *at == '\n';
    if (*at == '\n' || *at == '\r') {
      at++;
      continue;
    }
    const char *end, *last = at;
    double *pair = value + count;
    bool good = count < TABLE_MAX && mho_number_read(at, &end, pair) && *end == ',' &&
                mho_number_read(end + 1, &last, pair + TABLE_MAX) && strchr("\r\n", *last);
    if (!good)
      status = mho_fail_at(error, MHO_ERR_SYNTAX, "model", path, line, 1, "torsion",
                           "this is no line of the table; write an angle in degrees, a comma and "
                           "an energy in kJ/mol, at most %d lines", TABLE_MAX);
    at = last;
    count++;
  }
  if (status == MHO_OK)
    status = mho_torsion_from_table(count, value, value + TABLE_MAX, torsion, error);
  free(value);
  free(text);
  return status;
}

/* `v2 = -0.25 kJ/mol`: the number of the term, or 0. */
static int read_term(const char *part, const char **rest)
{
  int n = 0;
  while (*part == ' ') part++;
  if (*part++ != 'v') return 0;
  for (; *part >= '0' && *part <= '9' && n < 100; part++) n = 10 * n + (*part - '0');
  part += strspn(part, " ");
  if (*part != '=' || n < 1 || n > MHO_TORSION_TERMS) return 0;
  *rest = part + 1;
  return n;
}

static mho_status read_parts(const char *text, mho_torsion *torsion, mho_error *error)
{
  double barrier[2];
  int barriers = 0, terms = 0;
  for (const char *at = text; at; ) {
    char part[80], reason[320] = "";
    const char *comma = strchr(at, ','), *rest = part;
    size_t length = comma ? (size_t)(comma - at) : strlen(at);
    snprintf(part, sizeof part, "%.*s", (int)(length < 79 ? length : 79), at);
    double value;
    int n = read_term(part, &rest);
    if (mho_quantity_read(rest, MHO_MOLAR_ENERGY, &value, reason, sizeof reason) != MHO_OK)
      return refuse(text, reason, error);
    if (fabs(value) > BARRIER_MAX) return refuse(text, "energies go up to 1000 kJ/mol", error);
    if (n) torsion->term_kj_per_mol[n] = value;
    else if (barriers < 2) barrier[barriers] = value;
    terms += n > 0;
    barriers += n == 0;
    at = comma ? comma + 1 : NULL;
  }
  if (terms && !barriers) return MHO_OK;
  if (terms || barriers != 2) return refuse(text, "two barriers, or terms, are needed", error);
  return mho_torsion_from_barriers(barrier[0], barrier[1], torsion, error);
}

mho_status mho_torsion_read(const char *text, const char *beside, mho_torsion *torsion,
                            mho_error *error)
{
  *torsion = (mho_torsion){0};
  const char *name[ROWS];
  for (size_t i = 0; i < ROWS; i++) {
    name[i] = rows[i].name;
    if (strcmp(text, rows[i].name)) continue;
    if (rows[i].barrier_kj_per_mol[1] > 0)
      return mho_torsion_from_barriers(rows[i].barrier_kj_per_mol[0],
                                       rows[i].barrier_kj_per_mol[1], torsion, error);
    memcpy(torsion->term_kj_per_mol, rows[i].term_kj_per_mol, sizeof torsion->term_kj_per_mol);
    return MHO_OK;
  }
  size_t length = strlen(text);
  if (length > 4 && !strcmp(text + length - 4, ".csv")) {
    char *path = mho_path_beside(beside, text);
    if (!path) return mho_fail(error, MHO_ERR_MEMORY, "model", NULL, "out of memory");
    mho_status status = read_file(path, torsion, error);
    free(path);
    return status;
  }
  bool word = (*text | 32) >= 'a' && (*text | 32) <= 'z' && !strpbrk(text, "=, ");
  if (!word) return read_parts(text, torsion, error);
  char list[320];
  const char *nearest = mho_nearest_word(text, name, ROWS);
  if (nearest)
    return mho_fail(error, MHO_ERR_REFERENCE, "model", "torsion",
                    "torsion: '%.60s' is not known; did you mean '%s'?", text, nearest);
  return mho_fail(error, MHO_ERR_REFERENCE, "model", "torsion",
                  "torsion: '%.60s' is not known; allowed are %s, two barriers '6 kJ/mol, 6.5 "
                  "kJ/mol', terms 'v2 = 1 kJ/mol, v4 = 3 kJ/mol' or a CSV file", text,
                  mho_join_words(name, ROWS, list, sizeof list));
}
