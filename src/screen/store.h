/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The store of a screening as its writer sees it.
 *
 * Rollback journal, not a write-ahead log: between batches the store is a
 * single file that may be copied, and it works on network file systems, where
 * shared memory does not.  synchronous=FULL: a batch is on the disk before the
 * next one begins, also when the power fails; at a batch a second or so it costs
 * nothing.
 */
#ifndef MHOLECULE_SCREEN_STORE_H_INTERNAL
#define MHOLECULE_SCREEN_STORE_H_INTERNAL

#include <sqlite3.h>

#include <mho/screen_store.h>

#include "base/buffer.h"
#include "screen/candidates.h"

typedef struct {
  char *key, *value;
  bool open; /* a store that says otherwise may be continued all the same */
} mho_meta_pair;

/* The table meta. */
typedef struct {
  int count;
  mho_meta_pair pair[40];
  bool failed; /* out of memory, or of room */
} mho_meta;

void mho_meta_add(mho_meta *meta, const char *key, const char *format, ...) MHO_PRINTF(3, 4);
const char *mho_meta_find(const mho_meta *meta, const char *key);
void mho_meta_clear(mho_meta *meta);

/* Everything that the content of a store depends on, and the goal.
 * Errors: MHO_ERR_FILE, MHO_ERR_MEMORY. */
MHO_MUST_USE mho_status mho_meta_of_job(const mho_screen_job *job, const mho_candidates *list,
                                        uint64_t rows, mho_meta *meta, mho_error *error);

/* MHO_OK where a store with `stored` may be continued by a job with `now`; else
 * MHO_ERR_RANGE with a cause for each difference. */
MHO_MUST_USE mho_status mho_meta_compare(const mho_meta *stored, const mho_meta *now,
                                         const char *path, mho_error *error);

struct mho_screen_store {
  sqlite3 *database;
  char *path;
  mho_meta meta;
  mho_screen_counts counts;
  sqlite3_stmt *add_candidate, *add_failure, *find_candidate, *find_failure;
};

/* Begins or continues a store; `:memory:` is one that is not kept.
 * Errors: those of mho_screen_run that belong to the store. */
MHO_MUST_USE mho_status mho_store_begin(const char *path, bool resume, const mho_meta *meta,
                                        mho_screen_store **store, mho_error *error);

/* A transaction around rows that follow the last one of the store; they are in
 * it after the commit, and not before.  After a failure the store can only be
 * closed.  Errors: MHO_ERR_WRITE, MHO_ERR_MEMORY. */
MHO_MUST_USE mho_status mho_store_begin_batch(mho_screen_store *store, mho_error *error);
MHO_MUST_USE mho_status mho_store_add(mho_screen_store *store, const mho_candidate *candidate,
                                      const mho_screen_quantities *quantities, mho_error *error);
MHO_MUST_USE mho_status mho_store_commit(mho_screen_store *store, mho_error *error);

/* Adds the name of the column of a quantity. */
void mho_store_column(mho_buffer *sql, int index);

/* Bytes of the store, also of one that is not kept. */
MHO_MUST_USE mho_status mho_store_bytes(mho_screen_store *store, double *bytes, mho_error *error);

#endif
