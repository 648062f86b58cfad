/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Bytes of one file, plain or compressed with gzip, through one buffer.
 */
#ifndef MHOLECULE_MEASURE_SOURCE_H
#define MHOLECULE_MEASURE_SOURCE_H

#include <stdint.h>

#include <mho/status.h>

enum {
  MHO_SOURCE_SIZE = 1 << 20, /* the longest line */
  MHO_SOURCE_STEP = 1 << 18  /* read at once: stays in the cache until it is parsed */
};

typedef struct {
  const char *path;
  int file;            /* descriptor, -1 while closed */
  void *zip;           /* gzFile, NULL for a plain file */
  char *buffer;        /* MHO_SOURCE_SIZE and padding */
  size_t start, end;   /* the bytes that are not used up yet */
  bool finished;       /* the file has no more */
  bool truncated;      /* gzip ended before its check sum */
  uint64_t taken;      /* bytes of the file itself, compressed or not */
} mho_source;

MHO_MUST_USE mho_status mho_source_init(mho_source *source, mho_error *error);
void mho_source_clear(mho_source *source);

/* Opens path (a FIFO will do) and fills the buffer. */
MHO_MUST_USE mho_status mho_source_open(mho_source *source, const char *path,
                                        mho_error *error);
void mho_source_close(mho_source *source);

/* Moves what is left to the front and reads more; at the end `finished`. */
MHO_MUST_USE mho_status mho_source_refill(mho_source *source, mho_error *error);

static inline size_t mho_source_left(const mho_source *source)
{
  return source->end - source->start;
}

#endif
