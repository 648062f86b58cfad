/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "screen/store.h"

#include <errno.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>
#include <unistd.h>

#include "base/buffer.h"
#include "base/text.h"
#include "screen/shared.h"

#define MEMORY ":memory:"

enum { BUSY_MS = 10000 };

static mho_status no_memory(mho_error *error)
{
  return mho_fail(error, MHO_ERR_MEMORY, "screen", NULL, "out of memory");
}

/* What SQLite says about its last call. */
static mho_status fail_database(const mho_screen_store *s, mho_error *error)
{
  sqlite3 *db = s->database;
  int written = errno; /* SQLite does not keep it where a write fails */
  int code = db ? sqlite3_errcode(db) : SQLITE_NOMEM;
  if (code == SQLITE_NOMEM || sqlite3_extended_errcode(db) == SQLITE_IOERR_NOMEM)
    return no_memory(error);
  if (code == SQLITE_NOTADB || code == SQLITE_CORRUPT || code == SQLITE_ERROR)
    return mho_fail_at(error, MHO_ERR_RANGE, "screen", s->path, 0, 0, NULL,
                       "is not a store of mho screen, or is damaged: %s", sqlite3_errmsg(db));
  if (code == SQLITE_BUSY || code == SQLITE_LOCKED)
    return mho_fail_at(error, MHO_ERR_WRITE, "screen", s->path, 0, 0, NULL,
                       "is in use by another program");
  int cause = sqlite3_system_errno(db);
  if (!cause && (written == EFBIG || written == EDQUOT)) cause = written;
  return mho_fail_at(error, MHO_ERR_WRITE, "screen", s->path, 0, 0, NULL, "cannot be written: %s",
                     code == SQLITE_FULL ? strerror(ENOSPC)
                     : code == SQLITE_IOERR && cause ? strerror(cause) : sqlite3_errmsg(db));
}

static mho_status execute(mho_screen_store *s, const char *sql, mho_error *error)
{
  return sqlite3_exec(s->database, sql, NULL, NULL, NULL) == SQLITE_OK ? MHO_OK
                                                                       : fail_database(s, error);
}

static mho_status prepare(mho_screen_store *s, const char *sql, sqlite3_stmt **statement,
                          mho_error *error)
{
  return sqlite3_prepare_v2(s->database, sql, -1, statement, NULL) == SQLITE_OK
             ? MHO_OK : fail_database(s, error);
}

/* One whole number; NULL counts as 0. */
static mho_status ask(mho_screen_store *s, const char *sql, sqlite3_int64 *value, mho_error *error)
{
  sqlite3_stmt *statement = NULL;
  mho_status status = prepare(s, sql, &statement, error);
  if (status != MHO_OK) return status;
  int code = sqlite3_step(statement);
  *value = code == SQLITE_ROW ? sqlite3_column_int64(statement, 0) : 0;
  if (code != SQLITE_ROW && code != SQLITE_DONE) status = fail_database(s, error);
  sqlite3_finalize(statement);
  return status;
}

/* --- schema --------------------------------------------------------------- */

static const char *sql_type(const mho_screen_quantity *q)
{
  if (q->form == MHO_FORM_LINKER || q->form == MHO_FORM_WARNINGS) return "TEXT";
  return q->whole ? "INTEGER" : "REAL";
}

/* `low` of a table is low_log10_G0 here: a store has no manual beside it. */
void mho_store_column(mho_buffer *sql, int index)
{
  const mho_screen_quantity *q = mho_screen_quantity_at(index);
  bool bare = q->form == MHO_FORM_CONDUCTANCE && !strstr(q->column, "log10");
  mho_buffer_print(sql, "%s%s", q->column, bare ? "_log10_G0" : "");
}

static void add_schema(mho_buffer *sql)
{
  mho_buffer_print(sql, "PRAGMA application_id=%d; PRAGMA user_version=%d;"
                        "CREATE TABLE meta(key TEXT PRIMARY KEY, value TEXT NOT NULL) WITHOUT ROWID;"
                        "CREATE TABLE candidate(row INTEGER PRIMARY KEY, candidate TEXT NOT NULL, "
                        "line INTEGER, smiles TEXT",
                   MHO_STORE_APPLICATION, MHO_STORE_VERSION);
  for (int i = 0; i < MHO_SCREEN_QUANTITIES; i++) {
    mho_buffer_add(sql, ", ");
    mho_store_column(sql, i);
    mho_buffer_print(sql, " %s", sql_type(mho_screen_quantity_at(i)));
  }
  mho_buffer_add(sql, ", shared BLOB NOT NULL);"
                      "CREATE TABLE failure(row INTEGER PRIMARY KEY, candidate TEXT NOT NULL, "
                      "line INTEGER, reason TEXT NOT NULL);");
}

static mho_status add_meta(mho_screen_store *s, const mho_meta *meta, mho_error *error)
{
  sqlite3_stmt *statement = NULL;
  mho_status status = prepare(s, "INSERT INTO meta VALUES(?, ?)", &statement, error);
  for (int i = 0; status == MHO_OK && i < meta->count; i++) {
    sqlite3_bind_text(statement, 1, meta->pair[i].key, -1, SQLITE_STATIC);
    sqlite3_bind_text(statement, 2, meta->pair[i].value, -1, SQLITE_STATIC);
    if (sqlite3_step(statement) != SQLITE_DONE) status = fail_database(s, error);
    sqlite3_reset(statement);
  }
  sqlite3_finalize(statement);
  return status;
}

static mho_status create(mho_screen_store *s, const mho_meta *meta, mho_error *error)
{
  mho_buffer sql = {0};
  add_schema(&sql);
  mho_status status = mho_buffer_check(&sql, "screen", error);
  if (status == MHO_OK) status = execute(s, sql.data, error);
  if (status == MHO_OK) status = add_meta(s, meta, error);
  mho_buffer_clear(&sql);
  return status;
}

/* --- opening -------------------------------------------------------------- */

static mho_status read_meta(mho_screen_store *s, mho_error *error)
{
  sqlite3_stmt *statement = NULL;
  mho_status status = prepare(s, "SELECT key, value FROM meta ORDER BY key", &statement, error);
  int code = SQLITE_DONE;
  while (status == MHO_OK && (code = sqlite3_step(statement)) == SQLITE_ROW) {
    const char *key = (const char *)sqlite3_column_text(statement, 0);
    const char *value = (const char *)sqlite3_column_text(statement, 1);
    if (key && value) mho_meta_add(&s->meta, key, "%s", value);
    else s->meta.failed = true;
  }
  if (status == MHO_OK && code != SQLITE_DONE) status = fail_database(s, error);
  sqlite3_finalize(statement);
  return status == MHO_OK && s->meta.failed ? no_memory(error) : status;
}

/* The rows 1 to n are there, so that the last one tells their number. */
static mho_status read_last(mho_screen_store *s, sqlite3_int64 *last, mho_error *error)
{
  return ask(s, "SELECT max(coalesce((SELECT max(row) FROM candidate), 0), "
                "coalesce((SELECT max(row) FROM failure), 0))", last, error);
}

static mho_status read_counts(mho_screen_store *s, mho_error *error)
{
  sqlite3_int64 last = 0, bad = 0;
  mho_status status = read_last(s, &last, error);
  if (status == MHO_OK) status = ask(s, "SELECT count(*) FROM failure", &bad, error);
  const char *rows = mho_meta_find(&s->meta, "rows");
  s->counts.rows = rows ? strtoull(rows, NULL, 10) : 0;
  if (status == MHO_OK && (bad > last || (uint64_t)last > s->counts.rows))
    return mho_fail_at(error, MHO_ERR_RANGE, "screen", s->path, 0, 0, NULL,
                       "is damaged: it holds other rows than its list has");
  s->counts.bad = (uint64_t)bad;
  s->counts.good = (uint64_t)(last - bad);
  return status;
}

/* Whether there is anything in the file, and whether that is ours. */
static mho_status look_inside(mho_screen_store *s, bool *empty, mho_error *error)
{
  sqlite3_int64 tables = 0, application = 0, version = 0;
  mho_status status = ask(s, "SELECT count(*) FROM sqlite_master", &tables, error);
  if (status == MHO_OK) status = ask(s, "PRAGMA application_id", &application, error);
  if (status == MHO_OK) status = ask(s, "PRAGMA user_version", &version, error);
  *empty = tables == 0 && application == 0;
  if (status != MHO_OK || *empty) return status;
  if (application != MHO_STORE_APPLICATION)
    return mho_fail_at(error, MHO_ERR_RANGE, "screen", s->path, 0, 0, NULL,
                       "is an SQLite file of something else, not a store of mho screen");
  if (version != MHO_STORE_VERSION)
    return mho_fail_at(error, MHO_ERR_RANGE, "screen", s->path, 0, 0, NULL,
                       "has version %lld of the store; this program reads version %d",
                       (long long)version, MHO_STORE_VERSION);
  status = read_meta(s, error);
  return status == MHO_OK ? read_counts(s, error) : status;
}

static mho_status connect(const char *path, int flags, mho_screen_store **store, mho_error *error)
{
  mho_screen_store *s = *store = calloc(1, sizeof *s);
  if (!s) return no_memory(error);
  s->path = mho_copy_text(path);
  if (!s->path) return no_memory(error);
  if (sqlite3_open_v2(path, &s->database, flags, NULL) != SQLITE_OK) {
    if (!s->database || sqlite3_errcode(s->database) == SQLITE_NOMEM) return no_memory(error);
    int cause = sqlite3_system_errno(s->database);
    return mho_fail_at(error, flags & SQLITE_OPEN_CREATE ? MHO_ERR_WRITE : MHO_ERR_FILE, "screen",
                       path, 0, 0, NULL, "cannot be opened: %s",
                       cause ? strerror(cause) : sqlite3_errmsg(s->database));
  }
  sqlite3_busy_timeout(s->database, BUSY_MS);
  return MHO_OK;
}

mho_status mho_screen_store_open(const char *path, mho_screen_store **store, mho_error *error)
{
  /* Not read-only: the journal of a killed writer may have to be rolled back. */
  bool empty = true;
  mho_status status = connect(path, SQLITE_OPEN_READWRITE, store, error);
  if (status == MHO_OK) status = execute(*store, "PRAGMA query_only=1", error);
  if (status == MHO_OK) status = look_inside(*store, &empty, error);
  if (status == MHO_OK && empty)
    status = mho_fail_at(error, MHO_ERR_RANGE, "screen", path, 0, 0, NULL,
                         "is an empty store: nothing has been computed yet");
  if (status != MHO_OK) {
    mho_screen_store_close(*store);
    *store = NULL;
  }
  return status;
}

static mho_status prepare_writing(mho_screen_store *s, mho_error *error)
{
  mho_buffer sql = {0};
  mho_buffer_add(&sql, "INSERT INTO candidate VALUES(?,?,?,?");
  for (int i = 0; i < MHO_SCREEN_QUANTITIES; i++) mho_buffer_add(&sql, ",?");
  mho_buffer_add(&sql, ",?)");
  mho_status status = mho_buffer_check(&sql, "screen", error);
  if (status == MHO_OK) status = prepare(s, sql.data, &s->add_candidate, error);
  mho_buffer_clear(&sql);
  if (status != MHO_OK) return status;
  return prepare(s, "INSERT INTO failure VALUES(?,?,?,?)", &s->add_failure, error);
}

mho_status mho_store_begin(const char *path, bool resume, const mho_meta *meta,
                           mho_screen_store **store, mho_error *error)
{
  struct stat what;
  bool exists = strcmp(path, MEMORY) && lstat(path, &what) == 0, empty = true, ours = false;
  *store = NULL;
  if (exists && !resume)
    return mho_fail_at(error, MHO_ERR_RANGE, "screen", path, 0, 0, "store",
                       "exists already and is left alone; --resume goes on with a store, or "
                       "choose another name");
  mho_status status =
      connect(path, SQLITE_OPEN_READWRITE | SQLITE_OPEN_CREATE, store, error);
  mho_screen_store *s = *store;
  if (status == MHO_OK)
    status = execute(s, "PRAGMA journal_mode=DELETE; PRAGMA synchronous=FULL; BEGIN IMMEDIATE", error);
  if (status == MHO_OK) status = look_inside(s, &empty, error);
  if (status == MHO_OK && !empty) status = mho_meta_compare(&s->meta, meta, path, error);
  if (status == MHO_OK && empty) {
    ours = !exists && strcmp(path, MEMORY);
    status = create(s, meta, error);
    if (status == MHO_OK) status = look_inside(s, &empty, error);
  }
  if (status == MHO_OK) status = execute(s, "COMMIT", error);
  if (status != MHO_OK && ours) unlink(path);
  if (status == MHO_OK) status = prepare_writing(s, error);
  if (status != MHO_OK) {
    mho_screen_store_close(s);
    *store = NULL;
  }
  return status;
}

void mho_screen_store_close(mho_screen_store *s)
{
  if (!s) return;
  sqlite3_finalize(s->add_candidate);
  sqlite3_finalize(s->add_failure);
  sqlite3_finalize(s->find_candidate);
  sqlite3_finalize(s->find_failure);
  sqlite3_close(s->database); /* rolls an open transaction back */
  mho_meta_clear(&s->meta);
  free(s->path);
  free(s);
}

const mho_screen_counts *mho_screen_store_counts(const mho_screen_store *s) { return &s->counts; }

const char *mho_screen_store_meta(const mho_screen_store *s, const char *key)
{
  return mho_meta_find(&s->meta, key);
}

/* --- writing -------------------------------------------------------------- */

mho_status mho_store_begin_batch(mho_screen_store *s, mho_error *error)
{
  sqlite3_int64 last = 0;
  mho_status status = execute(s, "BEGIN IMMEDIATE", error);
  if (status == MHO_OK) status = read_last(s, &last, error);
  if (status != MHO_OK || (uint64_t)last == s->counts.good + s->counts.bad) return status;
  return mho_fail_at(error, MHO_ERR_WRITE, "screen", s->path, 0, 0, "store",
                     "another program is writing to it at the same time");
}

static void bind_words(sqlite3_stmt *statement, int column, unsigned warnings)
{
  char words[400] = "";
  size_t used = 0;
  for (int i = 0; i < MHO_WARNING_COUNT; i++) {
    const char *word = mho_warning_word(i);
    if (!(warnings >> i & 1) || used + strlen(word) + 2 > sizeof words) continue;
    if (used) words[used++] = ' ';
    strcpy(words + used, word);
    used += strlen(word);
  }
  sqlite3_bind_text(statement, column, words, (int)used, SQLITE_TRANSIENT);
}

static void bind_quantity(sqlite3_stmt *statement, int column, int index,
                          const mho_screen_quantities *quantities)
{
  const mho_screen_quantity *q = mho_screen_quantity_at(index);
  double value;
  if (!mho_screen_value(quantities, index, &value)) sqlite3_bind_null(statement, column);
  else if (q->form == MHO_FORM_LINKER)
    sqlite3_bind_text(statement, column, mho_linker_name((mho_linker_kind)value), -1, SQLITE_STATIC);
  else if (q->form == MHO_FORM_WARNINGS) bind_words(statement, column, (unsigned)value);
  else if (q->whole) sqlite3_bind_int64(statement, column, (sqlite3_int64)value);
  else sqlite3_bind_double(statement, column, value);
}

static void bind_place(sqlite3_stmt *statement, const mho_candidate *c)
{
  sqlite3_bind_int64(statement, 1, (sqlite3_int64)c->row);
  sqlite3_bind_text(statement, 2, c->name, -1, SQLITE_STATIC);
  if (c->line > 0) sqlite3_bind_int64(statement, 3, c->line);
  else sqlite3_bind_null(statement, 3);
}

mho_status mho_store_add(mho_screen_store *s, const mho_candidate *c,
                         const mho_screen_quantities *quantities, mho_error *error)
{
  sqlite3_stmt *statement = c->fault ? s->add_failure : s->add_candidate;
  unsigned char shared[MHO_SHARED_BYTES];
  bind_place(statement, c);
  if (c->fault) {
    sqlite3_bind_text(statement, 4, c->fault, -1, SQLITE_STATIC);
  } else {
    sqlite3_bind_text(statement, 4, c->smiles, -1, SQLITE_STATIC); /* NULL binds NULL */
    for (int i = 0; i < MHO_SCREEN_QUANTITIES; i++) bind_quantity(statement, 5 + i, i, quantities);
    mho_shared_pack(quantities->shared, shared);
    sqlite3_bind_blob(statement, 5 + MHO_SCREEN_QUANTITIES, shared, sizeof shared, SQLITE_STATIC);
  }
  bool good = sqlite3_step(statement) == SQLITE_DONE;
  mho_status status = good ? MHO_OK : fail_database(s, error);
  sqlite3_reset(statement);
  if (!good) return status;
  if (c->fault) s->counts.bad++;
  else s->counts.good++;
  return MHO_OK;
}

mho_status mho_store_commit(mho_screen_store *s, mho_error *error)
{
  return execute(s, "COMMIT", error);
}

mho_status mho_store_bytes(mho_screen_store *s, double *bytes, mho_error *error)
{
  sqlite3_int64 pages = 0, size = 0;
  mho_status status = ask(s, "PRAGMA page_count", &pages, error);
  if (status == MHO_OK) status = ask(s, "PRAGMA page_size", &size, error);
  *bytes = (double)pages * (double)size;
  return status;
}
