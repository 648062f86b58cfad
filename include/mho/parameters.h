/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Hueckel parameters of the elements: alpha_X = alpha + h_X beta and
 * beta_XY = k_XY beta, one row an element in one bonding situation.
 */
#ifndef MHOLECULE_PARAMETERS_H
#define MHOLECULE_PARAMETERS_H

#include <mho/status.h>

typedef struct mho_parameter_set mho_parameter_set;

/* Most rows of a set. */
enum { MHO_ROW_LIMIT = 40 };

MHO_BEGIN_DECLARATIONS

/* A built-in set by its name, or NULL.  `van-catledge` is the default:
 * F. A. Van-Catledge, J. Org. Chem. 45, 4801 (1980).  `streitwieser`:
 * A. Streitwieser, Molecular Orbital Theory for Organic Chemists (1961); it
 * has no rows for S, P and Si. */
MHO_API const mho_parameter_set *mho_parameters_builtin(const char *name);

/* Names of the built-in sets, *count of them. */
MHO_API const char *const *mho_parameters_names(size_t *count);

MHO_API const char *mho_parameters_name(const mho_parameter_set *set);
MHO_API const char *mho_parameters_source(const mho_parameter_set *set);

/* Number of rows; the row called `name` (`C`, `N-pyridine` ...), or -1; and
 * the name of a row, NULL outside the set. */
MHO_API int mho_parameters_count(const mho_parameter_set *set);
MHO_API int mho_parameters_find(const mho_parameter_set *set, const char *name);
MHO_API const char *mho_parameters_row_name(const mho_parameter_set *set,
                                            int row);

/* h of a row, k of a pair of rows (symmetric), and the pi electrons that an
 * atom of the row brings.  The rows must exist. */
MHO_API double mho_parameters_h(const mho_parameter_set *set, int row);
MHO_API double mho_parameters_k(const mho_parameter_set *set, int row,
                                int other);
MHO_API int mho_parameters_electrons(const mho_parameter_set *set, int row);

/* True where a set gives no k for the pair and k_XY = k_CX k_CY stands in. */
MHO_API bool mho_parameters_k_is_product(const mho_parameter_set *set, int row,
                                         int other);

/* A set of one's own: a copy of another one (NULL without memory) to which
 * rows and k are added, or in which they are replaced.  A molecule keeps a
 * pointer to its set, which must outlive it.  put_row and put_k:
 * MHO_ERR_RANGE, MHO_ERR_LIMIT, MHO_ERR_REFERENCE. */
MHO_API mho_parameter_set *mho_parameters_copy(const mho_parameter_set *base,
                                               const char *name,
                                               const char *source);
MHO_API void mho_parameters_free(mho_parameter_set *set);
MHO_API MHO_MUST_USE mho_status mho_parameters_put_row(
    mho_parameter_set *set, const char *name, double h, int electrons,
    double k_carbon, mho_error *error);
MHO_API MHO_MUST_USE mho_status mho_parameters_put_k(mho_parameter_set *set,
                                                     const char *first,
                                                     const char *second,
                                                     double k,
                                                     mho_error *error);

MHO_END_DECLARATIONS

#endif
