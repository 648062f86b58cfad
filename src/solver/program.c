/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Compiles the elimination of a sparse H.  The site of fewest neighbours is next
 * (H. M. Markowitz, Manag. Sci. 3, 255 (1957)), of these the one whose surroundings
 * changed longest ago, so that a chain is halved and halved again and no number is
 * rounded more often than the logarithm of the length.  Then the sites are put in
 * an order of the same arithmetic, children before their parent in the tree of
 * eliminations and one subtree after the other (J. W. H. Liu, SIAM J. Matrix Anal.
 * Appl. 11, 134 (1990)): few numbers are alive at once, and each has its place only
 * while it is.
 */
#include "solver/program.h"

#include <stdlib.h>
#include <string.h>

/* More updates a site than this, and pivoting within the band is as good. */
enum { UPDATES_A_SITE = 600 };

/* The tape of a longer one does not stay in the caches, and half of it is quicker. */
enum { TAPE_LONG = 5000 };

/* Bonds of a site that need no room of their own; of as many neighbours or more,
 * sites are not told apart by their number. */
enum { ROW_SHORT = 6, QUEUES = 64, ROOM_A_SITE = 4 };

/* A number of E - H or of its fill; that of the diagonal has its site's name. */
typedef struct {
  double value;   /* of H */
  int slot;       /* -1: not yet alive */
  int roundings;
} number;

typedef struct {
  int site, number;
} link;

typedef struct {
  link *link;
  int count, capacity;
} links;

typedef struct {
  int *item;
  size_t count, room;
} list;

typedef struct {
  const mho_plan *plan;
  mho_program *program;
  links *row; /* [sites], without the diagonal */
  link *shorts; /* [sites][ROW_SHORT] */
  bool *kept;
  number *number;
  size_t numbers, number_room;
  int head[QUEUES], tail[QUEUES], *next, *before, *queue; /* sites by neighbours */
  list site, start, record; /* of a step: its site; where its record starts: sites of
                             * the row, its numbers, then a target for each pair */
  int *place, *parent, *position; /* of a site: its step; of a step */
  list free_slot;
  size_t step_room, load_room, slot_room, updates;
  bool failed; /* out of memory */
} compiler;

/* Room for what a chain needs, and then twice that. */
static bool grow(compiler *c, void **array, size_t *room, size_t needed, size_t size)
{
  if (needed <= *room) return true;
  size_t larger = *room ? 2 * *room : ROOM_A_SITE * (size_t)c->plan->sites;
  while (larger < needed) larger *= 2;
  void *moved = realloc(*array, larger * size);
  if (!moved) return false;
  *array = moved;
  *room = larger;
  return true;
}

static void push(compiler *c, list *l, int item)
{
  if (!grow(c, (void **)&l->item, &l->room, l->count + 1, sizeof *l->item)) c->failed = true;
  else l->item[l->count++] = item;
}

/* --- rows --------------------------------------------------------------------------- */

static const link *find_link(const links *r, int site)
{
  for (int k = 0; k < r->count; k++)
    if (r->link[k].site == site) return &r->link[k];
  return NULL;
}

static void add_link(compiler *c, int from, int to, int n)
{
  links *r = &c->row[from];
  if (r->count == r->capacity) {
    bool was_short = r->capacity == ROW_SHORT;
    link *moved = realloc(was_short ? NULL : r->link, 2 * (size_t)r->capacity * sizeof *moved);
    if (!moved) {
      c->failed = true;
      return;
    }
    if (was_short) memcpy(moved, r->link, ROW_SHORT * sizeof *moved);
    r->link = moved;
    r->capacity *= 2;
  }
  r->link[r->count++] = (link){to, n};
}

static void remove_link(links *r, int site)
{
  for (int k = 0; k < r->count; k++)
    if (r->link[k].site == site) r->link[k--] = r->link[--r->count];
}

static int add_number(compiler *c)
{
  if (!grow(c, (void **)&c->number, &c->number_room, c->numbers + 1, sizeof *c->number)) {
    c->failed = true;
    return 0;
  }
  c->number[c->numbers] = (number){0, -1, 0};
  return (int)c->numbers++;
}

/* The number (i, j); -1: it is zero. */
static int number_of(const compiler *c, int i, int j)
{
  if (i == j) return i;
  const link *here = find_link(&c->row[i], j);
  return here ? here->number : -1;
}

/* The same, which from now on is not zero. */
static int joined(compiler *c, int i, int j)
{
  int n = number_of(c, i, j);
  if (n >= 0) return n;
  n = add_number(c);
  add_link(c, i, j, n);
  add_link(c, j, i, n);
  return n;
}

/* --- the next site ------------------------------------------------------------------ */

static void unqueue(compiler *c, int site)
{
  int q = c->queue[site], next = c->next[site], before = c->before[site];
  *(before < 0 ? &c->head[q] : &c->next[before]) = next;
  *(next < 0 ? &c->tail[q] : &c->before[next]) = before;
}

static void enqueue(compiler *c, int site)
{
  int q = c->row[site].count < QUEUES ? c->row[site].count : QUEUES - 1;
  c->queue[site] = q;
  c->next[site] = -1;
  c->before[site] = c->tail[q];
  *(c->tail[q] < 0 ? &c->head[q] : &c->next[c->tail[q]]) = site;
  c->tail[q] = site;
}

static void start_queues(compiler *c)
{
  for (int q = 0; q < QUEUES; q++) c->head[q] = c->tail[q] = -1;
  for (int i = 0; i < c->plan->sites; i++)
    if (!c->kept[i]) enqueue(c, i);
}

static int next_site(compiler *c)
{
  for (int q = 0; q < QUEUES; q++)
    if (c->head[q] >= 0) return c->head[q];
  return -1;
}

/* --- eliminations and their order ---------------------------------------------------- */

static void eliminate(compiler *c, int site)
{
  links *r = &c->row[site];
  int count = r->count;
  c->place[site] = (int)c->site.count;
  push(c, &c->site, site);
  push(c, &c->start, (int)c->record.count);
  for (int a = 0; a < count; a++) push(c, &c->record, r->link[a].site);
  for (int a = 0; a < count; a++) push(c, &c->record, r->link[a].number);
  for (int a = 0; a < count; a++) remove_link(&c->row[r->link[a].site], site);
  for (int a = 0; a < count && !c->failed; a++)
    for (int b = a; b < count && !c->failed; b++) {
      int target = joined(c, r->link[a].site, r->link[b].site);
      push(c, &c->record, target);
      c->number[target].roundings++;
      c->updates++;
    }
  for (int a = 0; a < count && !c->failed; a++) {
    int other = r->link[a].site;
    if (c->kept[other]) continue;
    unqueue(c, other);
    enqueue(c, other);
  }
}

/* False where too much fills in. */
static bool eliminate_all(compiler *c)
{
  start_queues(c);
  for (int site; (site = next_site(c)) >= 0 && !c->failed;) {
    if (c->updates > UPDATES_A_SITE * (size_t)c->plan->sites) return false;
    unqueue(c, site);
    eliminate(c, site);
  }
  return true;
}

/* Parent of a step: the first of its row's sites to be eliminated.  A subtree's
 * steps stand together, itself last; position[k] is the k-th step to do. */
static bool put_in_order(compiler *c)
{
  int steps = (int)c->site.count, first = 0;
  c->parent = malloc(3 * ((size_t)steps + 1) * sizeof(int));
  c->position = calloc((size_t)steps + 1, sizeof(int));
  if (!c->parent || !c->position) return false;
  int *size = c->parent + steps, *cursor = size + steps;
  for (int k = 0; k < steps; k++) size[k] = 1;
  for (int k = 0; k < steps; k++) {
    const int *site = c->record.item + c->start.item[k];
    int count = c->row[c->site.item[k]].count;
    c->parent[k] = -1;
    for (int a = 0; a < count; a++)
      if (!c->kept[site[a]] && (c->parent[k] < 0 || c->place[site[a]] < c->parent[k]))
        c->parent[k] = c->place[site[a]];
    if (c->parent[k] >= 0) size[c->parent[k]] += size[k];
  }
  for (int k = steps; k-- > 0;) {
    int *from = c->parent[k] < 0 ? &first : &cursor[c->parent[k]];
    cursor[k] = *from;
    *from += size[k];
    c->position[*from - 1] = k;
  }
  return true;
}

/* --- the program ---------------------------------------------------------------------- */

static void emit_slot(compiler *c, int slot)
{
  mho_program *p = c->program;
  if (!grow(c, (void **)&p->slot, &c->slot_room, p->slots_listed + 1, sizeof *p->slot))
    c->failed = true;
  else p->slot[p->slots_listed++] = slot;
}

static int take_slot(compiler *c)
{
  if (c->free_slot.count) return c->free_slot.item[--c->free_slot.count];
  return c->program->slots++;
}

static void emit_load(compiler *c, int slot, double value_ev)
{
  mho_program *p = c->program;
  if (!grow(c, (void **)&p->load, &c->load_room, p->loads + 1, sizeof *p->load))
    c->failed = true;
  else p->load[p->loads++] = (mho_program_load){slot, value_ev};
}

/* Gives the number a place and loads it.  (Fill lives from its first update on.) */
static void enliven(compiler *c, int n, mho_program_step *step)
{
  number *it = &c->number[n];
  if (it->slot >= 0) return;
  it->slot = take_slot(c);
  emit_load(c, it->slot, it->value);
  if (n < c->plan->sites) step->diagonals++;
  else step->bonds++;
}

/* Are pivot and row of a site still those of H? */
static bool is_bare(const compiler *c, int site, const int *row_number, int row)
{
  if (row > PROGRAM_BARE_ROW || c->number[site].roundings) return false;
  for (int a = 0; a < row; a++)
    if (c->number[row_number[a]].roundings) return false;
  return true;
}

/* The numbers of a step that were not alive yet, diagonals first. */
static void emit_loads(compiler *c, int site, const int *record, mho_program_step *step)
{
  int row = step->row, pairs = row * (row + 1) / 2;
  bool bare = step->pivot == PROGRAM_BARE;
  for (int a = -1; bare && a < row; a++)
    emit_load(c, -1, c->number[a < 0 ? site : record[row + a]].value);
  if (!bare) enliven(c, site, step);
  for (int a = 0; a < row; a++) enliven(c, record[a], step);
  for (int a = 0; !bare && a < row; a++) enliven(c, record[row + a], step);
  for (int a = 0; a < pairs; a++)
    if (c->number[record[2 * row + a]].value != 0) enliven(c, record[2 * row + a], step);
}

static void emit_step(compiler *c, int k)
{
  mho_program *p = c->program;
  int site = c->site.item[k], row = c->row[site].count, pairs = row * (row + 1) / 2;
  const int *record = c->record.item + c->start.item[k];
  bool bare = is_bare(c, site, record + row, row);
  mho_program_step step = {.row = row, .pivot = bare ? PROGRAM_BARE : 0};
  emit_loads(c, site, record, &step);
  if (!bare) step.pivot = c->number[site].slot;
  for (int a = 0; !bare && a < row; a++) emit_slot(c, c->number[record[row + a]].slot);
  for (int a = 0; a < row; a++) emit_slot(c, c->number[record[a]].slot);
  for (int a = 0; a < pairs; a++) {
    number *target = &c->number[record[2 * row + a]];
    bool fresh = target->slot < 0;
    if (fresh) target->slot = take_slot(c);
    emit_slot(c, fresh ? ~target->slot : target->slot);
  }
  if (!grow(c, (void **)&p->step, &c->step_room, p->steps + 1, sizeof *p->step))
    c->failed = true;
  if (c->failed) return;
  p->step[p->steps++] = step;
  if (bare) return;
  p->taped += 1 + (size_t)row;
  push(c, &c->free_slot, step.pivot);
  for (int a = 0; a < row; a++) push(c, &c->free_slot, c->number[record[row + a]].slot);
}

/* The Schur complement; what no step asked for is loaded. */
static void emit_kept(compiler *c)
{
  mho_program *p = c->program;
  for (int pass = 0; pass < 2; pass++) /* diagonals first */
    for (int a = 0; a < p->kept; a++)
      for (int b = 0; b <= a; b++) {
        int n = number_of(c, p->kept_site[a], p->kept_site[b]);
        if (n >= 0 && (pass || a == b)) enliven(c, n, &p->last);
        p->kept_slot[a][b] = p->kept_slot[b][a] = n < 0 ? -1 : c->number[n].slot;
      }
  p->lanes = p->taped > TAPE_LONG ? PROGRAM_LANES / 2 : PROGRAM_LANES;
  for (size_t n = 0; n < c->numbers; n++)
    if (c->number[n].roundings > p->roundings) p->roundings = c->number[n].roundings;
}

/* --- from the plan and back ------------------------------------------------------------ */

static bool start(compiler *c)
{
  const mho_plan *plan = c->plan;
  size_t n = (size_t)plan->sites;
  c->row = calloc(n, sizeof *c->row);
  c->shorts = malloc(n * ROW_SHORT * sizeof *c->shorts);
  c->kept = calloc(n, sizeof(bool));
  c->next = malloc(4 * n * sizeof(int));
  if (!c->row || !c->shorts || !c->kept || !c->next) return false;
  c->before = c->next + n;
  c->queue = c->before + n;
  c->place = c->queue + n;
  for (size_t i = 0; i < n; i++) {
    c->row[i] = (links){c->shorts + i * ROW_SHORT, 0, ROW_SHORT};
    add_number(c);
  }
  for (size_t e = 0; e < plan->entries && !c->failed; e++) {
    int i = plan->entry[e].i, j = plan->entry[e].j;
    double value = plan->entry[e].value_ev;
    int it = value != 0 ? joined(c, i, j) : -1;
    if (it >= 0) c->number[it].value += value;
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
  for (int i = 0; c->row && i < c->plan->sites; i++)
    if (c->row[i].capacity > ROW_SHORT) free(c->row[i].link);
  free(c->row);
  free(c->shorts);
  free(c->kept);
  free(c->next);
  free(c->number);
  free(c->site.item);
  free(c->start.item);
  free(c->record.item);
  free(c->parent);
  free(c->position);
  free(c->free_slot.item);
}

mho_status mho_program_create(const mho_plan *plan, mho_program **program)
{
  compiler c = {.plan = plan, .program = calloc(1, sizeof(mho_program))};
  *program = NULL;
  c.failed = !c.program || !start(&c);
  bool pays = !c.failed && keep_contacts(&c) && eliminate_all(&c);
  if (pays && !c.failed) c.failed = !put_in_order(&c);
  for (size_t k = 0; pays && !c.failed && k < c.site.count; k++) emit_step(&c, c.position[k]);
  if (pays && !c.failed) emit_kept(&c);
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
  free(program);
}
