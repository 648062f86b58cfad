/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * What a store holds, for those who rank and list it.
 */
#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "screen/shared.h"
#include "screen/store.h"

static mho_status no_memory(mho_error *error)
{
  return mho_fail(error, MHO_ERR_MEMORY, "screen", NULL, "out of memory");
}

static mho_status fail_content(const mho_screen_store *s, sqlite3_int64 row, const char *what,
                               mho_error *error)
{
  return mho_fail_at(error, MHO_ERR_RANGE, "screen", s->path, 0, 0, NULL,
                     "row %lld of the store is damaged: %s", (long long)row, what);
}

static mho_status fail_reading(const mho_screen_store *s, mho_error *error)
{
  if (sqlite3_errcode(s->database) == SQLITE_NOMEM) return no_memory(error);
  return mho_fail_at(error, MHO_ERR_FILE, "screen", s->path, 0, 0, NULL, "cannot be read: %s",
                     sqlite3_errmsg(s->database));
}

/* The kind of linker of that name, or -1. */
static int linker_of(const char *name)
{
  for (int i = 0; i <= MHO_LINKER_KINDS; i++)
    if (!strcmp(name, mho_linker_name((mho_linker_kind)i))) return i;
  return -1;
}

/* The set of warnings whose words are joined by blanks, or -1. */
static int warnings_of(const char *words)
{
  int warnings = 0;
  while (*words) {
    size_t length = strcspn(words, " ");
    int i = 0;
    while (i < MHO_WARNING_COUNT && (strlen(mho_warning_word(i)) != length ||
                                     strncmp(mho_warning_word(i), words, length)))
      i++;
    if (i == MHO_WARNING_COUNT) return -1;
    warnings |= 1 << i;
    words += length + (words[length] == ' ');
  }
  return warnings;
}

static bool read_quantity(sqlite3_stmt *statement, int column, int index,
                          mho_screen_quantities *quantities)
{
  const mho_screen_quantity *q = mho_screen_quantity_at(index);
  if (sqlite3_column_type(statement, column) == SQLITE_NULL) return true;
  double value = sqlite3_column_double(statement, column);
  if (q->form == MHO_FORM_LINKER || q->form == MHO_FORM_WARNINGS) {
    const char *text = (const char *)sqlite3_column_text(statement, column);
    int code = !text ? -1 : q->form == MHO_FORM_LINKER ? linker_of(text) : warnings_of(text);
    if (code < 0) return false;
    value = code;
  }
  return isfinite(value) && (!q->whole || fabs(value) < 1e9) &&
         mho_screen_set_value(quantities, index, value);
}

static mho_status read_row(mho_screen_store *s, sqlite3_stmt *statement,
                           mho_screen_quantities *quantities, mho_error *error)
{
  sqlite3_int64 row = sqlite3_column_int64(statement, 0);
  const int shared = 1 + MHO_SCREEN_QUANTITIES;
  *quantities = (mho_screen_quantities){0};
  for (int i = 0; i < MHO_SCREEN_QUANTITIES; i++)
    if (!read_quantity(statement, 1 + i, i, quantities))
      return fail_content(s, row, mho_screen_quantity_at(i)->column, error);
  const unsigned char *bytes = sqlite3_column_blob(statement, shared);
  if (!bytes || sqlite3_column_bytes(statement, shared) != MHO_SHARED_BYTES)
    return fail_content(s, row, "shared", error);
  mho_shared_unpack(bytes, quantities->shared);
  for (int i = 0; i < MHO_SHARED_COUNT; i++)
    if (!isfinite(quantities->shared[i])) return fail_content(s, row, "shared", error);
  return MHO_OK;
}

static mho_status select_all(mho_screen_store *s, sqlite3_stmt **statement, mho_error *error)
{
  mho_buffer sql = {0};
  mho_buffer_add(&sql, "SELECT row");
  for (int i = 0; i < MHO_SCREEN_QUANTITIES; i++) {
    mho_buffer_add(&sql, ", ");
    mho_store_column(&sql, i);
  }
  mho_buffer_add(&sql, ", shared FROM candidate ORDER BY row");
  mho_status status = mho_buffer_check(&sql, "screen", error);
  if (status == MHO_OK &&
      sqlite3_prepare_v2(s->database, sql.data, -1, statement, NULL) != SQLITE_OK)
    status = fail_reading(s, error);
  mho_buffer_clear(&sql);
  return status;
}

mho_status mho_screen_store_load(mho_screen_store *s, mho_screen_quantities **quantities,
                                 uint64_t **row, size_t *count, mho_error *error)
{
  size_t room = (size_t)s->counts.good;
  sqlite3_stmt *statement = NULL;
  *count = 0;
  *quantities = malloc((room + 1) * sizeof **quantities);
  *row = malloc((room + 1) * sizeof **row);
  mho_status status = *quantities && *row ? select_all(s, &statement, error) : no_memory(error);
  int code = SQLITE_DONE;
  while (status == MHO_OK && *count < room && (code = sqlite3_step(statement)) == SQLITE_ROW) {
    status = read_row(s, statement, &(*quantities)[*count], error);
    (*row)[(*count)++] = (uint64_t)sqlite3_column_int64(statement, 0);
  }
  if (status == MHO_OK && code != SQLITE_ROW && code != SQLITE_DONE) status = fail_reading(s, error);
  if (status == MHO_OK && *count < room)
    status = fail_content(s, (sqlite3_int64)*count + 1, "rows are missing", error);
  sqlite3_finalize(statement);
  if (status != MHO_OK) {
    free(*quantities);
    free(*row);
    *quantities = NULL;
    *row = NULL;
    *count = 0;
  }
  return status;
}

/* Steps a statement that finds at most one row of texts. */
static mho_status find(mho_screen_store *s, sqlite3_stmt **statement, const char *sql, uint64_t key,
                       mho_screen_text *text, mho_error *error)
{
  *text = (mho_screen_text){.name = ""};
  if (!*statement && sqlite3_prepare_v2(s->database, sql, -1, statement, NULL) != SQLITE_OK)
    return fail_reading(s, error);
  sqlite3_reset(*statement);
  sqlite3_bind_int64(*statement, 1, (sqlite3_int64)key);
  int code = sqlite3_step(*statement);
  if (code == SQLITE_DONE) return MHO_OK;
  if (code != SQLITE_ROW) return fail_reading(s, error);
  text->row = (uint64_t)sqlite3_column_int64(*statement, 0);
  text->name = (const char *)sqlite3_column_text(*statement, 1);
  text->line = (long)sqlite3_column_int64(*statement, 2);
  return text->name ? MHO_OK : no_memory(error);
}

mho_status mho_screen_store_candidate(mho_screen_store *s, uint64_t row, mho_screen_text *text,
                                      mho_error *error)
{
  mho_status status =
      find(s, &s->find_candidate, "SELECT row, candidate, line, smiles FROM candidate WHERE row = ?",
           row, text, error);
  if (status == MHO_OK && text->row)
    text->smiles = (const char *)sqlite3_column_text(s->find_candidate, 3);
  return status;
}

mho_status mho_screen_store_failure(mho_screen_store *s, uint64_t after, mho_screen_text *text,
                                    mho_error *error)
{
  mho_status status = find(s, &s->find_failure,
                           "SELECT row, candidate, line, reason FROM failure WHERE row > ? "
                           "ORDER BY row LIMIT 1", after, text, error);
  if (status != MHO_OK || !text->row) return status;
  text->reason = (const char *)sqlite3_column_text(s->find_failure, 3);
  return text->reason ? MHO_OK : no_memory(error);
}
