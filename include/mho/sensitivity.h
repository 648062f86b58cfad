/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Which parameters decide the conductance of a molecule, and how uncertain it
 * is with the uncertainties that such parameters have.
 *
 * The linear rule is Var(log10 G) = sum_p (dlog10G/dp sigma_p)^2 over
 * independent parameters, with derivatives of the thermal conductance.  It
 * fails near a node and next to a resonance: the first 48 samples of a Monte
 * Carlo tell, and if the rule leaves over more than 0.4 of its sigma in them
 * (root mean square) all are drawn.
 */
#ifndef MHOLECULE_SENSITIVITY_H
#define MHOLECULE_SENSITIVITY_H

#include <stdint.h>

#include <mho/gradient.h>
#include <mho/junction.h>

/* Standard deviations, X(member, value, what it belongs to).  An explicit
 * energy or hopping has that of h or k, times |beta|. */
#define MHO_UNCERTAINTY_LIST(X)                                                \
  X(ln_coupling, 0.4, "ln Gamma of a kind of contact")                         \
  X(fermi_ev, 0.2, "Fermi level")                                              \
  X(beta_ev, 0.2, "beta")                                                      \
  X(h, 0.1, "h of a site")                                                     \
  X(k, 0.05, "k of a bond")                                                    \
  X(twist_deg, 8.0, "angle of a bond that is twisted or can turn")

typedef struct {
#define MHO_UNCERTAINTY_MEMBER(member, value, what) double member;
  MHO_UNCERTAINTY_LIST(MHO_UNCERTAINTY_MEMBER)
#undef MHO_UNCERTAINTY_MEMBER
} mho_uncertainties;

typedef enum {
  MHO_PARAMETER_FERMI,    /* eV */
  MHO_PARAMETER_BETA,     /* eV */
  MHO_PARAMETER_COUPLING, /* ln Gamma of contact `index`, 2 for both as one kind */
  MHO_PARAMETER_H,        /* of site `index` */
  MHO_PARAMETER_ONSITE,   /* eV, explicit energy of site `index` */
  MHO_PARAMETER_K,        /* of bond `index` */
  MHO_PARAMETER_HOPPING,  /* eV, explicit hopping of bond `index` */
  MHO_PARAMETER_TWIST     /* degrees, of bond `index` */
} mho_parameter_kind;

typedef struct {
  mho_parameter_kind kind;
  int index;
  double derivative_log10_g0; /* per unit of the parameter; 0 at a node */
  double sigma;
  double contribution_decades; /* |derivative| sigma */
} mho_sensitivity_row;

typedef enum { MHO_RULE_LINEAR, MHO_RULE_MONTE_CARLO } mho_error_rule;

typedef struct {
  mho_uncertainties sigma;
  int samples; /* of Monte Carlo, 16 to 1000000 */
  uint64_t seed;
} mho_sensitivity_options;

typedef struct {
  size_t count;
  mho_sensitivity_row *row; /* largest contribution first */
  bool has_derivatives;     /* false where the conductance is zero */
  double linear_decades;    /* sigma of log10 G by the linear rule */
  mho_error_rule rule;      /* the rule behind error_decades */
  double error_decades;     /* Monte Carlo: half the range from 16 % to 84 % */
  bool has_error;           /* false if more than 16 % of the samples are zero */
} mho_sensitivity;

MHO_BEGIN_DECLARATIONS

/* The table above, 400 samples, seed 1. */
MHO_API mho_sensitivity_options mho_sensitivity_defaults(void);

/* The Fermi level stays where the junction of the molecule has it.  Sample i
 * draws from (seed, i).  The caller clears the result, also after a failure.
 * Errors: MHO_ERR_RANGE (options, or a chain as electrode), MHO_ERR_CONTACTS,
 * MHO_ERR_MEMORY, MHO_ERR_LINEAR_ALGEBRA, MHO_ERR_NOT_FINITE. */
MHO_API MHO_MUST_USE mho_status mho_sensitivity_compute(
    const mho_molecule *molecule, const mho_junction *junction,
    const mho_sensitivity_options *options, mho_sensitivity *result,
    mho_error *error);
MHO_API void mho_sensitivity_clear(mho_sensitivity *result);

/* `fermi_eV`, `beta_eV`, `ln coupling left`, `h of c1`, `k of c1-d1`,
 * `twist_deg of c1-d1` ...; returns buffer. */
MHO_API const char *mho_sensitivity_name(const mho_sensitivity_row *row,
                                         const mho_molecule *molecule,
                                         char *buffer, size_t size);

MHO_END_DECLARATIONS

#endif
