/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Compiles the elimination of a sparse H: an order of little fill (the site of
 * fewest neighbours next; in long molecules the narrow order of the plan), and
 * a place for every number only while it is alive.
 */
#include "solver/program.h"

#include <stdlib.h>
#include <string.h>

/* In longer molecules the plan's narrow order is as good. */
enum { GREEDY_SITES = 3000 };

/* More updates a site than this, and pivoting within the band is as good. */
enum { UPDATES_A_SITE = 600 };

typedef struct {
  int site, slot; /* slot < 0: still in H only */
  int roundings;  /* of the number so far; -1: fill, whose first is exact */
  double value;   /* of H */
} link;

typedef struct {
  link *link;
  int count, capacity;
} row;

typedef struct {
  const mho_plan *plan;
  mho_program *program;
  row *row; /* [sites], without the diagonal */
  double *diagonal;
  int *diagonal_slot, *diagonal_roundings;
  bool *kept, *gone;
  int *winner, leaves; /* [2 leaves]: tournament for the fewest neighbours */
  int *free_slot, free_slots, slot_capacity;
  size_t step_room, load_room, slot_room, member_room, updates;
  bool failed; /* out of memory */
} compiler;

static bool grow(void **array, size_t *room, size_t needed, size_t size)
{
  if (needed <= *room) return true;
  size_t larger = *room ? 2 * *room : 256;
  while (larger < needed) larger *= 2;
  void *moved = realloc(*array, larger * size);
  if (!moved) return false;
  *array = moved;
  *room = larger;
  return true;
}

static link *find_link(row *r, int site)
{
  for (int k = 0; k < r->count; k++)
    if (r->link[k].site == site) return &r->link[k];
  return NULL;
}

static link *add_link(compiler *c, int from, int to, int slot, double value)
{
  row *r = &c->row[from];
  if (r->count == r->capacity) {
    int capacity = r->capacity ? 2 * r->capacity : 4;
    link *moved = realloc(r->link, (size_t)capacity * sizeof *moved);
    if (!moved) {
      c->failed = true;
      return NULL;
    }
    r->link = moved;
    r->capacity = capacity;
  }
  r->link[r->count] = (link){to, slot, slot < 0 ? 0 : -1, value};
  return &r->link[r->count++];
}

static void remove_link(row *r, int site)
{
  for (int k = 0; k < r->count; k++)
    if (r->link[k].site == site) r->link[k--] = r->link[--r->count];
}

static int take_slot(compiler *c)
{
  if (c->free_slots > 0) return c->free_slot[--c->free_slots];
  if (c->program->slots == c->slot_capacity) {
    int capacity = c->slot_capacity ? 2 * c->slot_capacity : 64;
    int *moved = realloc(c->free_slot, (size_t)capacity * sizeof *moved);
    if (!moved) {
      c->failed = true;
      return 0;
    }
    c->free_slot = moved;
    c->slot_capacity = capacity;
  }
  return c->program->slots++;
}

static int emit_load(compiler *c, int site, double value)
{
  mho_program *p = c->program;
  int slot = take_slot(c);
  if (!grow((void **)&p->load, &c->load_room, p->loads + 1, sizeof *p->load)) c->failed = true;
  else p->load[p->loads++] = (mho_program_load){slot, site, value};
  return slot;
}

static void emit_slot(compiler *c, int slot)
{
  mho_program *p = c->program;
  if (!grow((void **)&p->slot, &c->slot_room, p->slots_listed + 1, sizeof *p->slot))
    c->failed = true;
  else p->slot[p->slots_listed++] = slot;
}

static mho_program_member *emit_member(compiler *c, double value_ev)
{
  mho_program *p = c->program;
  if (!grow((void **)&p->member, &c->member_room, p->members + 1, sizeof *p->member)) {
    c->failed = true;
    return NULL;
  }
  p->member[p->members] = (mho_program_member){value_ev, 0};
  return &p->member[p->members++];
}

/* E - h is rounded once, unless h is zero. */
static int diagonal_slot(compiler *c, int site)
{
  if (c->diagonal_slot[site] < 0) {
    c->diagonal_slot[site] = emit_load(c, site, c->diagonal[site]);
    c->diagonal_roundings[site] = c->diagonal[site] != 0;
  }
  return c->diagonal_slot[site];
}

/* Slot of the number (i, j), loaded from H if need be; -1: it is zero. */
static int pair_slot(compiler *c, int i, int j)
{
  link *here = find_link(&c->row[i], j);
  if (!here) return -1;
  if (here->slot < 0) {
    here->slot = emit_load(c, -1, here->value);
    find_link(&c->row[j], i)->slot = here->slot;
  }
  return here->slot;
}

/* Emits the target of a pair and counts one more rounding of it; returns how
 * often it was rounded before. */
static int update(compiler *c, int i, int j)
{
  c->updates++;
  if (i == j) {
    emit_slot(c, diagonal_slot(c, i));
    return c->diagonal_roundings[i]++;
  }
  int target = pair_slot(c, i, j);
  if (target >= 0) emit_slot(c, target);
  else { /* fill */
    target = take_slot(c);
    if (!add_link(c, i, j, target, 0) || !add_link(c, j, i, target, 0)) return 0;
    emit_slot(c, ~target);
  }
  find_link(&c->row[j], i)->roundings++;
  int before = find_link(&c->row[i], j)->roundings++;
  return before > 0 ? before : 0;
}

/* Slots of the row and of its sites' diagonals; returns the most roundings of a
 * number that ends here. */
static int emit_row(compiler *c, int site)
{
  const row *r = &c->row[site];
  int most = 0;
  for (int a = 0; a < r->count; a++) {
    emit_slot(c, pair_slot(c, site, r->link[a].site));
    if (r->link[a].roundings > most) most = r->link[a].roundings;
  }
  for (int a = 0; a < r->count; a++) emit_slot(c, diagonal_slot(c, r->link[a].site));
  return most;
}

/* Targets of all pairs (a <= b) of the row.  A pair's earlier roundings are
 * shared between its two members: half of the most of each. */
static void emit_updates(compiler *c, const row *r, mho_program_member *member)
{
  for (int a = 0; a < r->count; a++) member[a].weight = 1.5;
  for (int a = 0; a < r->count && !c->failed; a++)
    for (int b = a; b < r->count && !c->failed; b++) {
      double weight = 1.5 + 0.5 * update(c, r->link[a].site, r->link[b].site);
      if (weight > member[a].weight) member[a].weight = weight;
      if (weight > member[b].weight) member[b].weight = weight;
    }
}

/* A step: loads, row slots, then targets. */
static void eliminate(compiler *c, int site)
{
  mho_program *p = c->program;
  row *r = &c->row[site];
  size_t loads = p->loads, member = p->members;
  int pivot = diagonal_slot(c, site), count = r->count, most = emit_row(c, site);
  emit_member(c, c->diagonal[site]);
  for (int a = 0; a < count; a++) emit_member(c, r->link[a].value);
  if (!grow((void **)&p->step, &c->step_room, p->steps + 1, sizeof *p->step)) c->failed = true;
  if (c->failed) return;
  p->member[member].weight = most + 0.5 * c->diagonal_roundings[site];
  emit_updates(c, r, p->member + member + 1);
  if (c->failed) return;
  p->taped += 1 + (size_t)count;
  p->step[p->steps++] = (mho_program_step){(int)(p->loads - loads), count, pivot};
  c->free_slot[c->free_slots++] = pivot;
  for (int a = 0; a < count; a++) {
    c->free_slot[c->free_slots++] = r->link[a].slot;
    remove_link(&c->row[r->link[a].site], site);
  }
  c->gone[site] = true;
}

/* Of two sites, or -1 for none, that to eliminate first. */
static int fewer(const compiler *c, int a, int b)
{
  if (a < 0 || b < 0) return a < 0 ? b : a;
  return c->row[b].count < c->row[a].count ? b : a;
}

/* Replays the matches of a site whose neighbours changed, or that is gone. */
static void replay(compiler *c, int site)
{
  if (!c->winner) return;
  int at = c->leaves + site;
  c->winner[at] = c->gone[site] || c->kept[site] ? -1 : site;
  for (at /= 2; at > 0; at /= 2)
    c->winner[at] = fewer(c, c->winner[2 * at], c->winner[2 * at + 1]);
}

static bool start_tournament(compiler *c)
{
  int n = c->plan->sites;
  if (n > GREEDY_SITES) return true;
  for (c->leaves = 1; c->leaves < n;) c->leaves *= 2;
  c->winner = malloc(2 * (size_t)c->leaves * sizeof(int));
  if (!c->winner) return false;
  for (int i = 0; i < c->leaves; i++) c->winner[c->leaves + i] = i < n && !c->kept[i] ? i : -1;
  for (int at = c->leaves - 1; at > 0; at--)
    c->winner[at] = fewer(c, c->winner[2 * at], c->winner[2 * at + 1]);
  return true;
}

static int next_site(const compiler *c, size_t turn)
{
  return c->winner ? c->winner[1] : c->plan->order[turn];
}

static void eliminate_all(compiler *c)
{
  size_t n = (size_t)c->plan->sites;
  for (size_t turn = 0; turn < n && !c->failed; turn++) {
    if (c->updates > UPDATES_A_SITE * n) return;
    int site = next_site(c, turn);
    if (site >= 0 && !c->kept[site]) eliminate(c, site);
    if (site < 0 || !c->winner || c->failed) continue;
    for (int a = 0; a < c->row[site].count; a++) replay(c, c->row[site].link[a].site);
    replay(c, site);
  }
  mho_program *p = c->program;
  size_t before = p->loads;
  for (int a = 0; a < p->kept; a++)
    for (int b = 0; b <= a; b++) {
      int i = p->kept_site[a], j = p->kept_site[b];
      p->kept_slot[a][b] = p->kept_slot[b][a] =
          i == j ? diagonal_slot(c, i) : pair_slot(c, i, j);
      const link *pair = find_link(&c->row[i], j);
      int roundings = i == j ? c->diagonal_roundings[i] : pair ? pair->roundings : 0;
      p->kept_member[a][b] = (mho_program_member){
          i == j ? c->diagonal[i] : pair ? pair->value : 0, roundings > 0 ? roundings : 0};
    }
  p->tail_loads = (int)(p->loads - before);
}

static bool start(compiler *c)
{
  const mho_plan *plan = c->plan;
  size_t n = (size_t)plan->sites;
  c->row = calloc(n, sizeof *c->row);
  c->diagonal = calloc(n, sizeof(double));
  c->diagonal_slot = calloc(2 * n, sizeof(int));
  c->kept = calloc(2 * n, sizeof(bool));
  if (!c->row || !c->diagonal || !c->diagonal_slot || !c->kept) return false;
  c->gone = c->kept + n;
  c->diagonal_roundings = c->diagonal_slot + n;
  for (size_t i = 0; i < n; i++) c->diagonal_slot[i] = -1;
  for (size_t e = 0; e < plan->entries && !c->failed; e++) {
    int i = plan->entry[e].i, j = plan->entry[e].j;
    double value = plan->entry[e].value_ev;
    if (i == j) c->diagonal[i] += value;
    else if (value != 0.0) {
      link *here = find_link(&c->row[i], j);
      if (here) { /* one more entry of the pair */
        here->value += value;
        find_link(&c->row[j], i)->value += value;
      } else if (add_link(c, i, j, -1, value)) add_link(c, j, i, -1, value);
    }
  }
  return !c->failed;
}

/* The contacts' sites; false where there are too many. */
static bool keep_contacts(compiler *c)
{
  mho_program *p = c->program;
  for (size_t k = 0; k < c->plan->support_start[c->plan->channels]; k++) {
    int site = c->plan->support[k];
    if (c->kept[site]) continue;
    if (p->kept == PROGRAM_KEPT_MAX) return false;
    c->kept[site] = true;
    p->kept_site[p->kept++] = site;
  }
  return true;
}

static void finish(compiler *c)
{
  for (int i = 0; c->row && i < c->plan->sites; i++) free(c->row[i].link);
  free(c->row);
  free(c->diagonal);
  free(c->diagonal_slot);
  free(c->kept);
  free(c->winner);
  free(c->free_slot);
}

mho_status mho_program_create(const mho_plan *plan, mho_program **program)
{
  compiler c = {.plan = plan, .program = calloc(1, sizeof(mho_program))};
  *program = NULL;
  bool pays = false;
  if (!c.program || !start(&c)) c.failed = true;
  else if (keep_contacts(&c) && !(c.failed = !start_tournament(&c))) {
    eliminate_all(&c);
    pays = c.updates <= UPDATES_A_SITE * (size_t)plan->sites;
  }
  finish(&c);
  if (pays && !c.failed) *program = c.program;
  else mho_program_free(c.program);
  return c.failed ? MHO_ERR_MEMORY : MHO_OK;
}

void mho_program_free(mho_program *program)
{
  if (!program) return;
  free(program->step);
  free(program->load);
  free(program->slot);
  free(program->member);
  free(program);
}
