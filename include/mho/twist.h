/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * What a twist does to a junction.
 *
 * One bond with hopping t cos(theta) changes E - H - Sigma by a matrix of rank
 * two.  With g the 2x2 block of G at its ends p, q for t = 0, and x, y its
 * contact columns, the determinant identity of rank-two updates gives
 *
 *   tau_ba(s) = [tau_0 + s (w - 2 b tau_0) + s^2 (tau_0 (b^2 - a d) + d x_p y_p
 *               + a x_q y_q - b w)] / [(1 - s b)^2 - s^2 a d],
 *   s = t cos(theta),  a = g_pp, b = g_pq, d = g_qq,  w = x_p y_q + x_q y_p,
 *
 * so T is a ratio of two polynomials of fourth degree in s; where the bond is
 * the only link of its two sides, b = 0 and only even powers are left.
 */
#ifndef MHOLECULE_TWIST_H
#define MHOLECULE_TWIST_H

#include <mho/junction.h>
#include <mho/torsion.h>
#include <mho/transmission.h>

/* T = sum n_k s^k / sum d_k s^k, s = hopping_ev cos(theta). */
typedef struct {
  double numerator[5], denominator[5];
  double hopping_ev; /* untwisted */
} mho_twist_form;

/* A junction in which some bonds turn; the Fermi level stays where it was. */
typedef struct mho_rotor mho_rotor;

enum { MHO_TWIST_BONDS_MAX = 64, MHO_TWIST_AVERAGE_BONDS_MAX = 3 };

/* Why T does not follow cos^2(theta). */
typedef enum {
  MHO_TWIST_LAW_HOLDS,      /* to 5 % over 0 to 80 degrees */
  MHO_TWIST_OTHER_PATH,     /* T stays finite at 90 degrees */
  MHO_TWIST_NEAR_POLE,      /* a resonance lies within a quarter of |t| */
  MHO_TWIST_STRONG_COUPLING, /* t is not small against the levels of the halves */
  MHO_TWIST_SEVERAL_BONDS   /* of n bonds that turn together: cos^2n at best */
} mho_twist_reason;

typedef struct {
  bool has_fit;            /* false where T is zero at all angles */
  double exponent;         /* p of T ~ (cos^2 theta)^p, least squares in log T */
  double residual_decades; /* root mean square about that fit */
  double holds_to_deg;     /* largest whole angle to which cos^2 keeps 5 % */
  double largest_decades;  /* largest |log10 T - log10 T(0) cos^2|, 0 to 80 deg */
  mho_twist_reason reason;
} mho_twist_law;

typedef struct {
  double temperature_k;
  double mean_cos2;          /* of one bond, or of the product of all */
  double planar_log10_g0;    /* all bonds flat; -INFINITY for zero */
  double motional_log10_g0;  /* log10 <G>: turns faster than anyone measures */
  bool has_frozen;           /* false where G is zero over a range of angles */
  double frozen_log10_g0;    /* <log10 G>: every junction keeps its angle */
  bool converged;            /* to 1e-8, frozen to 1e-6 */
} mho_twist_average;

MHO_BEGIN_DECLARATIONS

/* Bonds bond[bonds] of the molecule turn together.  The molecule must outlive
 * the rotor.  Errors: MHO_ERR_SIZE (a bond, or none), MHO_ERR_CONTACTS,
 * MHO_ERR_MEMORY, MHO_ERR_LINEAR_ALGEBRA. */
MHO_API MHO_MUST_USE mho_status mho_rotor_create(const mho_molecule *molecule,
                                                 const mho_junction *junction,
                                                 const int *bond, int bonds,
                                                 mho_rotor **rotor,
                                                 mho_error *error);
MHO_API void mho_rotor_free(mho_rotor *rotor);

/* The closed form at an energy (relative to alpha).  *good is false where it
 * cannot be trusted: the molecule without the bond is singular there, several
 * bonds turn, or it misses the plan by 1e-9 at one of three angles.
 * Errors: MHO_ERR_NOT_FINITE, MHO_ERR_MEMORY, MHO_ERR_LINEAR_ALGEBRA. */
MHO_API MHO_MUST_USE mho_status mho_twist_form_find(const mho_rotor *rotor,
                                                    double energy_ev,
                                                    mho_twist_form *form,
                                                    bool *good, mho_error *error);

/* T for cos(theta) = cosine[count] by the closed form.  No allocation. */
MHO_API void mho_twist_form_evaluate(const mho_twist_form *form, size_t count,
                                     const double *cosine, double *transmission);

/* T at one energy and angle_deg[count], all bonds at that angle: the closed
 * form, and the plan of the turned junction wherever the form is not good to
 * 1e-9.  Errors: as above. */
MHO_API MHO_MUST_USE mho_status mho_rotor_sweep(const mho_rotor *rotor,
                                                double energy_ev, size_t count,
                                                const double *angle_deg,
                                                mho_point *point,
                                                mho_error *error);

/* The same with an angle of its own for each bond, angle_deg[bonds]. */
MHO_API MHO_MUST_USE mho_status mho_rotor_point(const mho_rotor *rotor, double energy_ev,
                                                const double *angle_deg, mho_point *point,
                                                mho_error *error);

/* log10 of the thermal conductance (G0) at each angle; -INFINITY for zero. */
MHO_API MHO_MUST_USE mho_status mho_rotor_conductance(const mho_rotor *rotor,
                                                      size_t count,
                                                      const double *angle_deg,
                                                      double *log10_g0,
                                                      mho_error *error);

/* How far T(theta) at an energy follows cos^2(theta). */
MHO_API MHO_MUST_USE mho_status mho_twist_fit_law(const mho_rotor *rotor,
                                                  double energy_ev,
                                                  mho_twist_law *law,
                                                  mho_error *error);

/* The largest whole angle within which the thermal conductance never falls
 * below fraction[count] of its value with the bonds flat; 0 where that is zero. */
MHO_API MHO_MUST_USE mho_status mho_twist_find_limits(const mho_rotor *rotor, size_t count,
                                                      const double *fraction,
                                                      double *limit_deg, mho_error *error);

/* Averages over exp(-V/kT) at the temperature of the molecule, torsion[bonds]
 * for the bonds one by one, independent of each other.  The trapezoid rule is
 * doubled until it stands; for a periodic function it converges exponentially
 * (L. N. Trefethen and J. A. C. Weideman, SIAM Rev. 56, 385 (2014)).  The
 * logarithm of a conductance that dies at 90 degrees is averaged as its smooth
 * part plus that of cos^2, ln cos^2 = -2 ln 2 + 2 sum (-1)^(k+1) cos(2k theta)/k.
 * Errors: MHO_ERR_SIZE (more than MHO_TWIST_AVERAGE_BONDS_MAX bonds),
 * MHO_ERR_RANGE (0 K), and those above. */
MHO_API MHO_MUST_USE mho_status mho_twist_average_compute(
    const mho_rotor *rotor, const mho_torsion *torsion, mho_twist_average *average,
    mho_error *error);

MHO_END_DECLARATIONS

#endif
