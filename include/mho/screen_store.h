/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * A screening from its list into a store: one SQLite file that any tool reads.
 *
 *   meta       key, value: settings, hash of the list, goal, requirements
 *   candidate  row (place in the list, from 1), candidate (its name), line,
 *              smiles, one column a quantity (mho_screen_quantity_at; NULL where
 *              it does not exist), shared (derivatives of log10 G, 32-bit
 *              floats, little-endian, in the order of meta's shared_parameters)
 *   failure    row, candidate, line, reason
 *
 * application_id is MHO_STORE_APPLICATION, user_version MHO_STORE_VERSION.
 * Rows are written in the order of the list, a transaction a batch, so that a
 * store always holds the rows 1 to n of its list: candidates and failures.
 */
#ifndef MHOLECULE_SCREEN_STORE_H
#define MHOLECULE_SCREEN_STORE_H

#include <mho/screen.h>
#include <mho/settings.h>

#define MHO_STORE_APPLICATION 0x6D686F73 /* "mhos" */
#define MHO_STORE_VERSION 1

typedef struct {
  uint64_t rows; /* of the list, bad ones counted */
  uint64_t good, bad; /* that are in the store */
  uint64_t ignored; /* files of a folder that are no molecule files */
} mho_screen_counts;

/* What to compute, and how. */
typedef struct {
  const char *list;             /* .smi, .csv, .tsv, .sdf, .mol, .xyz or a folder */
  const mho_settings *settings; /* NULL: none; above what molecule files say */
  const mho_settings *defaults; /* NULL: none; below what molecule files say */
  mho_screen_settings screen;
  /* Kept in the store for those who look at it; goal NULL: the default one. */
  const mho_screen_goal *goal;
  const mho_screen_requirement *requirement;
  size_t requirements;
  int threads; /* 0: as many as OpenMP has */
  /* Batches of one size instead of one time: the store has the same bytes each
   * time (SQLite counts transactions), but less of it is kept after a crash. */
  bool even_batches;
  /* Called with the counts before the work begins and after every batch. */
  void (*progress)(const mho_screen_counts *counts, void *user);
  void *user;
  const volatile int *cancel; /* NULL, or becomes non-zero */
} mho_screen_job;

typedef struct {
  uint64_t rows, sample, ignored;
  uint64_t sample_bad;
  double seconds; /* for all rows, from those of the sample */
  double bytes;   /* of the store */
} mho_screen_estimate;

typedef struct mho_screen_store mho_screen_store;

/* Texts of one row; until the next call. */
typedef struct {
  uint64_t row; /* 0: there is no further one */
  const char *name, *smiles; /* smiles NULL where the list has none */
  long line;                 /* 0 where there is none */
  const char *reason;        /* of a failure, else NULL */
} mho_screen_text;

MHO_BEGIN_DECLARATIONS

/* Nothing but defaults. */
MHO_API mho_screen_job mho_screen_job_defaults(void);

/* Computes the list into the store at `path`, which must not exist.  With
 * `resume` an earlier one is continued behind its last row, and one that is
 * missing or empty is begun; the content in the end does not depend on
 * interruptions nor on the number of threads.  A bad row is no error.  Without
 * goal or requirements those of the store stay.
 * Errors: MHO_ERR_FILE (the list), MHO_ERR_SYNTAX, MHO_ERR_KEY, MHO_ERR_RANGE
 * (the store exists, is none, or has other settings or another list: a cause for
 * each), MHO_ERR_WRITE, MHO_ERR_MEMORY, MHO_ERR_CANCELLED; whole batches that
 * were done before are kept. */
MHO_API MHO_MUST_USE mho_status mho_screen_run(const mho_screen_job *job, const char *path,
                                               bool resume, mho_screen_counts *counts,
                                               mho_error *error);

/* Time and size of the whole, from a sample of the list that is computed now
 * and not kept. */
MHO_API MHO_MUST_USE mho_status mho_screen_estimate_run(const mho_screen_job *job,
                                                        mho_screen_estimate *estimate,
                                                        mho_error *error);

/* Opens a store for reading.  Errors: MHO_ERR_FILE, MHO_ERR_RANGE (not a store,
 * or of another version), MHO_ERR_MEMORY. */
MHO_API MHO_MUST_USE mho_status mho_screen_store_open(const char *path, mho_screen_store **store,
                                                      mho_error *error);
MHO_API void mho_screen_store_close(mho_screen_store *store);

MHO_API const mho_screen_counts *mho_screen_store_counts(const mho_screen_store *store);

/* A value of the table meta, or NULL; lives as long as the store. */
MHO_API const char *mho_screen_store_meta(const mho_screen_store *store, const char *key);

/* Quantities and rows of all candidates, which the caller frees.
 * Errors: MHO_ERR_FILE, MHO_ERR_RANGE (content that is none of ours), MHO_ERR_MEMORY. */
MHO_API MHO_MUST_USE mho_status mho_screen_store_load(mho_screen_store *store,
                                                      mho_screen_quantities **quantities,
                                                      uint64_t **row, size_t *count,
                                                      mho_error *error);

/* Name and SMILES of a candidate; the failure with the least row above `after`. */
MHO_API MHO_MUST_USE mho_status mho_screen_store_candidate(mho_screen_store *store, uint64_t row,
                                                           mho_screen_text *text,
                                                           mho_error *error);
MHO_API MHO_MUST_USE mho_status mho_screen_store_failure(mho_screen_store *store, uint64_t after,
                                                         mho_screen_text *text, mho_error *error);

MHO_END_DECLARATIONS

#endif
