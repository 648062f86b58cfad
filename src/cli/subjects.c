/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * From the FILE arguments to junctions, and from tables to where they go.
 */
#include <errno.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/ioctl.h>
#include <sys/stat.h>
#include <unistd.h>

#include "base/text.h"
#include "cli/command.h"

enum { WIDTH_WITHOUT_TERMINAL = 120 };

bool has_molecule_extension(const char *text)
{
  static const char *const known[] = {".yaml", ".yml", ".mol", ".sdf", ".xyz", ".smi", ".csv"};
  const char *dot = strrchr(text, '.');
  for (size_t i = 0; dot && i < sizeof known / sizeof *known; i++)
    if (!strcmp(dot, known[i])) return true;
  return false;
}

static mho_status read_subject(const command *cmd, const char *file, bool need_contacts,
                               subject *s, mho_error *error)
{
  mho_status status = mho_molecule_read(file, NULL, &cmd->overrides, &s->molecule, error);
  if (status == MHO_OK) status = mho_junction_build(&s->molecule, &s->junction, error);
  if (status == MHO_OK && need_contacts)
    status = mho_junction_require_contacts(&s->junction, &s->molecule, error);
  if (status == MHO_OK) s->warnings = mho_molecule_warnings(&s->molecule, &s->junction);
  return status;
}

static mho_status check_name(const subject *list, int index, const char *file, mho_error *error)
{
  for (int i = 0; i < index; i++)
    if (list[i].molecule.name && !strcmp(list[i].molecule.name, list[index].molecule.name))
      return mho_fail_at(error, MHO_ERR_KEY, "cli", file, 0, 0, "name",
                         "molecule '%s' stands in %s already; names must differ",
                         list[index].molecule.name, list[i].molecule.source);
  return MHO_OK;
}

mho_status subjects_read(const command *cmd, bool need_contacts, subject **list,
                         mho_error *error)
{
  mho_status result = MHO_OK;
  *list = calloc((size_t)cmd->files, sizeof **list);
  if (!*list) return mho_fail(error, MHO_ERR_MEMORY, "cli", NULL, "out of memory");
  for (int i = 0; i < cmd->files; i++) mho_molecule_init(&(*list)[i].molecule);
  for (int i = 0; i < cmd->files; i++) {
    mho_status status = read_subject(cmd, cmd->file[i], need_contacts, &(*list)[i], error);
    if (status == MHO_OK) status = check_name(*list, i, cmd->file[i], error);
    if (result == MHO_OK) result = status;
  }
  return result;
}

void subjects_free(subject *list, int count)
{
  for (int i = 0; list && i < count; i++) {
    mho_molecule_clear(&list[i].molecule);
    mho_junction_clear(&list[i].junction);
  }
  free(list);
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

/* Without a format, the ending of PATH decides. */
static output_format format_of(const command *cmd)
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
