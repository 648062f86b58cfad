/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "screen/candidates.h"

#include <dirent.h>
#include <errno.h>
#include <sha2.h>
#include <stdlib.h>
#include <string.h>
#include <strings.h>
#include <sys/stat.h>

#include <mho/molecule_file.h>

#include "base/text.h"
#include "input/records.h"
#include "molecule/list.h"

struct mho_candidates {
  char *path;
  const mho_settings *defaults, *settings; /* or NULL */
  mho_settings both;                       /* one on top of the other */
  const char *format;
  uint64_t row; /* of the candidate before */
  mho_list *list;
  mho_records *records; /* of the file, or of the file of a folder at `at` */
  char **file;          /* names in the folder, sorted by their bytes */
  size_t files, room, at, ignored;
  bool passing; /* candidates are counted, not read */
};

static mho_status no_memory(mho_error *error)
{
  return mho_fail(error, MHO_ERR_MEMORY, "screen", NULL, "out of memory");
}

/* --- one candidate -------------------------------------------------------- */

void mho_candidate_init(mho_candidate *c)
{
  *c = (mho_candidate){0};
  mho_molecule_init(&c->molecule);
}

void mho_candidate_clear(mho_candidate *c)
{
  free(c->name);
  free(c->smiles);
  free(c->fault);
  mho_molecule_clear(&c->molecule);
  mho_candidate_init(c);
}

mho_status mho_candidate_fail(mho_candidate *c, const mho_error *cause)
{
  const mho_cause *first = &cause->cause[0];
  if (cause->count == 0) c->fault = mho_copy_text("it cannot be used");
  else c->fault = mho_copy_text(first->message);
  if (cause->count && first->line && !c->place.file) c->line = first->line;
  return c->fault ? MHO_OK : MHO_ERR_MEMORY;
}

/* --- opening -------------------------------------------------------------- */

static bool ends_with(const char *path, const char *const *endings)
{
  const char *dot = strrchr(path, '.');
  for (; dot && *endings; endings++)
    if (!strcasecmp(dot, *endings)) return true;
  return false;
}

static const char *const smi_endings[] = {".smi", NULL}, *const csv_endings[] = {".csv", ".tsv", NULL},
                  *const yaml_endings[] = {".yaml", ".yml", NULL};

static mho_status add_file(mho_candidates *c, const char *name)
{
  if (c->files == c->room) {
    size_t room = c->room ? 2 * c->room : 64;
    char **larger = realloc(c->file, room * sizeof *larger);
    if (!larger) return MHO_ERR_MEMORY;
    c->file = larger;
    c->room = room;
  }
  c->file[c->files] = mho_copy_text(name);
  return c->file[c->files] ? (c->files++, MHO_OK) : MHO_ERR_MEMORY;
}

static int compare_names(const void *a, const void *b)
{
  return strcmp(*(char *const *)a, *(char *const *)b);
}

static mho_status open_folder(mho_candidates *c, mho_error *error)
{
  DIR *folder = opendir(c->path);
  if (!folder)
    return mho_fail_at(error, MHO_ERR_FILE, "screen", c->path, 0, 0, NULL, "cannot be read: %s",
                       strerror(errno));
  mho_status status = MHO_OK;
  const struct dirent *entry;
  while (status == MHO_OK && (entry = readdir(folder))) {
    if (entry->d_name[0] == '.') continue;
    if (ends_with(entry->d_name, yaml_endings) || mho_records_is_file_name(entry->d_name))
      status = add_file(c, entry->d_name);
    else c->ignored++;
  }
  closedir(folder);
  if (status != MHO_OK) return no_memory(error);
  if (c->files == 0)
    return mho_fail_at(error, MHO_ERR_FILE, "screen", c->path, 0, 0, NULL,
                       "holds no molecule files (.yaml, .mol, .sdf, .xyz)");
  qsort(c->file, c->files, sizeof *c->file, compare_names);
  return MHO_OK;
}

static mho_status open_source(mho_candidates *c, mho_error *error)
{
  struct stat what;
  if (stat(c->path, &what) != 0)
    return mho_fail_at(error, MHO_ERR_FILE, "screen", c->path, 0, 0, NULL, "cannot be read: %s",
                       strerror(errno));
  if (S_ISDIR(what.st_mode)) {
    c->format = "folder";
    return open_folder(c, error);
  }
  if (!S_ISREG(what.st_mode))
    return mho_fail_at(error, MHO_ERR_FILE, "screen", c->path, 0, 0, NULL,
                       "is not a regular file; a list is read more than once");
  if (mho_records_is_file_name(c->path)) {
    c->format = "structures";
    return mho_records_open(c->path, &c->records, error);
  }
  c->format = ends_with(c->path, csv_endings) ? "csv" : "smi";
  if (!ends_with(c->path, csv_endings) && !ends_with(c->path, smi_endings))
    return mho_fail_at(error, MHO_ERR_FILE, "screen", c->path, 0, 0, NULL,
                       "is not a list by its ending; allowed are .smi, .csv, .tsv, .sdf, .mol, "
                       ".xyz and a folder of molecule files");
  return mho_list_open(c->path, &c->list, error);
}

mho_status mho_candidates_open(const char *path, const mho_settings *defaults,
                               const mho_settings *settings, mho_candidates **candidates,
                               mho_error *error)
{
  *candidates = NULL;
  mho_candidates *c = calloc(1, sizeof *c);
  if (!c) return no_memory(error);
  c->defaults = defaults;
  c->settings = settings;
  c->path = mho_copy_text(path);
  for (size_t n = c->path ? strlen(c->path) : 0; n > 1 && c->path[n - 1] == '/';) c->path[--n] = '\0';
  bool good = c->path && mho_settings_merge(&c->both, defaults) == MHO_OK &&
              mho_settings_merge(&c->both, settings) == MHO_OK;
  mho_status status = good ? open_source(c, error) : no_memory(error);
  if (status == MHO_OK) *candidates = c;
  else mho_candidates_close(c);
  return status;
}

void mho_candidates_close(mho_candidates *c)
{
  if (!c) return;
  mho_list_close(c->list);
  mho_records_close(c->records);
  for (size_t i = 0; i < c->files; i++) free(c->file[i]);
  free(c->file);
  free(c->path);
  mho_settings_clear(&c->both);
  free(c);
}

const mho_settings *mho_candidates_settings(const mho_candidates *c) { return &c->both; }

const char *mho_candidates_format(const mho_candidates *c) { return c->format; }
size_t mho_candidates_ignored(const mho_candidates *c) { return c->ignored; }

/* --- reading -------------------------------------------------------------- */

/* A cause of a row is its fault; what is no fault of the row ends the work. */
static mho_status judge(mho_candidate *candidate, mho_status status, const mho_error *own,
                        mho_error *error)
{
  if (status == MHO_OK) return MHO_OK;
  if (status == MHO_ERR_MEMORY || mho_candidate_fail(candidate, own) != MHO_OK)
    return no_memory(error);
  return MHO_OK;
}

static mho_status set_name(mho_candidate *candidate, const char *name, mho_error *error)
{
  if (candidate->name) return MHO_OK;
  candidate->name = *name ? mho_copy_text(name)
                          : mho_print_text("%llu", (unsigned long long)candidate->row);
  return candidate->name ? MHO_OK : no_memory(error);
}

static mho_status next_row(mho_candidates *c, mho_candidate *candidate, mho_error *error)
{
  mho_list_row row;
  mho_error own;
  mho_error_init(&own);
  mho_status status = mho_list_next(c->list, &row, &own);
  if (status == MHO_ERR_FILE)
    return mho_fail_at(error, status, "screen", c->path, 0, 0, NULL, "%s", own.cause[0].message);
  if (status == MHO_OK && !row.smiles) return MHO_OK;
  candidate->row = ++c->row;
  if (status != MHO_OK) candidate->line = own.cause[0].line;
  if (status == MHO_OK) {
    candidate->place = row.place;
    candidate->line = row.place.line;
    candidate->smiles = mho_copy_text(row.smiles);
    if (!candidate->smiles) return no_memory(error);
  }
  status = judge(candidate, status, &own, error);
  return status == MHO_OK ? set_name(candidate, row.name ? row.name : "", error) : status;
}

static mho_status next_record(mho_candidates *c, mho_candidate *candidate, mho_record *record,
                              mho_error *error)
{
  mho_error own;
  mho_error_init(&own);
  mho_status status = MHO_OK;
  if (c->passing) mho_records_skip(c->records, record);
  else
    status = mho_molecule_read_record(c->records, &c->both, 0, &candidate->molecule, record,
                                      &own);
  if (status == MHO_ERR_FILE)
    return mho_fail_at(error, status, "screen", c->path, 0, 0, NULL, "%s", own.cause[0].message);
  if (record->number == 0) return status == MHO_ERR_MEMORY ? no_memory(error) : MHO_OK;
  candidate->row = ++c->row;
  candidate->line = record->place.line;
  return judge(candidate, status, &own, error);
}

static char *stem_of(const char *name, long record)
{
  int length = (int)(strrchr(name, '.') - name);
  return record > 1 ? mho_print_text("%.*s (record %ld)", length, name, record)
                    : mho_print_text("%.*s", length, name);
}

static mho_status read_yaml(mho_candidates *c, const char *path, mho_candidate *candidate,
                            mho_error *error)
{
  mho_error own;
  mho_error_init(&own);
  candidate->row = ++c->row;
  c->at++;
  if (c->passing) return MHO_OK;
  mho_status status = mho_molecule_read(path, c->defaults, c->settings, &candidate->molecule, &own);
  if (status == MHO_OK) candidate->name = mho_copy_text(candidate->molecule.name);
  return judge(candidate, status, &own, error);
}

/* A file of structures that cannot be opened is a bad candidate. */
static mho_status begin_records(mho_candidates *c, const char *path, mho_candidate *candidate,
                                mho_error *error)
{
  mho_error own;
  mho_error_init(&own);
  mho_status status = mho_records_open(path, &c->records, &own);
  if (status == MHO_OK) return MHO_OK;
  candidate->row = ++c->row;
  c->at++;
  return judge(candidate, status, &own, error);
}

static mho_status next_of_folder(mho_candidates *c, mho_candidate *candidate, mho_error *error)
{
  mho_status status = MHO_OK;
  while (status == MHO_OK && candidate->row == 0 && c->at < c->files) {
    const char *name = c->file[c->at];
    mho_record record = {.name = ""};
    char *path = c->records ? NULL : mho_print_text("%s/%s", c->path, name);
    if (!path && !c->records) return no_memory(error);
    if (path && ends_with(name, yaml_endings)) status = read_yaml(c, path, candidate, error);
    else if (path) status = begin_records(c, path, candidate, error);
    if (status == MHO_OK && c->records) {
      status = next_record(c, candidate, &record, error);
      if (status == MHO_OK && record.number == 0) {
        mho_records_close(c->records);
        c->records = NULL;
        c->at++;
      } else if (status == MHO_OK && *record.name) {
        status = set_name(candidate, record.name, error);
      }
    }
    free(path);
    if (status != MHO_OK || candidate->row == 0 || candidate->name) continue;
    candidate->name = stem_of(name, record.number);
    if (!candidate->name) status = no_memory(error);
  }
  return status;
}

mho_status mho_candidates_next(mho_candidates *c, mho_candidate *candidate, mho_error *error)
{
  if (c->list) return next_row(c, candidate, error);
  if (c->files) return next_of_folder(c, candidate, error);
  mho_record record;
  mho_status status = next_record(c, candidate, &record, error);
  return status == MHO_OK && candidate->row ? set_name(candidate, record.name, error) : status;
}

mho_status mho_candidates_skip(mho_candidates *c, uint64_t count, const volatile int *cancel,
                               uint64_t *passed, mho_error *error)
{
  mho_status status = MHO_OK;
  c->passing = true;
  for (*passed = 0; status == MHO_OK && *passed < count; ++*passed) {
    mho_candidate candidate;
    mho_candidate_init(&candidate);
    status = mho_candidates_next(c, &candidate, error);
    bool there = candidate.row > 0;
    mho_candidate_clear(&candidate);
    if (status != MHO_OK || !there) break;
    if (cancel && *cancel) status = mho_fail(error, MHO_ERR_CANCELLED, "screen", NULL, "interrupted");
  }
  c->passing = false;
  return status;
}

/* --- hash ----------------------------------------------------------------- */

static mho_status hash_file(const char *path, char digest[MHO_DIGEST_SIZE], mho_error *error)
{
  if (SHA256File(path, digest)) return MHO_OK;
  return mho_fail_at(error, MHO_ERR_FILE, "screen", path, 0, 0, NULL, "cannot be read again");
}

mho_status mho_candidates_digest(const mho_candidates *c, char digest[MHO_DIGEST_SIZE],
                                 mho_error *error)
{
  if (!c->files) return hash_file(c->path, digest, error);
  SHA2_CTX context;
  SHA256Init(&context);
  mho_status status = MHO_OK;
  for (size_t i = 0; status == MHO_OK && i < c->files; i++) {
    char *path = mho_print_text("%s/%s", c->path, c->file[i]);
    if (!path) return no_memory(error);
    status = hash_file(path, digest, error);
    free(path);
    SHA256Update(&context, (const uint8_t *)c->file[i], strlen(c->file[i]) + 1);
    SHA256Update(&context, (const uint8_t *)digest, MHO_DIGEST_SIZE);
  }
  SHA256End(&context, digest);
  return status;
}
