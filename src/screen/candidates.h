/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The candidates of a screening, one after the other: rows of a list (.smi,
 * CSV), records of a file of structures (SDF, molfile, XYZ), or the molecule
 * files of a folder.  One candidate is held at a time, however many there are.
 */
#ifndef MHOLECULE_SCREEN_CANDIDATES_H
#define MHOLECULE_SCREEN_CANDIDATES_H

#include <stdint.h>

#include <mho/molecule.h>
#include <mho/settings.h>

typedef struct mho_candidates mho_candidates;

/* One candidate; whoever holds it clears it. */
typedef struct {
  uint64_t row;    /* from 1, bad ones counted; 0 at the end of the list */
  long line;       /* of the list; 0 in a folder */
  mho_place place; /* of the SMILES; the file's name belongs to the list */
  char *name;
  char *smiles;          /* of a list, not read yet; else NULL */
  mho_molecule molecule; /* where the list has no SMILES */
  char *fault;           /* NULL, or why the row is bad */
} mho_candidate;

void mho_candidate_init(mho_candidate *candidate);
void mho_candidate_clear(mho_candidate *candidate);

/* Gives a candidate its fault, after a cause.  Errors: MHO_ERR_MEMORY. */
MHO_MUST_USE mho_status mho_candidate_fail(mho_candidate *candidate, const mho_error *cause);

/* Defaults go below what molecule files say, settings above it; NULL for none,
 * else they outlive the candidates.  Errors: MHO_ERR_FILE (also: an ending that
 * is no list's), MHO_ERR_SYNTAX, MHO_ERR_KEY, MHO_ERR_MEMORY. */
MHO_MUST_USE mho_status mho_candidates_open(const char *path, const mho_settings *defaults,
                                            const mho_settings *settings,
                                            mho_candidates **candidates, mho_error *error);
void mho_candidates_close(mho_candidates *candidates);

/* Of a candidate that says nothing itself: the settings on top of the defaults. */
const mho_settings *mho_candidates_settings(const mho_candidates *candidates);

/* The next one into an initialised candidate.  A bad row is MHO_OK with its
 * fault.  Errors: MHO_ERR_FILE (the list cannot be read further), MHO_ERR_MEMORY. */
MHO_MUST_USE mho_status mho_candidates_next(mho_candidates *candidates, mho_candidate *candidate,
                                            mho_error *error);

/* Passes over at most `count` candidates; *passed is how many there were.
 * cancel (or NULL) stops it.  Errors as above, MHO_ERR_CANCELLED. */
MHO_MUST_USE mho_status mho_candidates_skip(mho_candidates *candidates, uint64_t count,
                                            const volatile int *cancel, uint64_t *passed,
                                            mho_error *error);

/* `smi`, `csv`, `structures` or `folder`; files of a folder that are passed over. */
const char *mho_candidates_format(const mho_candidates *candidates);
size_t mho_candidates_ignored(const mho_candidates *candidates);

enum { MHO_DIGEST_SIZE = 65 };

/* SHA-256 of the list in hexadecimal; of a folder, that of the names and hashes
 * of its molecule files.  Errors: MHO_ERR_FILE, MHO_ERR_MEMORY. */
MHO_MUST_USE mho_status mho_candidates_digest(const mho_candidates *candidates,
                                              char digest[MHO_DIGEST_SIZE], mho_error *error);

#endif
