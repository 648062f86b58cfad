/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * From the FILE arguments to junctions, and from tables to where they go.
 */
#include <errno.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/ioctl.h>
#include <unistd.h>

#include "base/text.h"
#include "cli/command.h"
#include "input/records.h"
#include "molecule/list.h"

enum { WIDTH_WITHOUT_TERMINAL = 120 };

static bool has_extension(const char *text, const char *const *known, size_t count)
{
  const char *dot = strrchr(text, '.');
  for (size_t i = 0; dot && i < count; i++)
    if (!strcmp(dot, known[i])) return true;
  return false;
}

static bool is_list(const char *text)
{
  static const char *const known[] = {".smi", ".csv", ".tsv"};
  return has_extension(text, known, 3);
}

/* Ends like a file that holds a molecule, so it is no SMILES. */
static bool is_file_name(const char *text)
{
  static const char *const known[] = {".yaml", ".yml"};
  return is_list(text) || mho_records_is_file_name(text) || has_extension(text, known, 2);
}

/* One more, empty; NULL without memory. */
static subject *add_subject(subjects *list, mho_error *error)
{
  if (list->count == list->capacity) {
    int capacity = list->capacity ? 2 * list->capacity : 8;
    subject *larger = realloc(list->item, (size_t)capacity * sizeof *larger);
    if (!larger) {
      mho_fail(error, MHO_ERR_MEMORY, "cli", NULL, "out of memory");
      return NULL;
    }
    list->item = larger;
    list->capacity = capacity;
  }
  subject *s = &list->item[list->count++];
  memset(s, 0, sizeof *s);
  mho_molecule_init(&s->molecule);
  return s;
}

static void drop_last(subjects *list)
{
  subject *s = &list->item[--list->count];
  mho_molecule_clear(&s->molecule);
  mho_junction_clear(&s->junction);
}

static mho_status complete(subject *s, bool need_contacts, mho_error *error)
{
  mho_status status = mho_junction_build(&s->molecule, &s->junction, error);
  if (status == MHO_OK && need_contacts)
    status = mho_junction_require_contacts(&s->junction, &s->molecule, error);
  if (status == MHO_OK) s->warnings = mho_molecule_warnings(&s->molecule, &s->junction);
  return status;
}

static const subject *find_name(const subjects *list, const char *name, int before)
{
  for (int i = 0; i < before; i++)
    if (!strcmp(list->item[i].molecule.name, name)) return &list->item[i];
  return NULL;
}

static mho_status check_name(const subjects *list, const char *argument, mho_error *error)
{
  const mho_molecule *last = &list->item[list->count - 1].molecule;
  const subject *same = find_name(list, last->name, list->count - 1);
  if (!same) return MHO_OK;
  const char *source = same->molecule.source ? same->molecule.source : "the arguments";
  return mho_fail_at(error, MHO_ERR_KEY, "cli", argument, 0, 0, "name",
                     "molecule '%s' stands in %s already; names must differ", last->name, source);
}

/* A file of many molecules: rows of a list or records of structures. */
typedef struct {
  const command *cmd;
  const char *file;
  mho_list *rows;       /* one of the two */
  mho_records *records;
  bool need_contacts;
} many;

/* The row or record gives a subject its name; the place is added where another
 * has that name. */
static mho_status set_name(const many *m, const char *name, const char *unit, long number,
                           subjects *list, mho_error *error)
{
  subject *s = &list->item[list->count - 1];
  bool repeated = find_name(list, name, list->count - 1) != NULL;
  s->molecule.name = repeated ? mho_print_text("%s (%s %ld)", name, unit, number)
                              : mho_copy_text(name);
  s->molecule.source = mho_copy_text(m->file);
  if (s->molecule.name && s->molecule.source) return MHO_OK;
  return mho_fail(error, MHO_ERR_MEMORY, "cli", NULL, "out of memory");
}

static mho_status read_row(const many *m, subjects *list, bool *end, mho_error *error)
{
  mho_list_row row;
  mho_status status = mho_list_next(m->rows, &row, error);
  *end = status == MHO_OK && !row.smiles;
  if (status != MHO_OK || *end) return status;
  subject *s = add_subject(list, error);
  if (!s) return MHO_ERR_MEMORY;
  status = set_name(m, row.name[0] ? row.name : row.smiles, "line", row.place.line, list, error);
  if (status == MHO_OK)
    status = mho_molecule_read_smiles(row.smiles, &row.place, &m->cmd->overrides, 0, &s->molecule,
                                      error);
  return status == MHO_OK ? complete(s, m->need_contacts, error) : status;
}

static mho_status read_record(const many *m, subjects *list, bool *end, mho_error *error)
{
  mho_record record;
  subject *s = add_subject(list, error);
  if (!s) return MHO_ERR_MEMORY;
  mho_status status = mho_molecule_read_record(m->records, &m->cmd->overrides, 0, &s->molecule,
                                               &record, error);
  *end = status == MHO_OK && !record.number;
  if (*end) drop_last(list);
  if (status != MHO_OK || *end) return status;
  char *number = mho_print_text("record %ld", record.number);
  status = number ? set_name(m, record.name[0] ? record.name : number, "record", record.number,
                             list, error)
                  : mho_fail(error, MHO_ERR_MEMORY, "cli", NULL, "out of memory");
  free(number);
  return status == MHO_OK ? complete(s, m->need_contacts, error) : status;
}

/* A bad one does not stop the rest. */
static mho_status read_many(const many *m, subjects *list, mho_error *error)
{
  long bad = 0, total = 0;
  mho_status status = MHO_OK;
  for (bool end = false; status == MHO_OK; total++) {
    mho_error own;
    mho_error_init(&own);
    int before = list->count;
    mho_status read = m->rows ? read_row(m, list, &end, &own) : read_record(m, list, &end, &own);
    if (end) break;
    if (read == MHO_OK) continue;
    if (list->count > before) drop_last(list);
    bad++;
    print_causes(m->cmd, &own);
    if (!mho_status_is_input(read)) status = read;
  }
  if (bad && status == MHO_OK)
    fprintf(stderr, "mho %s: %ld of %ld %s of %s are left out\n", m->cmd->verb, bad, total,
            m->rows ? "rows" : "records", m->file);
  if (status == MHO_OK && bad == total)
    status = mho_fail_at(error, MHO_ERR_SYNTAX, "cli", m->file, 0, 0, NULL,
                         "holds no molecule that can be used");
  return status;
}

static mho_status read_list(const command *cmd, const char *file, bool need_contacts,
                            subjects *list, mho_error *error)
{
  many m = {.cmd = cmd, .file = file, .need_contacts = need_contacts};
  mho_status status = mho_list_open(file, &m.rows, error);
  if (status == MHO_OK) status = read_many(&m, list, error);
  mho_list_close(m.rows);
  return status;
}

/* Does the file hold more than one record? */
static mho_status count_records(const char *file, bool *several, mho_error *error)
{
  mho_records *records;
  mho_record record;
  mho_status status = mho_records_open(file, &records, error);
  if (status != MHO_OK) return status;
  for (int i = 0; i < 2; i++) mho_records_skip(records, &record);
  *several = record.number > 0;
  mho_records_close(records);
  return MHO_OK;
}

static mho_status read_records(const command *cmd, const char *file, bool need_contacts,
                               subjects *list, mho_error *error)
{
  many m = {.cmd = cmd, .file = file, .need_contacts = need_contacts};
  mho_status status = mho_records_open(file, &m.records, error);
  if (status == MHO_OK) status = read_many(&m, list, error);
  mho_records_close(m.records);
  return status;
}

/* Its causes name the argument; what is no SMILES may be a file's name mistyped. */
static mho_status read_smiles(const command *cmd, const char *argument, mho_molecule *molecule,
                              mho_error *error)
{
  mho_place place = {"SMILES", 0, 0, false};
  int before = error->count;
  mho_status status =
      mho_molecule_read_smiles(argument, &place, &cmd->overrides, 0, molecule, error);
  for (int i = before; i < error->count; i++) {
    mho_cause *cause = &error->cause[i];
    if (!strcmp(cause->file, place.file))
      snprintf(cause->file, sizeof cause->file,
               status == MHO_ERR_SYNTAX ? "'%.100s' is no file, and as a SMILES" : "SMILES '%.100s'",
               argument);
  }
  return status;
}

/* A file with one molecule, or a SMILES. */
static mho_status read_molecule(const command *cmd, const char *argument, bool is_file,
                                mho_molecule *molecule, mho_error *error)
{
  if (!is_file) return read_smiles(cmd, argument, molecule, error);
  if (!mho_records_is_file_name(argument))
    return mho_molecule_read(argument, NULL, &cmd->overrides, molecule, error);
  molecule->source = mho_copy_text(argument);
  if (!molecule->source) return mho_fail(error, MHO_ERR_MEMORY, "cli", NULL, "out of memory");
  return mho_molecule_read_structure(argument, 0, &cmd->overrides, 0, molecule, error);
}

static mho_status read_single(const command *cmd, const char *argument, bool is_file,
                              bool need_contacts, subjects *list, mho_error *error)
{
  subject *s = add_subject(list, error);
  if (!s) return MHO_ERR_MEMORY;
  mho_status status = read_molecule(cmd, argument, is_file, &s->molecule, error);
  if (status == MHO_OK) status = complete(s, need_contacts, error);
  if (status == MHO_OK) status = check_name(list, argument, error);
  if (status != MHO_OK) drop_last(list);
  return status;
}

mho_status subjects_read(const command *cmd, bool need_contacts, subjects *list,
                         mho_error *error)
{
  *list = (subjects){0};
  mho_status result = MHO_OK;
  for (int i = 0; i < cmd->files; i++) {
    const char *argument = cmd->file[i];
    bool is_file = access(argument, F_OK) == 0 || is_file_name(argument), several = false;
    mho_status status = MHO_OK;
    if (is_file && mho_records_is_file_name(argument))
      status = count_records(argument, &several, error);
    if (status == MHO_OK && several)
      status = read_records(cmd, argument, need_contacts, list, error);
    else if (status == MHO_OK && is_file && is_list(argument))
      status = read_list(cmd, argument, need_contacts, list, error);
    else if (status == MHO_OK)
      status = read_single(cmd, argument, is_file, need_contacts, list, error);
    if (result == MHO_OK) result = status;
  }
  return result;
}

void subjects_free(subjects *list)
{
  while (list->count > 0) drop_last(list);
  free(list->item);
  *list = (subjects){0};
}

int digits_of(const command *cmd) { return cmd->exact ? 17 : 6; }

int screen_width_of(const command *cmd)
{
  struct winsize size;
  if (cmd->output || !isatty(STDOUT_FILENO) ||
      ioctl(STDOUT_FILENO, TIOCGWINSZ, &size) != 0 || size.ws_col == 0)
    return WIDTH_WITHOUT_TERMINAL;
  return size.ws_col;
}

mho_status text_write(const command *cmd, const mho_buffer *buffer, mho_error *error)
{
  if (cmd->output) return mho_buffer_save(buffer, cmd->output, "cli", error);
  if (fwrite(buffer->data, 1, buffer->size, stdout) == buffer->size && fflush(stdout) == 0)
    return MHO_OK;
  if (errno == EPIPE) return MHO_OK; /* the reader has seen enough */
  return mho_fail(error, MHO_ERR_WRITE, "cli", NULL, "the output cannot be written: %s",
                  strerror(errno));
}

output_format format_of(const command *cmd)
{
  const char *dot = cmd->output ? strrchr(cmd->output, '.') : NULL;
  if (cmd->format != FORMAT_SCREEN || !dot) return cmd->format;
  if (!strcmp(dot, ".csv")) return FORMAT_CSV;
  return strcmp(dot, ".json") ? FORMAT_SCREEN : FORMAT_JSON;
}

mho_status output_write(const command *cmd, const mho_output *output, mho_error *error)
{
  mho_buffer buffer = {0};
  mho_status status = mho_output_check(output, error);
  output_format format = format_of(cmd);
  if (status == MHO_OK && format == FORMAT_CSV)
    status = mho_write_csv(&output->table[0], digits_of(cmd), &buffer, error);
  else if (status == MHO_OK && format == FORMAT_JSON)
    status = mho_write_json(output, &buffer, error);
  else if (status == MHO_OK)
    status = mho_write_screen(output, digits_of(cmd), screen_width_of(cmd), &buffer, error);
  if (status == MHO_OK) status = text_write(cmd, &buffer, error);
  mho_buffer_clear(&buffer);
  return status;
}
