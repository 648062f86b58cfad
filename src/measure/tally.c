/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "measure/tally.h"

#include "base/processor.h"

#include <stdlib.h>
#include <string.h>

enum { PARTS = 4, MOST_WAITING = UINT16_MAX };

bool mho_tally_init(mho_tally *tally, size_t slots)
{
  tally->slots = slots;
  tally->waiting = 0;
  tally->sum = calloc(slots, sizeof *tally->sum);
  tally->part = calloc(PARTS * slots, sizeof *tally->part);
  return tally->sum && tally->part;
}

void mho_tally_clear(mho_tally *tally)
{
  free(tally->sum);
  free(tally->part);
  *tally = (mho_tally){0};
}

void mho_tally_reset(mho_tally *tally)
{
  memset(tally->sum, 0, tally->slots * sizeof *tally->sum);
  if (tally->waiting) memset(tally->part, 0, PARTS * tally->slots * sizeof *tally->part);
  tally->waiting = 0;
}

static void count(mho_tally *tally, const int32_t *slot, size_t n)
{
  uint16_t *a = tally->part, *b = a + tally->slots, *c = b + tally->slots, *d = c + tally->slots;
  size_t i = 0;
  for (; i + PARTS <= n; i += PARTS) {
    a[slot[i]]++;
    b[slot[i + 1]]++;
    c[slot[i + 2]]++;
    d[slot[i + 3]]++;
  }
  for (; i < n; i++) a[slot[i]]++;
  tally->waiting += n;
}

void mho_tally_add(mho_tally *tally, const int32_t *slot, size_t n)
{
  while (n > 0) {
    if (tally->waiting == MOST_WAITING) mho_tally_join(tally);
    size_t room = MOST_WAITING - tally->waiting, now = n < room ? n : room;
    count(tally, slot, now);
    slot += now;
    n -= now;
  }
}

FOR_EVERY_PROCESSOR
void mho_tally_join(mho_tally *tally)
{
  size_t slots = tally->slots;
  uint64_t *sum = tally->sum;
  uint16_t *a = tally->part, *b = a + slots, *c = b + slots, *d = c + slots;
  for (size_t i = 0; i < slots; i++) sum[i] += (uint32_t)a[i] + b[i] + c[i] + d[i];
  memset(tally->part, 0, PARTS * slots * sizeof *tally->part);
  tally->waiting = 0;
}
