/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "solver/reduction.h"

#include <stdlib.h>
#include <string.h>

#include "solver/lanes.h"

enum { W = REDUCTION_LANES, SITES_MAX = 400, ROW_MAX = 24 };

/* --- order: the site of fewest neighbours next ---------------------------------- */

typedef struct {
  mho_reduction *r;
  int *slot;   /* [sites][sites] of what is or becomes non-zero, else -1 */
  int *degree; /* neighbours that are not eliminated */
  bool *kept, *gone;
  int slot_room, listed, list_room;
  bool failed, dense; /* out of memory; too many neighbours */
} orderer;

static bool grow_slots(orderer *o)
{
  mho_reduction *r = o->r;
  if (r->slots < o->slot_room) return true;
  o->slot_room = 2 * o->slot_room + 64;
  int(*between)[2] = realloc(r->between, (size_t)o->slot_room * sizeof *between);
  if (between) r->between = between;
  double *value = realloc(r->value_ev, (size_t)o->slot_room * sizeof *value);
  if (value) r->value_ev = value;
  o->failed = !between || !value;
  return !o->failed;
}

/* Slot of the number (i, j), new if need be. */
static int slot_of(orderer *o, int i, int j)
{
  mho_reduction *r = o->r;
  int *at = &o->slot[i * r->sites + j];
  if (*at >= 0 || !grow_slots(o)) return *at;
  *at = o->slot[j * r->sites + i] = r->slots;
  r->between[r->slots][0] = i;
  r->between[r->slots][1] = j;
  r->value_ev[r->slots] = 0;
  if (i != j) {
    o->degree[i]++;
    o->degree[j]++;
  }
  return r->slots++;
}

static void list(orderer *o, int number)
{
  mho_reduction *r = o->r;
  if (o->listed == o->list_room) {
    o->list_room = 2 * o->list_room + 256;
    int *moved = realloc(r->list, (size_t)o->list_room * sizeof *moved);
    o->failed |= !moved;
    if (!moved) return;
    r->list = moved;
  }
  r->list[o->listed++] = number;
}

static void eliminate(orderer *o, int site)
{
  mho_reduction *r = o->r;
  int row[ROW_MAX], count = 0;
  for (int j = 0; j < r->sites; j++) {
    if (j == site || o->gone[j] || o->slot[site * r->sites + j] < 0) continue;
    o->dense |= count == ROW_MAX;
    if (o->dense) return;
    row[count++] = j;
  }
  for (int a = 0; a < count; a++) list(o, o->slot[site * r->sites + row[a]]);
  for (int a = 0; a < count; a++) list(o, row[a]);
  for (int a = 0; a < count && !o->failed; a++)
    for (int b = a; b < count && !o->failed; b++) list(o, slot_of(o, row[a], row[b]));
  for (int a = 0; a < count; a++) o->degree[row[a]]--;
  o->gone[site] = true;
  r->step[r->steps++] = (mho_reduction_step){site, count};
}

static void order(orderer *o)
{
  mho_reduction *r = o->r;
  for (;;) {
    int best = -1;
    for (int i = 0; i < r->sites; i++)
      if (!o->gone[i] && !o->kept[i] && (best < 0 || o->degree[i] < o->degree[best])) best = i;
    if (best < 0 || o->failed || o->dense) break;
    eliminate(o, best);
  }
  for (int a = 0; a < r->kept; a++)
    for (int b = 0; b < r->kept; b++)
      r->kept_slot[a][b] = o->slot[r->kept_site[a] * r->sites + r->kept_site[b]];
}

/* --- life ------------------------------------------------------------------------ */

/* The contacts' sites; false where there are too many. */
static bool keep_contacts(const mho_plan *plan, orderer *o)
{
  mho_reduction *r = o->r;
  for (size_t k = 0; k < plan->support_start[plan->channels]; k++) {
    int site = plan->support[k];
    if (o->kept[site]) continue;
    if (r->kept == REDUCTION_KEPT_MAX) return false;
    o->kept[site] = true;
    r->kept_site[r->kept++] = site;
  }
  r->pair = plan->left == 1 && plan->right == 1 && r->kept == 2 && plan->support_start[1] == 1;
  return true;
}

static void add_entries(const mho_plan *plan, orderer *o)
{
  for (int i = 0; i < o->r->sites && !o->failed; i++) slot_of(o, i, i);
  for (size_t e = 0; e < plan->entries && !o->failed; e++) {
    const mho_entry *entry = &plan->entry[e];
    if (entry->value_ev == 0) continue;
    int slot = slot_of(o, entry->i, entry->j);
    if (!o->failed) o->r->value_ev[slot] += entry->value_ev;
  }
}

mho_status mho_reduction_create(const mho_plan *plan, mho_reduction **reduction)
{
  *reduction = NULL;
  size_t n = (size_t)plan->sites;
  if (!plan->connected || plan->sites > SITES_MAX || mho_plan_has_chain(plan))
    return MHO_OK;
  orderer o = {.r = calloc(1, sizeof *o.r),
               .slot = malloc(n * n * sizeof(int)),
               .degree = calloc(n, sizeof(int)),
               .kept = calloc(2 * n, sizeof(bool))};
  o.failed = !o.r || !o.slot || !o.degree || !o.kept;
  if (!o.failed) {
    o.r->sites = plan->sites;
    o.r->step = malloc(n * sizeof *o.r->step);
    o.gone = o.kept + n;
    o.failed = !o.r->step;
    memset(o.slot, -1, n * n * sizeof(int));
  }
  bool pays = !o.failed && keep_contacts(plan, &o);
  if (pays) add_entries(plan, &o);
  if (pays && !o.failed) order(&o);
  if (pays && !o.failed && !o.dense)
    o.failed = mho_plan_contacts(plan, o.r->kept_site, o.r->kept, &o.r->contacts) != MHO_OK;
  free(o.slot);
  free(o.degree);
  free(o.kept);
  if (pays && !o.failed && !o.dense) *reduction = o.r;
  else mho_reduction_free(o.r);
  return o.failed ? MHO_ERR_MEMORY : MHO_OK;
}

void mho_reduction_free(mho_reduction *reduction)
{
  if (!reduction) return;
  mho_plan_free(reduction->contacts);
  free(reduction->step);
  free(reduction->list);
  free(reduction->between);
  free(reduction->value_ev);
  free(reduction);
}

int mho_reduction_find(const mho_reduction *reduction, int i, int j)
{
  for (int s = 0; s < reduction->slots; s++) {
    const int *ends = reduction->between[s];
    if ((ends[0] == i && ends[1] == j) || (ends[0] == j && ends[1] == i)) return s;
  }
  return -1;
}

/* --- run ------------------------------------------------------------------------- */

void mho_reduction_run(const mho_reduction *reduction, int lanes, double *number,
                       double *largest_inverse)
{
  OF_WIDEST(mho_reduction_run)(reduction, lanes, number, largest_inverse);
}
