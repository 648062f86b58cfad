/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "base/window.h"

#include <errno.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>

#include "base/text.h"

enum { PIECE = 1 << 16 };

static mho_status fail(mho_window *w, mho_status status, const char *what, mho_error *error)
{
  w->at = w->end;
  w->at_end = true;
  return mho_fail_at(error, status, w->stage, w->path, 0, 0, NULL, "%s", what);
}

static mho_status fail_read(mho_window *w, mho_error *error)
{
  w->at = w->end;
  w->at_end = true;
  return mho_fail_at(error, MHO_ERR_FILE, w->stage, w->path, 0, 0, NULL, "cannot be read: %s",
                     strerror(errno));
}

mho_status mho_window_open(mho_window *w, const char *path, size_t limit, const char *stage,
                           mho_error *error)
{
  *w = (mho_window){.path = mho_copy_text(path), .text = malloc(PIECE + 1), .capacity = PIECE,
                    .limit = limit, .stage = stage};
  if (!w->path || !w->text) return mho_fail(error, MHO_ERR_MEMORY, stage, NULL, "out of memory");
  w->at = w->end = w->text;
  w->file = fopen(path, "rb");
  if (!w->file) return fail_read(w, error);
  struct stat status;
  if (fstat(fileno(w->file), &status) != 0 || S_ISDIR(status.st_mode))
    return fail(w, MHO_ERR_FILE, "is a folder; a file is needed", error);
  setvbuf(w->file, NULL, _IONBF, 0); /* the window is the buffer */
  return mho_window_more(w, error);
}

void mho_window_close(mho_window *w)
{
  if (w->file) fclose(w->file);
  free(w->path);
  free(w->text);
  *w = (mho_window){0};
}

/* Room for at least one more piece, at the cost of what lies before `at`. */
static mho_status make_room(mho_window *w, mho_error *error)
{
  size_t held = (size_t)(w->end - w->at);
  if (held >= w->limit) return MHO_ERR_LIMIT;
  memmove(w->text, w->at, held);
  w->at = w->text;
  w->end = w->text + held;
  if (2 * held <= w->capacity) return MHO_OK;
  char *larger = realloc(w->text, 2 * w->capacity + 1);
  if (!larger) return fail(w, MHO_ERR_MEMORY, "out of memory", error);
  w->capacity *= 2;
  w->text = w->at = larger;
  w->end = larger + held;
  return MHO_OK;
}

mho_status mho_window_more(mho_window *w, mho_error *error)
{
  mho_status status = make_room(w, error);
  if (status != MHO_OK) return status;
  size_t room = w->capacity - (size_t)(w->end - w->text);
  size_t count = fread(w->end, 1, room, w->file);
  w->end += count;
  *w->end = '\0';
  if (count < room && ferror(w->file)) return fail_read(w, error);
  w->at_end = count < room;
  return MHO_OK;
}
