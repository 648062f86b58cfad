/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "base/text.h"

#include <errno.h>
#include <stdarg.h>
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>

enum { WORD_LIMIT = 63 };

/* Levenshtein distance by one row of the usual table. */
static size_t edit_distance(const char *a, const char *b)
{
  size_t m = strlen(a), n = strlen(b);
  if (m > WORD_LIMIT || n > WORD_LIMIT) return SIZE_MAX;
  size_t row[WORD_LIMIT + 1];
  for (size_t j = 0; j <= n; j++) row[j] = j;
  for (size_t i = 1; i <= m; i++) {
    size_t diagonal = row[0];
    row[0] = i;
    for (size_t j = 1; j <= n; j++) {
      size_t above = row[j];
      size_t best = diagonal + (a[i - 1] != b[j - 1]);
      if (above + 1 < best) best = above + 1;
      if (row[j - 1] + 1 < best) best = row[j - 1] + 1;
      row[j] = best;
      diagonal = above;
    }
  }
  return row[n];
}

const char *mho_nearest_word(const char *word, const char *const *candidates,
                             size_t count)
{
  size_t allowed = strlen(word) / 3;
  if (allowed < 1) allowed = 1;
  const char *nearest = NULL;
  size_t nearest_distance = allowed + 1;
  for (size_t i = 0; i < count; i++) {
    size_t distance = edit_distance(word, candidates[i]);
    if (distance < nearest_distance) {
      nearest = candidates[i];
      nearest_distance = distance;
    }
  }
  return nearest;
}

const char *mho_join_words(const char *const *candidates, size_t count,
                           char *buffer, size_t size)
{
  size_t used = 0;
  buffer[0] = '\0';
  for (size_t i = 0; i < count; i++) {
    const char *before = i == 0 ? "" : i + 1 == count ? " or " : ", ";
    int length = snprintf(buffer + used, size - used, "%s%s", before, candidates[i]);
    if (length < 0 || (size_t)length >= size - used) break;
    used += (size_t)length;
  }
  return buffer;
}

char *mho_copy_text(const char *text)
{
  size_t size = strlen(text) + 1;
  char *copy = malloc(size);
  if (copy) memcpy(copy, text, size);
  return copy;
}

char *mho_print_text(const char *format, ...)
{
  va_list arguments;
  va_start(arguments, format);
  int length = vsnprintf(NULL, 0, format, arguments);
  va_end(arguments);
  char *text = length < 0 ? NULL : malloc((size_t)length + 1);
  if (!text) return NULL;
  va_start(arguments, format);
  vsnprintf(text, (size_t)length + 1, format, arguments);
  va_end(arguments);
  return text;
}

char *mho_path_beside(const char *beside, const char *name)
{
  const char *slash = beside ? strrchr(beside, '/') : NULL;
  if (name[0] == '/' || !slash) return mho_copy_text(name);
  return mho_print_text("%.*s/%s", (int)(slash - beside), beside, name);
}

mho_status mho_read_file(const char *path, size_t limit, const char *stage,
                         char **text, size_t *size, mho_error *error)
{
  FILE *file = fopen(path, "rb");
  if (!file)
    return mho_fail_at(error, MHO_ERR_FILE, stage, path, 0, 0, NULL,
                       "cannot be read: %s", strerror(errno));
  struct stat status;
  if (fstat(fileno(file), &status) != 0 || S_ISDIR(status.st_mode)) {
    fclose(file);
    return mho_fail_at(error, MHO_ERR_FILE, stage, path, 0, 0, NULL,
                       "is a folder; a file is needed");
  }
  size_t capacity = 4096, used = 0;
  char *buffer = malloc(capacity + 1);
  mho_status result = buffer ? MHO_OK : MHO_ERR_MEMORY;
  while (result == MHO_OK) {
    size_t count = fread(buffer + used, 1, capacity - used, file);
    used += count;
    if (used > limit)
      result = mho_fail_at(error, MHO_ERR_LIMIT, stage, path, 0, 0, NULL,
                           "is larger than %zu bytes, the most that is read",
                           limit);
    else if (count == 0 && ferror(file))
      result = mho_fail_at(error, MHO_ERR_FILE, stage, path, 0, 0, NULL,
                           "cannot be read: %s", strerror(errno));
    else if (count == 0)
      break;
    else if (used == capacity) {
      char *larger = realloc(buffer, 2 * capacity + 1);
      if (!larger) result = MHO_ERR_MEMORY;
      else buffer = larger, capacity *= 2;
    }
  }
  fclose(file);
  if (result != MHO_OK) {
    free(buffer);
    if (result == MHO_ERR_MEMORY)
      mho_fail_at(error, result, stage, path, 0, 0, NULL, "out of memory");
    return result;
  }
  buffer[used] = '\0';
  *text = buffer;
  *size = used;
  return MHO_OK;
}

/* Bytes of the well-formed sequence at s (RFC 3629), or 0. */
static size_t utf8_sequence(const unsigned char *s, size_t size)
{
  if (s[0] < 0x80) return 1;
  size_t length = s[0] >= 0xF0 ? 4 : s[0] >= 0xE0 ? 3 : 2;
  if (s[0] < 0xC2 || s[0] > 0xF4 || length > size) return 0;
  for (size_t i = 1; i < length; i++)
    if ((s[i] & 0xC0) != 0x80) return 0;
  if ((s[0] == 0xE0 && s[1] < 0xA0) || (s[0] == 0xED && s[1] > 0x9F) ||
      (s[0] == 0xF0 && s[1] < 0x90) || (s[0] == 0xF4 && s[1] > 0x8F))
    return 0;
  return length;
}

size_t mho_utf8_prefix(const char *text, size_t size)
{
  size_t position = 0;
  while (position < size) {
    size_t step = utf8_sequence((const unsigned char *)text + position,
                                size - position);
    if (step == 0) break;
    position += step;
  }
  return position;
}
