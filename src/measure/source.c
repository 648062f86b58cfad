/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "measure/source.h"

#include "measure/decimal.h"

#include <errno.h>
#include <fcntl.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>
#include <unistd.h>
#include <zlib.h>

mho_status mho_source_init(mho_source *source, mho_error *error)
{
  memset(source, 0, sizeof *source);
  source->file = -1;
  source->buffer = malloc(MHO_SOURCE_SIZE + 1 + MHO_DECIMAL_PADDING);
  if (!source->buffer)
    return mho_fail(error, MHO_ERR_MEMORY, "measure", NULL, "out of memory");
  return MHO_OK;
}

void mho_source_clear(mho_source *source)
{
  mho_source_close(source);
  free(source->buffer);
  source->buffer = NULL;
}

void mho_source_close(mho_source *source)
{
  if (source->zip) gzclose_r(source->zip);
  else if (source->file >= 0) close(source->file);
  source->zip = NULL;
  source->file = -1;
}

static mho_status fail(const mho_source *source, mho_error *error, const char *why)
{
  return mho_fail_at(error, MHO_ERR_FILE, "measure", source->path, 0, 0, NULL,
                     "cannot be read: %s", why);
}

/* Up to size bytes; *count is 0 at the end only. */
static mho_status read_some(mho_source *source, char *to, size_t size,
                            size_t *count, mho_error *error)
{
  *count = 0;
  if (!source->zip) {
    ssize_t got;
    do got = read(source->file, to, size);
    while (got < 0 && errno == EINTR);
    if (got < 0) return fail(source, error, strerror(errno));
    *count = (size_t)got;
    source->taken += (uint64_t)got;
    return MHO_OK;
  }
  int got = gzread(source->zip, to, (unsigned)size);
  z_off_t offset = gzoffset(source->zip);
  if (offset > 0) source->taken = (uint64_t)offset;
  int code = Z_OK;
  const char *why = gzerror(source->zip, &code);
  if (got > 0 && (code == Z_OK || code == Z_BUF_ERROR)) {
    *count = (size_t)got;
    return MHO_OK;
  }
  if (code == Z_OK || code == Z_STREAM_END) return MHO_OK;
  source->truncated = code == Z_BUF_ERROR;
  return mho_fail_at(error, MHO_ERR_FILE, "measure", source->path, 0, 0, NULL,
                     source->truncated
                         ? "the compressed data ends too early, the file is "
                           "truncated; a whole gzip file is needed"
                         : "the compressed data is damaged (%s)",
                     why);
}

mho_status mho_source_refill(mho_source *source, mho_error *error)
{
  size_t left = mho_source_left(source);
  memmove(source->buffer, source->buffer + source->start, left);
  source->start = 0;
  source->end = left;
  size_t full = left + MHO_SOURCE_STEP < MHO_SOURCE_SIZE ? left + MHO_SOURCE_STEP : MHO_SOURCE_SIZE;
  while (!source->finished && source->end < full) {
    size_t count;
    mho_status status = read_some(source, source->buffer + source->end, full - source->end,
                                  &count, error);
    if (status != MHO_OK) return status;
    source->end += count;
    source->finished = count == 0;
  }
  memset(source->buffer + source->end, 0, 1 + MHO_DECIMAL_PADDING);
  return MHO_OK;
}

mho_status mho_source_open(mho_source *source, const char *path, mho_error *error)
{
  source->path = path;
  source->start = source->end = 0;
  source->taken = 0;
  source->finished = source->truncated = false;
  source->file = open(path, O_RDONLY | O_CLOEXEC);
  if (source->file < 0) return fail(source, error, strerror(errno));
  struct stat state;
  if (fstat(source->file, &state) != 0) return fail(source, error, strerror(errno));
  if (S_ISDIR(state.st_mode))
    return mho_fail_at(error, MHO_ERR_FILE, "measure", path, 0, 0, NULL,
                       "is a folder; a file is needed");
  mho_status status = mho_source_refill(source, error);
  if (status != MHO_OK) return status;
  const unsigned char *head = (const unsigned char *)source->buffer;
  if (source->end < 2 || head[0] != 0x1f || head[1] != 0x8b) return MHO_OK;
  if (lseek(source->file, 0, SEEK_SET) != 0)
    return fail(source, error, "compressed data needs a file, not a pipe");
  source->zip = gzdopen(source->file, "rb");
  if (!source->zip)
    return mho_fail_at(error, MHO_ERR_MEMORY, "measure", path, 0, 0, NULL, "out of memory");
  gzbuffer(source->zip, 1 << 17);
  source->taken = 0;
  source->end = 0;
  source->finished = false;
  return mho_source_refill(source, error);
}
