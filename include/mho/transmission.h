/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Transmission of a junction,
 *   T(E) = Tr[Gamma_L G Gamma_R G^dagger],
 *   G(E) = (E - H - Sigma_L - Sigma_R)^-1,
 * for the doubles H, Gamma and E that the program holds.
 */
#ifndef MHOLECULE_TRANSMISSION_H
#define MHOLECULE_TRANSMISSION_H

#include <mho/junction.h>
#include <mho/status.h>

typedef struct mho_plan mho_plan;

/* H_ij = H_ji of a Hamiltonian given by its non-zero entries. */
typedef struct {
  int i, j;
  double value_ev;
} mho_entry;

/* How a value was found; later methods are slower and more exact. */
typedef enum {
  MHO_METHOD_NO_PATH,  /* no hopping joins the contacts: T = 0 */
  MHO_METHOD_NO_BAND,  /* outside the band of a chain as electrode: T = 0 */
  MHO_METHOD_SPECTRUM, /* sums over the levels of the bare molecule */
  MHO_METHOD_SPARSE,   /* compiled sparse elimination in double-double */
  MHO_METHOD_REPEAT, /* doubling of a run of equal units, in 113 bits */
  MHO_METHOD_ELIMINATION, /* pivoted Gaussian elimination in double precision */
  MHO_METHOD_REFINED, /* its solution refined in 113 bits */
  MHO_METHOD_EXTENDED, /* elimination in 113 bits */
  MHO_METHOD_COUNT
} mho_method;

typedef struct {
  double transmission;       /* 0 <= T <= channels; may underflow to 0 */
  double log10_transmission; /* also where T underflows; 0 if node */
  double relative_error;     /* bound on the error of T; 0 if node */
  bool node;                 /* T is zero as far as 113 bits can tell */
  bool unresolved;           /* relative_error exceeds 1e-10 all the same */
  mho_method method;
} mho_point;

/* Where the junction has its resonances: eigenvalues of H + Sigma. */
typedef struct {
  double energy_ev; /* real part */
  double width_ev;  /* full width at half maximum, -2 Im */
  double left_width_ev, right_width_ev; /* what each contact contributes */
} mho_pole;

MHO_BEGIN_DECLARATIONS

/* What a plan can do for its junction and why, one line without an end, cut to
 * the buffer's size; returns buffer. */
MHO_API const char *mho_plan_describe(const mho_plan *plan, char *buffer,
                                      size_t size);

/* A few words for a method, as --verbose prints them; never NULL. */
MHO_API const char *mho_method_name(mho_method method);

/* Prepares a junction for many energies.  The junction may be cleared
 * afterwards (a chain electrode is copied).  The plan is not changed by its use:
 * many threads may share it.
 * Errors: MHO_ERR_CONTACTS, MHO_ERR_MEMORY, MHO_ERR_LINEAR_ALGEBRA. */
MHO_API MHO_MUST_USE mho_status mho_plan_create(const mho_junction *junction,
                                                mho_plan **plan,
                                                mho_error *error);

/* The same from the non-zero entries of H alone, without its orbitals: the quicker
 * way to T(E) of small molecules, and the only one to long ones, with memory
 * O(sites) for a chain.  entry[entries] has i <= j, entries of one pair add up;
 * leads as in a junction (all copied).
 * Errors: MHO_ERR_SIZE (a site), MHO_ERR_NOT_FINITE, MHO_ERR_CONTACTS,
 * MHO_ERR_MEMORY. */
MHO_API MHO_MUST_USE mho_status mho_plan_create_sparse(
    int sites, const mho_entry *entry, size_t entries, const mho_lead *left,
    const mho_lead *right, mho_plan **plan, mho_error *error);
MHO_API void mho_plan_free(mho_plan *plan);

/* T at energy_ev[count] (relative to alpha) into point[count].
 *
 * Methods are tried in turn, each with a bound on its own error; the first that
 * keeps max(1e-12, 64 u kappa) <= 1e-10 is taken, where kappa is the relative
 * condition of T.  A plan keeps the workspace of a sweep for the next, so that
 * only the first allocates (and those that run at the same time).  No result
 * depends on the other energies of the call.  States that no contact sees do not
 * matter: where E - H is singular through them alone, the finite limit is returned.
 * Errors: MHO_ERR_NOT_FINITE (an energy is not finite), MHO_ERR_MEMORY. */
MHO_API MHO_MUST_USE mho_status mho_transmission_sweep(const mho_plan *plan,
                                                       size_t count,
                                                       const double *energy_ev,
                                                       mho_point *point,
                                                       mho_error *error);

/* All poles, by ascending energy; pole[] has room for one a site.
 * Errors: MHO_ERR_LIMIT (too many sites), MHO_ERR_RANGE (a chain as electrode:
 * its Sigma depends on E, and so would the poles), MHO_ERR_MEMORY,
 * MHO_ERR_LINEAR_ALGEBRA. */
MHO_API MHO_MUST_USE mho_status mho_poles(const mho_plan *plan, mho_pole *pole,
                                          mho_error *error);
MHO_API int mho_plan_sites(const mho_plan *plan);

/* Most that T can be: the smaller number of channels of the two contacts. */
MHO_API int mho_plan_channels(const mho_plan *plan);

/* Energies for a plot from low to high: an even grid of `even` points, around
 * every pole points as dense as its width asks for, and every node.  The caller frees
 * *energy_ev.  Errors: MHO_ERR_RANGE, MHO_ERR_MEMORY, MHO_ERR_LINEAR_ALGEBRA. */
MHO_API MHO_MUST_USE mho_status mho_energy_grid(const mho_plan *plan,
                                                double low_ev, double high_ev,
                                                int even, double **energy_ev,
                                                size_t *count,
                                                mho_error *error);

MHO_END_DECLARATIONS

#endif
