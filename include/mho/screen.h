/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Screening: what is computed of each candidate, what the user asks of it, and
 * the ranking of many with the confidence of each place.
 */
#ifndef MHOLECULE_SCREEN_H
#define MHOLECULE_SCREEN_H

#include <stdint.h>

#include <mho/linker.h>
#include <mho/molecule.h>
#include <mho/sensitivity.h>

/* --- quantities ----------------------------------------------------------- */

/* The quantities of a candidate, X(member, type, column, name, form, what):
 * `column` heads a table; `name` is what goals and requirements say ("" where
 * another row stands for it); `form` says how a value is written (below). */
#define MHO_SCREEN_QUANTITY_LIST(X)                                            \
  X(fermi_ev, double, "fermi_eV", "fermi", ENERGY,                             \
    "Fermi level on the scale of alpha")                                       \
  X(transmission, double, "transmission", "transmission", NUMBER,              \
    "T at the Fermi level; 0 at a node")                                       \
  X(conductance_g0, double, "conductance_G0", "", NUMBER,                      \
    "thermal conductance in G0")                                               \
  X(log10_g0, double, "log10_G0", "conductance", CONDUCTANCE,                  \
    "thermal conductance at the Fermi level")                                  \
  X(window_low_log10_g0, double, "window_low_log10_G0", "window-low",          \
    CONDUCTANCE, "5 % of the conductances over the alignment window")          \
  X(window_high_log10_g0, double, "window_high_log10_G0", "window-high",       \
    CONDUCTANCE, "95 % of the conductances over the alignment window")         \
  X(low_log10_g0, double, "low", "low", CONDUCTANCE,                           \
    "conductance, one sigma of the parameters down (16 %)")                    \
  X(high_log10_g0, double, "high", "high", CONDUCTANCE,                        \
    "conductance, one sigma of the parameters up (84 %)")                      \
  X(error_decades, double, "error_decades", "error", DECADES,                  \
    "sigma of log10 G from the uncertainties of the parameters")               \
  X(linear_decades, double, "linear_decades", "", DECADES,                     \
    "the same by the linear rule")                                             \
  X(error_rule, int, "error_rule", "", COUNT,                                  \
    "rule behind low, high and error: 0 linear, 1 Monte Carlo")                \
  X(twist_decades, double, "twist_decades", "twist", DECADES,                  \
    "change of log10 G where the bonds that can turn do so by one sigma")      \
  X(homo_ev, double, "homo_eV", "homo", ENERGY, "HOMO on the scale of alpha")  \
  X(lumo_ev, double, "lumo_eV", "lumo", ENERGY, "LUMO on the scale of alpha")  \
  X(gap_ev, double, "gap_eV", "gap", ENERGY, "LUMO - HOMO")                    \
  X(nodes, int, "nodes", "nodes", COUNT,                                       \
    "energies between HOMO and LUMO where T is exactly zero")                  \
  X(node_ev, double, "node_eV", "node", ENERGY,                                \
    "that of them nearest to the Fermi level, relative to it")                 \
  X(length_nm, double, "length_nm", "length", LENGTH,                          \
    "distance between the contacts")                                           \
  X(heavy_atoms, int, "heavy_atoms", "heavy-atoms", COUNT,                     \
    "atoms other than hydrogen, as drawn")                                     \
  X(rings, int, "rings", "rings", COUNT, "independent rings")                  \
  X(ring_systems, int, "ring_systems", "ring-systems", COUNT,                  \
    "groups of rings that share atoms")                                        \
  X(rotatable_bonds, int, "rotatable_bonds", "rotatable-bonds", COUNT,         \
    "bonds of the pi system that can turn")                                    \
  X(left_linker, int, "left_linker", "left-linker", LINKER,                    \
    "kind of linker of the left contact")                                      \
  X(right_linker, int, "right_linker", "right-linker", LINKER,                 \
    "kind of linker of the right contact")                                     \
  X(warnings, int, "warnings", "warnings", WARNINGS,                           \
    "set of named warnings (mho/warning.h)")

typedef enum {
  MHO_FORM_NUMBER,
  MHO_FORM_COUNT,       /* a whole number */
  MHO_FORM_ENERGY,      /* eV */
  MHO_FORM_LENGTH,      /* nm */
  MHO_FORM_DECADES,
  MHO_FORM_CONDUCTANCE, /* held as log10 of G0, written `1e-4 G0`, `90 nS` */
  MHO_FORM_LINKER,      /* mho_linker_kind, MHO_LINKER_KINDS for another group */
  MHO_FORM_WARNINGS     /* bits */
} mho_screen_form;

/* Index of each quantity, MHO_SCREEN_gap_ev ... */
enum {
#define MHO_SCREEN_INDEX(member, type, column, name, form, what) MHO_SCREEN_##member,
  MHO_SCREEN_QUANTITY_LIST(MHO_SCREEN_INDEX)
#undef MHO_SCREEN_INDEX
  MHO_SCREEN_QUANTITIES
};

/* Parameters whose error all candidates share.  Rows of the parameter set from
 * MHO_SHARED_ROWS on, h of carbon and k between carbons count as private. */
enum {
  MHO_SHARED_ROWS = 16,
  MHO_SHARED_FERMI = 0,    /* eV */
  MHO_SHARED_BETA = 1,     /* eV */
  MHO_SHARED_COUPLING = 2, /* ln Gamma, + mho_linker_kind */
  MHO_SHARED_H = MHO_SHARED_COUPLING + MHO_LINKER_KINDS + 1, /* h, + row */
  MHO_SHARED_K = MHO_SHARED_H + MHO_SHARED_ROWS, /* k to carbon, + row */
  MHO_SHARED_COUNT = MHO_SHARED_K + MHO_SHARED_ROWS
};

/* One candidate.  No pointers: it may be stored as it is.  A quantity that does
 * not exist (no node, a file of sites without atoms) is 0, and its
 * bit 1 << MHO_SCREEN_member of `has` is not set. */
typedef struct {
#define MHO_SCREEN_MEMBER(member, type, column, name, form, what) type member;
  MHO_SCREEN_QUANTITY_LIST(MHO_SCREEN_MEMBER)
#undef MHO_SCREEN_MEMBER
  uint32_t has;
  float shared[MHO_SHARED_COUNT]; /* dlog10G/dp of the parameters above */
} mho_screen_quantities;

typedef struct {
  const char *column, *name, *what;
  mho_screen_form form;
  bool whole; /* int, else double */
} mho_screen_quantity;

typedef struct {
  double window_ev; /* half width of the alignment window */
  mho_sensitivity_options sensitivity;
} mho_screen_settings;

/* What one thread keeps from candidate to candidate. */
typedef struct mho_screen_workspace mho_screen_workspace;

/* --- goal and requirements ------------------------------------------------ */

typedef enum { MHO_AIM_MAXIMISE, MHO_AIM_MINIMISE, MHO_AIM_MATCH } mho_screen_aim;

/* Conductances count in decades. */
typedef struct {
  mho_screen_aim aim;
  int quantity; /* MHO_SCREEN_... */
  double value; /* to match */
} mho_screen_goal;

typedef enum {
  MHO_IS_LESS,
  MHO_IS_AT_MOST,
  MHO_IS_EQUAL,   /* of warnings: has that one, or has none */
  MHO_IS_UNEQUAL, /* of warnings: does not have it, or has some */
  MHO_IS_AT_LEAST,
  MHO_IS_MORE
} mho_screen_comparison;

typedef struct {
  int quantity;
  mho_screen_comparison comparison;
  double value; /* in the unit of the quantity; conductance log10 of G0 */
} mho_screen_requirement;

/* --- ranking -------------------------------------------------------------- */

enum { MHO_SCREEN_TOP = 10, MHO_SCREEN_SAMPLES = 4000 };

typedef struct {
  mho_screen_goal goal;
  const mho_screen_requirement *requirement; /* all must hold */
  size_t requirements;
  size_t top;     /* places that count */
  int samples;    /* of the errors, 100 to 1000000; fewer are drawn where more than
                   * 1e8 / samples candidates may reach the top */
  uint64_t seed;
  mho_uncertainties sigma;
} mho_screen_rank_options;

typedef struct {
  size_t rank;            /* from 1; 0 where a requirement fails */
  double top_probability; /* to be among the top; 0 without a rank */
  double error;           /* sigma of the goal's quantity; 0: none is known */
} mho_screen_place;

typedef struct {
  size_t ranked;    /* candidates with a rank */
  size_t refused;   /* a requirement fails */
  size_t undefined; /* of those ranked, last: the goal's quantity does not exist */
  size_t top;       /* min(options.top, ranked) */
  /* Groups within the top: a new one begins where a place differs from the
   * first of its group by more than the error of their difference at 90 %. */
  size_t distinguishable;
} mho_screen_ranking;

MHO_BEGIN_DECLARATIONS

/* The table above; `index` 0 .. MHO_SCREEN_QUANTITIES - 1, else NULL. */
MHO_API const mho_screen_quantity *mho_screen_quantity_at(int index);

/* Value of a quantity; false (and *value = 0) where it does not exist. */
MHO_API bool mho_screen_value(const mho_screen_quantities *quantities, int index,
                              double *value);

/* Sets a quantity (reading a store); false for a wrong index. */
MHO_API bool mho_screen_set_value(mho_screen_quantities *quantities, int index,
                                  double value);

/* `fermi_eV`, `ln coupling amine`, `h of row 3` ...; returns buffer. */
MHO_API const char *mho_screen_shared_name(int index, char *buffer, size_t size);

/* Defaults of mho_conductance and of mho_sensitivity. */
MHO_API mho_screen_settings mho_screen_defaults(void);

/* A workspace of one thread; NULL without memory. */
MHO_API mho_screen_workspace *mho_screen_workspace_create(void);
MHO_API void mho_screen_workspace_free(mho_screen_workspace *workspace);

/* All quantities of one molecule with two contacts, the same numbers as
 * mho_conductance_compute, mho_sensitivity_compute, mho_nodes_find and
 * mho_molecule_length give.  settings may be NULL.
 *
 * twist_decades: with dlog10G/dt exact and dt the change of t cos(theta) of a
 * bond that turns by one sigma (8 degrees) to the side where it changes more,
 * the root of the sum of (dlog10G/dt dt)^2 over the bonds that can turn.
 * Errors: those of mho_junction_build, MHO_ERR_CONTACTS, MHO_ERR_RANGE
 * (settings), MHO_ERR_MEMORY, MHO_ERR_LINEAR_ALGEBRA, MHO_ERR_NOT_FINITE. */
MHO_API MHO_MUST_USE mho_status mho_screen_measure(
    mho_screen_workspace *workspace, const mho_molecule *molecule,
    const mho_screen_settings *settings, mho_screen_quantities *out,
    mho_error *error);

/* `maximise conductance`, `minimise length`, `match gap 2.5 eV`.  `reason` (may
 * be NULL) says what is wrong and what is allowed.
 * Errors: MHO_ERR_SYNTAX, MHO_ERR_KEY (no such quantity), MHO_ERR_UNIT. */
MHO_API MHO_MUST_USE mho_status mho_screen_goal_read(const char *text,
                                                     mho_screen_goal *goal,
                                                     char *reason,
                                                     size_t reason_size);

/* `gap > 2 eV`, `conductance >= 1e-4 G0`, `nodes = 0`, `left-linker = amine`,
 * `warnings != near-node`, `warnings = none`; comparisons < <= = != >= >.
 * Errors: as above, MHO_ERR_REFERENCE (no such linker or warning). */
MHO_API MHO_MUST_USE mho_status mho_screen_require_read(
    const char *text, mho_screen_requirement *requirement, char *reason,
    size_t reason_size);

/* The same in words, as they would be read; return buffer. */
MHO_API const char *mho_screen_goal_write(const mho_screen_goal *goal,
                                          char *buffer, size_t size);
MHO_API const char *mho_screen_require_write(
    const mho_screen_requirement *requirement, char *buffer, size_t size);

/* Does a candidate meet it?  What does not exist meets nothing. */
MHO_API bool mho_screen_meets(const mho_screen_quantities *quantities,
                              const mho_screen_requirement *requirement);

/* Maximise conductance, no requirements, top 10, 4000 samples, seed 1. */
MHO_API mho_screen_rank_options mho_screen_rank_defaults(void);

/* Ranks candidate[n] into place[n]; equal ones keep their order, those without
 * the goal's quantity come last.  options may be NULL.  The same at any number
 * of threads.  O(n log n).
 * Errors: MHO_ERR_RANGE (options), MHO_ERR_MEMORY. */
MHO_API MHO_MUST_USE mho_status mho_screen_rank(
    const mho_screen_quantities *candidate, size_t n,
    const mho_screen_rank_options *options, mho_screen_place *place,
    mho_screen_ranking *ranking, mho_error *error);

MHO_END_DECLARATIONS

#endif
