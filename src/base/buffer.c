/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "base/buffer.h"

#include <mho/quantity.h>

#include <errno.h>
#include <stdint.h>
#include <stdarg.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>
#include <unistd.h>

#include "base/text.h"

void mho_buffer_clear(mho_buffer *buffer)
{
  free(buffer->data);
  *buffer = (mho_buffer){0};
}

static bool reserve(mho_buffer *buffer, size_t more)
{
  if (buffer->failed) return false;
  if (more >= SIZE_MAX / 4 - buffer->size) buffer->failed = true;
  size_t needed = buffer->size + more + 1;
  if (!buffer->failed && needed > buffer->capacity) {
    size_t capacity = buffer->capacity ? buffer->capacity : 256;
    while (capacity < needed) capacity *= 2;
    char *data = realloc(buffer->data, capacity);
    if (data) {
      buffer->data = data;
      buffer->capacity = capacity;
    } else {
      buffer->failed = true;
    }
  }
  return !buffer->failed;
}

void mho_buffer_add_bytes(mho_buffer *buffer, const char *data, size_t size)
{
  if (!reserve(buffer, size)) return;
  memcpy(buffer->data + buffer->size, data, size);
  buffer->size += size;
  buffer->data[buffer->size] = '\0';
}

void mho_buffer_add(mho_buffer *buffer, const char *text)
{
  mho_buffer_add_bytes(buffer, text, strlen(text));
}

void mho_buffer_print(mho_buffer *buffer, const char *format, ...)
{
  va_list arguments;
  va_start(arguments, format);
  int length = vsnprintf(NULL, 0, format, arguments);
  va_end(arguments);
  if (length < 0 || !reserve(buffer, (size_t)length)) return;
  va_start(arguments, format);
  vsnprintf(buffer->data + buffer->size, (size_t)length + 1, format, arguments);
  va_end(arguments);
  buffer->size += (size_t)length;
}

void mho_buffer_number(mho_buffer *buffer, int digits, double value)
{
  char text[64];
  mho_number_write(text, sizeof text, digits, value);
  mho_buffer_add(buffer, text);
}

void mho_buffer_escape(mho_buffer *buffer, const char *text)
{
  for (; *text; text++) {
    switch (*text) {
    case '&': mho_buffer_add(buffer, "&amp;"); break;
    case '<': mho_buffer_add(buffer, "&lt;"); break;
    case '>': mho_buffer_add(buffer, "&gt;"); break;
    case '"': mho_buffer_add(buffer, "&quot;"); break;
    case '\'': mho_buffer_add(buffer, "&#39;"); break;
    default: mho_buffer_add_bytes(buffer, text, 1);
    }
  }
}

mho_status mho_buffer_check(const mho_buffer *buffer, const char *stage, mho_error *error)
{
  if (!buffer->failed) return MHO_OK;
  return mho_fail(error, MHO_ERR_MEMORY, stage, NULL, "out of memory");
}

static mho_status fail_write(const char *path, const char *stage, mho_error *error)
{
  return mho_fail_at(error, MHO_ERR_WRITE, stage, path, 0, 0, NULL, "cannot be written: %s",
                     strerror(errno));
}

mho_status mho_buffer_save(const mho_buffer *buffer, const char *path, const char *stage,
                           mho_error *error)
{
  mho_status status = mho_buffer_check(buffer, stage, error);
  if (status != MHO_OK) return status;
  struct stat there;
  bool special = stat(path, &there) == 0 && !S_ISREG(there.st_mode) && !S_ISDIR(there.st_mode);
  char *temporary = special ? mho_copy_text(path)
                            : mho_print_text("%s.tmp-%ld", path, (long)getpid());
  if (!temporary) return mho_fail(error, MHO_ERR_MEMORY, stage, NULL, "out of memory");
  FILE *file = fopen(temporary, "wb");
  if (!file) status = fail_write(path, stage, error);
  if (file) {
    bool good = fwrite(buffer->data ? buffer->data : "", 1, buffer->size, file) == buffer->size;
    good &= fclose(file) == 0;
    if (good && !special) good = rename(temporary, path) == 0;
    if (!good) status = fail_write(path, stage, error);
    if (!good && !special) unlink(temporary);
  }
  free(temporary);
  return status;
}
