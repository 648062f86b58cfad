/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "molecule/records.h"

#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <strings.h>

#include "base/text.h"
#include "molecule/record_reader.h"
#include "molecule/texts.h"

/* Largest file, as for lists. */
#define FILE_LIMIT ((size_t)1 << 29)

struct mho_records {
  char *path, *text, *name;
  const char *at, *end;
  long line;   /* of `at`, from 1 */
  long number; /* of the record before `at` */
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
  return mho_fail_at(error, MHO_ERR_SYNTAX, MOLECULE_STAGE, s->path, 1, 1, "structure", "%s", message);
}

mho_status mho_records_open(const char *path, mho_records **records, mho_error *error)
{
  size_t size;
  *records = NULL;
  mho_records *s = calloc(1, sizeof *s);
  if (!s || !(s->path = mho_copy_text(path))) {
    free(s);
    return mho_fail(error, MHO_ERR_MEMORY, MOLECULE_STAGE, NULL, "out of memory");
  }
  mho_status status = mho_read_file(path, FILE_LIMIT, MOLECULE_STAGE, &s->text, &size, error);
  if (status == MHO_OK) {
    s->at = s->text;
    s->end = s->text + size;
    s->line = 1;
    s->xyz = has_ending(path, xyz_endings);
    if (size >= 3 && !memcmp(s->text, "\xEF\xBB\xBF", 3)) s->at += 3;
    if (size >= 2 && (!memcmp(s->text, "\xFF\xFE", 2) || !memcmp(s->text, "\xFE\xFF", 2)))
      status = fail_file(s, error, "the file is UTF-16; save it as UTF-8");
    else if (memchr(s->text, 0, size))
      status = fail_file(s, error, "the file holds a NUL byte; is it a text file?");
    else if (strspn(s->at, " \t\r\n") == (size_t)(s->end - s->at))
      status = fail_file(s, error, "the file is empty; a molfile, an SDF or an XYZ file is needed");
  }
  if (status != MHO_OK) mho_records_close(s);
  else *records = s;
  return status;
}

void mho_records_close(mho_records *s)
{
  if (!s) return;
  free(s->path);
  free(s->text);
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

/* Behind the record that begins at s->at: its `$$$$` line, or the atoms that
 * an XYZ record announces; *lines is what it passes. */
static const char *find_end(const mho_records *s, const char **next, long *lines)
{
  const char *at = s->at;
  long count = s->xyz ? xyz_lines(at) : -1;
  for (*lines = 0; at < s->end && count != 0; count--) {
    const char *end = line_end(at, s->end);
    bool separator = !s->xyz && end - at >= 4 && !strncmp(at, "$$$$", 4);
    *next = end < s->end ? end + 1 : end;
    ++*lines;
    if (separator) return at;
    at = *next;
    if (s->xyz && count == 1) break;
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

/* The record ahead, or number 0 where only blank lines are left. */
static const char *begin(mho_records *s, mho_record *record)
{
  *record = (mho_record){.name = ""};
  if (is_blank(s->at, s->end)) return NULL;
  while (s->xyz && is_blank(s->at, line_end(s->at, s->end))) {
    s->at = line_end(s->at, s->end) + 1;
    s->line++;
  }
  record->number = ++s->number;
  record->place = (mho_place){s->path, s->line, 1, true};
  long lines;
  const char *next, *start = s->at;
  const char *end = find_end(s, &next, &lines);
  s->at = next;
  s->line += lines;
  return end > start ? end : start;
}

void mho_records_skip(mho_records *s, mho_record *record) { begin(s, record); }

mho_status mho_records_next(mho_records *s, mho_graph *graph, mho_record *record,
                            mho_texts *notes, mho_error *error)
{
  const char *start = s->at;
  const char *end = begin(s, record);
  mho_graph_clear(graph);
  if (!end) return MHO_OK;
  if (s->xyz) /* blank lines before it are passed over */
    while (is_blank(start, line_end(start, s->end))) start = line_end(start, s->end) + 1;
  mho_record_reader r = {.at = start, .end = end, .number = record->place.line - 1,
                         .line = start, .place = &record->place,
                         .graph = graph, .notes = notes, .error = error};
  free(s->name);
  s->name = NULL;
  mho_status status = s->xyz ? read_xyz(&r, &s->name) : read_molfile(&r, &s->name);
  if (!s->name && status == MHO_OK)
    status = mho_fail(error, MHO_ERR_MEMORY, MOLECULE_STAGE, NULL, "out of memory");
  record->name = s->name ? s->name : "";
  if (status != MHO_OK) mho_graph_clear(graph);
  return status;
}
