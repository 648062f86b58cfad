/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "molecule/texts.h"

#include <stdarg.h>
#include <stdio.h>
#include <stdlib.h>

#include "base/text.h"

mho_status mho_texts_add(mho_texts *texts, const char *format, ...)
{
  char buffer[600];
  va_list arguments;
  va_start(arguments, format);
  vsnprintf(buffer, sizeof buffer, format, arguments);
  va_end(arguments);
  /* Room for powers of two. */
  if ((texts->count & (texts->count - 1)) == 0) {
    size_t room = texts->count ? 2 * (size_t)texts->count : 1;
    char **larger = realloc(texts->text, room * sizeof *larger);
    if (!larger) return MHO_ERR_MEMORY;
    texts->text = larger;
  }
  char *copy = mho_copy_text(buffer);
  if (!copy) return MHO_ERR_MEMORY;
  texts->text[texts->count++] = copy;
  return MHO_OK;
}

void mho_texts_clear(mho_texts *texts)
{
  for (int i = 0; i < texts->count; i++) free(texts->text[i]);
  free(texts->text);
  *texts = (mho_texts){0};
}
