/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "molecule/records.h"

#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <strings.h>

#include "base/text.h"
#include "base/window.h"
#include "molecule/record_reader.h"
#include "molecule/texts.h"

/* Largest record; a file may be of any length. */
#define RECORD_LIMIT ((size_t)1 << 26)

struct mho_records {
  mho_window file; /* from the next record on */
  char *name;
  long line;       /* of it, from 1 */
  long number;     /* of the record before it */
  bool xyz;
};

static bool has_ending(const char *path, const char *const *endings)
{
  const char *dot = strrchr(path, '.');
  for (; dot && *endings; endings++)
    if (!strcasecmp(dot, *endings)) return true;
  return false;
}

static const char *const xyz_endings[] = {".xyz", NULL};

bool mho_records_is_file_name(const char *path)
{
  static const char *const endings[] = {".mol", ".mdl", ".sdf", ".sd", NULL};
  return has_ending(path, endings) || has_ending(path, xyz_endings);
}

static mho_status fail_file(const mho_records *s, mho_error *error, const char *message)
{
  return mho_fail_at(error, MHO_ERR_SYNTAX, MOLECULE_STAGE, s->file.path, 1, 1, "structure", "%s", message);
}

mho_status mho_records_open(const char *path, mho_records **records, mho_error *error)
{
  *records = NULL;
  mho_records *s = calloc(1, sizeof *s);
  if (!s) return mho_fail(error, MHO_ERR_MEMORY, MOLECULE_STAGE, NULL, "out of memory");
  mho_window *w = &s->file;
  mho_status status = mho_window_open(w, path, RECORD_LIMIT, MOLECULE_STAGE, error);
  if (status == MHO_OK) {
    size_t size = (size_t)(w->end - w->at);
    s->line = 1;
    s->xyz = has_ending(path, xyz_endings);
    if (size >= 3 && !memcmp(w->at, "\xEF\xBB\xBF", 3)) w->at += 3;
    if (size >= 2 && (!memcmp(w->text, "\xFF\xFE", 2) || !memcmp(w->text, "\xFE\xFF", 2)))
      status = fail_file(s, error, "the file is UTF-16; save it as UTF-8");
    else if (memchr(w->text, 0, size))
      status = fail_file(s, error, "the file holds a NUL byte; is it a text file?");
    else if (w->at_end && strspn(w->at, " \t\r\n") == (size_t)(w->end - w->at))
      status = fail_file(s, error, "the file is empty; a molfile, an SDF or an XYZ file is needed");
  }
  if (status != MHO_OK) mho_records_close(s);
  else *records = s;
  return status;
}

void mho_records_close(mho_records *s)
{
  if (!s) return;
  mho_window_close(&s->file);
  free(s->name);
  free(s);
}

static const char *line_end(const char *at, const char *end)
{
  const char *found = memchr(at, '\n', (size_t)(end - at));
  return found ? found : end;
}

/* Lines of the XYZ record at `at`; -1, all that is left, where it does not say:
 * then nothing tells where the next one begins. */
static long xyz_lines(const char *at)
{
  long atoms = strtol(at, NULL, 10);
  return atoms >= 1 && atoms <= MHO_ATOM_LIMIT ? atoms + 2 : -1;
}

/* The end of the record at the beginning of the window: its `$$$$` line, or
 * the atoms that an XYZ record announces; *lines is what it passes, *next what
 * follows.  Both are the end of the window where it may go on. */
static const char *find_end(const mho_records *s, const char **next, long *lines)
{
  const char *at = s->file.at, *last = s->file.end;
  long count = s->xyz ? xyz_lines(at) : -1;
  for (*lines = 0; at < last && count != 0; count--) {
    const char *end = line_end(at, last);
    bool separator = !s->xyz && end - at >= 4 && !strncmp(at, "$$$$", 4);
    *next = end < last ? end + 1 : end;
    ++*lines;
    if (separator) return at;
    at = *next;
  }
  *next = at;
  return at;
}

static bool is_blank(const char *at, const char *end)
{
  while (at < end && strchr(" \t\r\n", *at)) at++;
  return at == end;
}

/* A name in UTF-8: other bytes are taken as Latin-1, as old programs wrote. */
static char *copy_name(const char *text, int length)
{
  while (length > 0 && (*text == ' ' || *text == '\t')) {
    text++;
    length--;
  }
  char *name = malloc(2 * (size_t)length + 1), *to = name;
  if (!name) return NULL;
  bool utf8 = mho_utf8_prefix(text, (size_t)length) == (size_t)length;
  for (int i = 0; i < length; i++) {
    unsigned char c = (unsigned char)text[i];
    if (c < ' ' || c == 127) c = ' ';
    if (c < 128 || utf8) {
      *to++ = (char)c;
    } else {
      *to++ = (char)(0xC0 | c >> 6);
      *to++ = (char)(0x80 | (c & 0x3F));
    }
  }
  *to = '\0';
  return name;
}

/* Name, dimensions and counts line; then the table. */
static mho_status read_molfile(mho_record_reader *r, char **name)
{
  mho_record_line(r);
  *name = copy_name(r->line, r->length);
  mho_record_line(r);
  bool spatial = r->length >= 22 && !strncmp(r->line + 20, "3D", 2);
  mho_record_line(r);
  if (!mho_record_line(r))
    return mho_record_fail(r, MHO_ERR_SYNTAX, 1, "the record ends before its counts line, the fourth");
  if (r->length >= 39 && !strncmp(r->line + 34, "V3000", 5)) return mho_molfile_v3000(r, spatial);
  return mho_molfile_v2000(r, spatial);
}

static mho_status read_xyz(mho_record_reader *r, char **name)
{
  mho_record_reader ahead = *r;
  mho_record_line(&ahead);
  mho_record_line(&ahead);
  *name = copy_name(ahead.line, ahead.length);
  mho_record_line(r);
  return mho_xyz_read(r);
}

/* Passes the blank lines of an XYZ file, and those at the end of any. */
static mho_status pass_blanks(mho_records *s, mho_error *error)
{
  mho_window *w = &s->file;
  mho_status status = MHO_OK;
  while (status == MHO_OK && is_blank(w->at, w->end) && !w->at_end)
    status = mho_window_more(w, error);
  if (is_blank(w->at, w->end)) w->at = w->end;
  while (s->xyz && w->at < w->end && is_blank(w->at, line_end(w->at, w->end))) {
    w->at += line_end(w->at, w->end) + 1 - w->at;
    s->line++;
  }
  return status;
}

/* Takes the record ahead off the window, [*start, *end); number 0 where only
 * blank lines are left. */
static mho_status take_record(mho_records *s, mho_record *record, const char **start,
                              const char **end, mho_error *error)
{
  mho_window *w = &s->file;
  const char *next;
  long lines;
  *record = (mho_record){.name = ""};
  mho_status status = pass_blanks(s, error);
  if (w->at < w->end) {
    record->number = ++s->number;
    record->place = (mho_place){w->path, s->line, 1, true};
  }
  while (status == MHO_OK && w->at < w->end) {
    *end = find_end(s, &next, &lines);
    *start = w->at;
    if (next < w->end || w->at_end) {
      w->at += next - w->at;
      s->line += lines;
      return MHO_OK;
    }
    status = mho_window_more(w, error);
  }
  if (status != MHO_ERR_LIMIT) return status;
  w->at_end = true;
  w->at = w->end;
  return mho_fail_at(error, status, MOLECULE_STAGE, w->path, record->place.line, 1, "structure",
                     "the record is larger than 67108864 bytes; it and what follows are left out");
}

void mho_records_skip(mho_records *s, mho_record *record)
{
  const char *start, *end;
  if (take_record(s, record, &start, &end, NULL) != MHO_OK) s->file.at = s->file.end;
}

mho_status mho_records_next(mho_records *s, mho_graph *graph, mho_record *record,
                            mho_texts *notes, mho_error *error)
{
  const char *start, *end;
  mho_graph_clear(graph);
  mho_status status = take_record(s, record, &start, &end, error);
  if (status != MHO_OK || record->number == 0) return status;
  mho_record_reader r = {.at = start, .end = end, .number = record->place.line - 1,
                         .line = start, .place = &record->place,
                         .graph = graph, .notes = notes, .error = error};
  free(s->name);
  s->name = NULL;
  if (memchr(start, 0, (size_t)(end - start)))
    return mho_record_fail(&r, MHO_ERR_SYNTAX, 1, "the record holds a NUL byte");
  status = s->xyz ? read_xyz(&r, &s->name) : read_molfile(&r, &s->name);
  if (!s->name && status == MHO_OK)
    status = mho_fail(error, MHO_ERR_MEMORY, MOLECULE_STAGE, NULL, "out of memory");
  record->name = s->name ? s->name : "";
  if (status != MHO_OK) mho_graph_clear(graph);
  return status;
}
