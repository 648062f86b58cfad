/* SPDX-License-Identifier: GPL-3.0-or-later */
#include <stdlib.h>
#include <string.h>

#include "cli/command.h"
#include "report/drawing.h"
#include "report/stages.h"

/* All molecules in one picture.  On the screen it stands in for the words. */
static mho_status draw(const command *cmd, const subjects *list, mho_error *error)
{
  const mho_molecule **molecule = calloc((size_t)list->count + 1, sizeof *molecule);
  if (!molecule) return mho_fail(error, MHO_ERR_MEMORY, "cli", NULL, "out of memory");
  for (int i = 0; i < list->count; i++) molecule[i] = &list->item[i].molecule;
  mho_buffer svg = {0};
  command to = *cmd;
  to.output = strcmp(cmd->drawing, "-") ? cmd->drawing : NULL;
  mho_status status = mho_drawing_write_file(molecule, (size_t)list->count, &svg, error);
  if (status == MHO_OK) status = text_write(&to, &svg, error);
  mho_buffer_clear(&svg);
  free(molecule);
  return status;
}

int command_check(const command *cmd, mho_error *error)
{
  subjects list;
  command lenient = *cmd;
  lenient.overrides.contacts_optional = true;
  mho_status status = subjects_read(&lenient, false, &list, error);
  mho_checked *checked = calloc((size_t)list.count + 1, sizeof *checked);
  if (status == MHO_OK && !checked)
    status = mho_fail(error, MHO_ERR_MEMORY, "cli", NULL, "out of memory");
  mho_buffer buffer = {0};
  bool words = true;
  if (status == MHO_OK && cmd->drawing) {
    status = draw(cmd, &list, error);
    words = strcmp(cmd->drawing, "-") || cmd->output;
  }
  if (status == MHO_OK && words) {
    size_t count = (size_t)list.count;
    for (size_t i = 0; i < count; i++)
      checked[i] = (mho_checked){&list.item[i].molecule, &list.item[i].junction, list.item[i].warnings};
    status = cmd->format == FORMAT_JSON
                 ? mho_write_check_json(checked, count, &buffer, error)
                 : mho_write_check_screen(checked, count, digits_of(cmd), &buffer, error);
  }
  if (status == MHO_OK && words) status = text_write(cmd, &buffer, error);
  mho_buffer_clear(&buffer);
  free(checked);
  subjects_free(&list);
  return exit_of(status);
}
