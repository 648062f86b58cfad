/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * What a plan holds, and the ladder of methods that evaluate it.
 *
 * Every method gives T and a bound on its own relative error, so the caller
 * takes the first that is good enough and no method needs to be robust alone.
 * Channels are numbered through both leads: 0..left-1 are those of the left
 * contact, left..left+right-1 those of the right one.
 */
#ifndef MHOLECULE_SOLVER_PLAN_H
#define MHOLECULE_SOLVER_PLAN_H

#include <float.h>

#include <mho/gradient.h>
#include <mho/transmission.h>

#include "solver/quad.h"

/* A level and the products of its amplitudes at two channels. */
typedef struct {
  double level_ev, w00, w01, w11;
} mho_pole_pair;

struct mho_plan {
  int sites, left, right, channels; /* channels = left + right */
  bool connected;
  double norm_ev; /* 2-norm of H, or a bound on it */
  mho_entry *entry; /* non-zeros of H, i <= j, with the diagonal */
  size_t entries;
  size_t *neighbour_start; /* [sites + 1]: pattern of H and of Sigma, no diagonal */
  int *neighbour;
  int *order, *place; /* [sites]: site at a place of a narrow band, and back */
  size_t bandwidth;   /* of H and Sigma in that order */
  size_t band; /* to eliminate within, or 0 where full elimination is as good */
  size_t *support_start; /* [channels + 1]: sites where v_c is not zero */
  int *support;
  double *coupling_ev, *shift_ev; /* [channels] */
  double *vector;                 /* [channels][sites] */
  bool has_chain[2];              /* coupling and shift follow from the energy */
  mho_chain_electrode chain[2];
  double *level_ev;               /* [sites]; NULL: not diagonalised */
  double *amplitude;              /* [sites][channels]: <orbital k|v_c> */
  mho_pole_pair *pair;            /* [sites], the same for one channel a contact */
  struct mho_repeat *repeat;      /* NULL: not a run of equal units */
  struct mho_program *program;    /* NULL: does not pay */
  mho_plan *contacts;             /* of the program's kept sites */
  mho_method first;               /* methods before it are left out (tests) */
  struct mho_spare *spare;        /* a workspace that no sweep uses now */
};

/* Unit roundoff of a double. */
#define UNIT_ROUNDOFF (0.5 * DBL_EPSILON)

/* Up to here the sum over levels is worth its bookkeeping.  Of larger molecules
 * too few energies keep the contract that way: rounding in levels and amplitudes
 * grows against a T that falls with the length. */
enum { SPECTRUM_CHANNELS_MAX = 8, SPECTRUM_SITES_MAX = 36 };

/* A value with what is known of its error.  `kappa` is a lower bound of the
 * condition of ln T: the part that comes from H and E. */
typedef struct {
  double transmission, log10_transmission;
  double relative_error; /* to first order; INFINITY: the method cannot tell */
  bool first_order;      /* false: too near to singular to trust that bound */
  double kappa;
} mho_estimate;

/* Is an electrode a chain, so that Sigma depends on the energy? */
bool mho_plan_has_chain(const mho_plan *plan);

/* Where both electrodes have states: -INFINITY to INFINITY for wide bands, from
 * low to high for chains, empty where low >= high; electrode.c. */
void mho_plan_band(const mho_plan *plan, double *low_ev, double *high_ev);

/* A plan of wide bands that has the Sigma of chains at one energy.  It borrows all
 * else of its plan, and its own struct must not move between set and use. */
typedef struct {
  mho_plan plan, contacts;
  double *sigma;
} mho_frozen;

MHO_MUST_USE mho_status mho_frozen_create(const mho_plan *plan, mho_frozen *frozen);
void mho_frozen_clear(mho_frozen *frozen);

/* False outside the band of a chain: nothing is transmitted there. */
bool mho_frozen_set(const mho_plan *plan, double energy_ev, mho_frozen *frozen);

/* Poles for whoever needs to know where T changes: mho_poles, or with chains those
 * within the band and half an eV of [low, high], near enough to draw and integrate
 * by (some twice, a hundredth of their width apart); resonances.c.  The
 * caller frees *pole, *count of them by ascending energy, also after a failure. */
MHO_MUST_USE mho_status mho_plan_resonances(const mho_plan *plan, double low_ev, double high_ev,
                                            mho_pole **pole, size_t *count, mho_error *error);

/* MHO_ERR_RANGE where Sigma depends on the energy and `what` needs it not to. */
MHO_MUST_USE mho_status mho_plan_require_wide_band(const mho_plan *plan, const char *what,
                                                   mho_error *error);

/* Order that makes the band narrow, over plan->neighbour; order.c. */
MHO_MUST_USE mho_status mho_plan_order(mho_plan *plan);

/* As mho_plan_create, for levels and nodes: no sweep, no derivative. */
MHO_MUST_USE mho_status mho_plan_create_bare(const mho_junction *junction, mho_plan **plan,
                                             mho_error *error);

/* A plan of the contacts' sites alone, site[count] of this one. */
MHO_MUST_USE mho_status mho_plan_contacts(const mho_plan *plan, const int *site, int count,
                                          mho_plan **contacts);

/* The workspace of the last sweep waits for the next one, whichever thread that
 * is; sweep.c.  Errors: MHO_ERR_MEMORY. */
MHO_MUST_USE mho_status mho_spare_create(mho_plan *plan);
void mho_spare_free(mho_plan *plan);

/* Gaussian elimination in double and in 113 bits; elimination.inc.  The
 * workspace belongs to one thread; create returns NULL without memory.
 * differentiate follows an evaluate that found T, fills all derivatives and
 * returns an estimate of the error of the sum of all p dlnT/dp. */
typedef struct mho_repeat mho_repeat;
typedef struct mho_program mho_program;
typedef struct mho_elimination_double mho_elimination_double;
typedef struct mho_elimination_quad mho_elimination_quad;

mho_elimination_double *mho_elimination_create_double(const mho_plan *plan);
void mho_elimination_free_double(mho_elimination_double *workspace);
void mho_elimination_evaluate_double(const mho_plan *plan,
                                     mho_elimination_double *workspace,
                                     double energy_ev, mho_estimate *estimate);

void mho_elimination_reduced_double(const mho_plan *contacts, mho_elimination_double *workspace,
                                const double *value, double *adjoint,
                                mho_estimate *estimate);
double mho_elimination_differentiate_double(const mho_plan *plan,
                                        mho_elimination_double *workspace,
                                        double energy_ev, double relative_error,
                                        mho_gradient *gradient);

mho_elimination_quad *mho_elimination_create_quad(const mho_plan *plan);
void mho_elimination_free_quad(mho_elimination_quad *workspace);
void mho_elimination_evaluate_quad(const mho_plan *plan,
                                   mho_elimination_quad *workspace,
                                   double energy_ev, mho_estimate *estimate);

void mho_elimination_reduced_quad(const mho_plan *contacts, mho_elimination_quad *workspace,
                                const mho_quad *value, double *adjoint,
                                mho_estimate *estimate);
/* y_c of all channels, [channels][sites], in double. */
void mho_elimination_solutions_quad(const mho_plan *plan,
                                    const mho_elimination_quad *workspace,
                                    double _Complex *solution);

/* Im (G Gamma_L G^+)_ij, which may be far smaller than its terms. */
double mho_elimination_flow_quad(const mho_plan *plan, const mho_elimination_quad *workspace,
                                 int i, int j);
double mho_elimination_differentiate_quad(const mho_plan *plan,
                                        mho_elimination_quad *workspace,
                                        double energy_ev, double relative_error,
                                        mho_gradient *gradient);

#endif
