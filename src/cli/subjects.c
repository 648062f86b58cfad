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
  static const char *const known[] = {".yaml", ".yml", ".mol", ".sdf", ".xyz"};
  return is_list(text) || has_extension(text, known, 5);
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

static mho_status read_row(const command *cmd, const char *file, const mho_list_row *row,
                           bool need_contacts, subjects *list, mho_error *error)
{
  subject *s = add_subject(list, error);
  if (!s) return MHO_ERR_MEMORY;
  const char *name = row->name[0] ? row->name : row->smiles;
  bool repeated = find_name(list, name, list->count - 1) != NULL;
  s->molecule.name = repeated ? mho_print_text("%s (line %ld)", name, row->place.line)
                              : mho_copy_text(name);
  s->molecule.source = mho_copy_text(file);
  if (!s->molecule.name || !s->molecule.source)
    return mho_fail(error, MHO_ERR_MEMORY, "cli", NULL, "out of memory");
  mho_status status = mho_molecule_read_smiles(row->smiles, &row->place, &cmd->overrides, 0,
                                               &s->molecule, error);
  return status == MHO_OK ? complete(s, need_contacts, error) : status;
}

/* A bad row does not stop the rest. */
static mho_status read_list(const command *cmd, const char *file, bool need_contacts,
                            subjects *list, mho_error *error)
{
  mho_list *rows = NULL;
  mho_list_row row;
  long bad = 0, total = 0;
  mho_status status = mho_list_open(file, &rows, error);
  while (status == MHO_OK) {
    mho_error own;
    mho_error_init(&own);
    mho_status read = mho_list_next(rows, &row, &own);
    if (read == MHO_OK && !row.smiles) break;
    int before = list->count;
    if (read == MHO_OK) read = read_row(cmd, file, &row, need_contacts, list, &own);
    total++;
    if (read == MHO_OK) continue;
    if (list->count > before) drop_last(list);
    bad++;
    print_causes(cmd, &own);
    if (!mho_status_is_input(read)) status = read;
  }
  mho_list_close(rows);
  if (bad && status == MHO_OK)
    fprintf(stderr, "mho %s: %ld of %ld rows of %s are left out\n", cmd->verb, bad, total, file);
  if (status == MHO_OK && bad == total)
    status = mho_fail_at(error, MHO_ERR_SYNTAX, "cli", file, 0, 0, NULL,
                         "holds no molecule that can be used");
  return status;
}

static mho_status read_single(const command *cmd, const char *argument, bool is_file,
                              bool need_contacts, subjects *list, mho_error *error)
{
  subject *s = add_subject(list, error);
  if (!s) return MHO_ERR_MEMORY;
  mho_place place = {"SMILES", 0, 0};
  mho_status status =
      is_file ? mho_molecule_read(argument, NULL, &cmd->overrides, &s->molecule, error)
              : mho_molecule_read_smiles(argument, &place, &cmd->overrides, 0, &s->molecule, error);
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
    bool is_file = access(argument, F_OK) == 0 || is_file_name(argument);
    mho_status status = is_file && is_list(argument)
                            ? read_list(cmd, argument, need_contacts, list, error)
                            : read_single(cmd, argument, is_file, need_contacts, list, error);
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

static int screen_width_of(const command *cmd)
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
