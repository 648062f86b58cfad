/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Places and how sure they are.  A conductance (log10) of candidate i is
 *
 *   x_i + sum_p a_ip z_p + b_i w_i,   z, w independent and standard normal,
 *
 * a_ip = dlog10G/dp sigma_p for the parameters p that all candidates share, so
 * that what moves all of them alike changes no place; b_i makes the sum of the
 * squares that of its error.  Where the error is that of Monte Carlo, a_ip is
 * scaled by its ratio to the linear rule's; where the shared part alone exceeds
 * the error (h of several like sites counts as one here, as independent there)
 * it is scaled to it.  Other quantities have no error.
 *
 * Who is sampled: a candidate below the nominal top reaches it only by passing
 * one of it, so sum_j P(i above j) over the top bounds its probability; those
 * below RARE keep 0.  Where very many are left, samples become fewer.
 */
#include <mho/screen.h>

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include <omp.h>

#include "base/random.h"

/* Odds that 4000 samples would hardly see. */
#define RARE 1e-4

/* A draw beyond that many sigma is left out (probability 1e-9). */
#define FAR_SIGMA 6.0

/* P(order is right) = 90 %, one-sided quantile of the normal distribution. */
#define SIGMA_90 1.2815515655446004

enum { SAMPLES_MIN = 100, SAMPLES_MAX = 1000000 };

/* Draws of all samples together. */
#define DRAWS_MAX 1e8

typedef struct {
  size_t index;
  double score; /* larger is better */
} entry;

/* Error of a candidate's quantity, shared and its own. */
typedef struct {
  double shared[MHO_SHARED_COUNT], own, total;
} spread;

typedef struct {
  const mho_screen_quantities *candidate;
  const mho_screen_rank_options *options;
  double sigma[MHO_SHARED_COUNT];
  double unknown; /* error of a conductance that has none: the largest of all */
  int active[MHO_SHARED_COUNT], actives; /* parameters that some candidate depends on */
  entry *entry;   /* those that meet all requirements, best first */
  size_t count, defined, top;
} ranker;

mho_screen_rank_options mho_screen_rank_defaults(void)
{
  return (mho_screen_rank_options){.goal = {MHO_AIM_MAXIMISE, MHO_SCREEN_log10_g0, 0},
                                   .top = MHO_SCREEN_TOP,
                                   .samples = MHO_SCREEN_SAMPLES,
                                   .seed = 1,
                                   .sigma = mho_sensitivity_defaults().sigma};
}

static void set_sigmas(const mho_uncertainties *from, double sigma[MHO_SHARED_COUNT])
{
  sigma[MHO_SHARED_FERMI] = from->fermi_ev;
  sigma[MHO_SHARED_BETA] = from->beta_ev;
  for (int p = MHO_SHARED_COUPLING; p < MHO_SHARED_H; p++) sigma[p] = from->ln_coupling;
  for (int p = MHO_SHARED_H; p < MHO_SHARED_K; p++) sigma[p] = from->h;
  for (int p = MHO_SHARED_K; p < MHO_SHARED_COUNT; p++) sigma[p] = from->k;
}

static double score_of(const mho_screen_goal *goal, double value)
{
  if (goal->aim == MHO_AIM_MATCH) return -fabs(value - goal->value);
  return goal->aim == MHO_AIM_MAXIMISE ? value : -value;
}

/* Sign with which the value enters the score. */
static double slope_of(const mho_screen_goal *goal, double value)
{
  if (goal->aim == MHO_AIM_MATCH) return value > goal->value ? -1 : 1;
  return goal->aim == MHO_AIM_MAXIMISE ? 1 : -1;
}

static bool has_errors(const ranker *r)
{
  return mho_screen_quantity_at(r->options->goal.quantity)->form == MHO_FORM_CONDUCTANCE;
}

/* Errors in the score's direction. */
static spread spread_of(const ranker *r, const entry *e)
{
  const mho_screen_quantities *q = &r->candidate[e->index];
  const mho_screen_goal *goal = &r->options->goal;
  spread s = {.total = 0};
  double value, linear, square = 0;
  if (!has_errors(r) || !mho_screen_value(q, goal->quantity, &value)) return s;
  if (!mho_screen_value(q, MHO_SCREEN_error_decades, &s.total)) s.total = r->unknown;
  if (mho_screen_value(q, MHO_SCREEN_linear_decades, &linear) && linear > 0)
    for (int p = 0; p < MHO_SHARED_COUNT; p++) {
      s.shared[p] = slope_of(goal, value) * (double)q->shared[p] * r->sigma[p] * s.total / linear;
      square += s.shared[p] * s.shared[p];
    }
  double excess = square > s.total * s.total ? s.total / sqrt(square) : 1;
  for (int p = 0; p < MHO_SHARED_COUNT; p++) s.shared[p] *= excess;
  s.own = excess < 1 ? 0 : sqrt(s.total * s.total - square);
  return s;
}

static double sigma_of_difference(const ranker *r, const spread *a, const spread *b)
{
  double square = a->own * a->own + b->own * b->own;
  for (int k = 0; k < r->actives; k++) {
    double difference = a->shared[r->active[k]] - b->shared[r->active[k]];
    square += difference * difference;
  }
  return sqrt(square);
}

/* --- order ------------------------------------------------------------------ */

static int compare_entries(const void *a, const void *b)
{
  const entry *p = a, *q = b;
  if (p->score != q->score) return p->score > q->score ? -1 : 1;
  return (p->index > q->index) - (p->index < q->index);
}

static bool meets_all(const ranker *r, const mho_screen_quantities *q)
{
  for (size_t k = 0; k < r->options->requirements; k++)
    if (!mho_screen_meets(q, &r->options->requirement[k])) return false;
  return true;
}

static void set_order(ranker *r, size_t n)
{
  bool used[MHO_SHARED_COUNT] = {false};
  for (size_t i = 0; i < n; i++) {
    double value, error;
    if (mho_screen_value(&r->candidate[i], MHO_SCREEN_error_decades, &error))
      r->unknown = fmax(r->unknown, error);
    if (!meets_all(r, &r->candidate[i])) continue;
    for (int p = 0; p < MHO_SHARED_COUNT; p++) used[p] |= r->candidate[i].shared[p] != 0;
    bool defined = mho_screen_value(&r->candidate[i], r->options->goal.quantity, &value);
    r->entry[r->count++] = (entry){i, defined ? score_of(&r->options->goal, value) : -INFINITY};
    r->defined += defined;
  }
  for (int p = 0; p < MHO_SHARED_COUNT; p++)
    if (used[p]) r->active[r->actives++] = p;
  qsort(r->entry, r->count, sizeof *r->entry, compare_entries);
  r->top = r->options->top < r->count ? r->options->top : r->count;
}

/* --- who may reach the top ---------------------------------------------------- */

/* Bound on P(score of a candidate rises above that of one of the top). */
static double chance_to_pass(const ranker *r, double ahead, const spread *it, const spread *other)
{
  double square_root_2 = 1.4142135623730951;
  if (ahead <= 0) return 1;
  if (r->options->goal.aim == MHO_AIM_MATCH) { /* |d| + |d'| must exceed the distance */
    double sum = it->total + other->total;
    return sum > 0 ? 2 * erfc(ahead / sum / square_root_2) : 0;
  }
  double sum = it->total + other->total;
  if (!(sum > 0) || erfc(ahead / sum / square_root_2) < RARE * 1e-3) return 0;
  double sigma = sigma_of_difference(r, it, other);
  return sigma > 0 ? 0.5 * erfc(ahead / sigma / square_root_2) : 0;
}

/* What sampling needs of the candidates that it looks at, best first. */
typedef struct {
  size_t count;
  size_t *at;      /* into ranker->entry */
  double *value;   /* nominal */
  double *own;
  double *shared;  /* [count][actives] */
} contenders;

static void clear_contenders(contenders *c)
{
  free(c->at);
  free(c->value);
  free(c->own);
  free(c->shared);
}

static bool add_contender(const ranker *r, contenders *c, size_t at, const spread *s,
                          size_t *capacity)
{
  if (c->count == *capacity) {
    *capacity = *capacity ? 2 * *capacity : 1024;
    size_t *place = realloc(c->at, *capacity * sizeof *place);
    if (place) c->at = place;
    double *value = realloc(c->value, *capacity * sizeof *value);
    if (value) c->value = value;
    double *own = realloc(c->own, *capacity * sizeof *own);
    if (own) c->own = own;
    double *shared = realloc(c->shared, *capacity * (size_t)(r->actives + 1) * sizeof *shared);
    if (shared) c->shared = shared;
    if (!place || !value || !own || !shared) return false;
  }
  size_t k = c->count++;
  c->at[k] = at;
  c->own[k] = s->own;
  mho_screen_value(&r->candidate[r->entry[at].index], r->options->goal.quantity, &c->value[k]);
  for (int p = 0; p < r->actives; p++)
    c->shared[k * (size_t)r->actives + (size_t)p] = s->shared[r->active[p]];
  return true;
}

static mho_status find_contenders(const ranker *r, contenders *c)
{
  size_t capacity = 0, top = r->top < r->defined ? r->top : r->defined;
  *c = (contenders){0};
  spread *best = malloc((top + 1) * sizeof *best);
  bool good = best != NULL;
  for (size_t j = 0; good && j < top; j++) {
    best[j] = spread_of(r, &r->entry[j]);
    good = add_contender(r, c, j, &best[j], &capacity);
  }
  for (size_t i = top; good && top && i < r->defined; i++) {
    spread s = spread_of(r, &r->entry[i]);
    double chance = 0;
    for (size_t j = 0; j < top && chance < RARE; j++)
      chance += chance_to_pass(r, r->entry[j].score - r->entry[i].score, &s, &best[j]);
    if (chance >= RARE) good = add_contender(r, c, i, &s, &capacity);
  }
  free(best);
  return good ? MHO_OK : MHO_ERR_MEMORY;
}

/* --- sampling ----------------------------------------------------------------- */

/* The best of a sample so far: a heap with the worst at its root. */
typedef struct {
  entry *item;
  size_t count, capacity;
} heap;

static bool is_worse(const entry *a, const entry *b) { return compare_entries(a, b) > 0; }

static void sink(heap *h, size_t at)
{
  for (;;) {
    size_t worst = at, child = 2 * at + 1;
    for (size_t k = child; k < child + 2 && k < h->count; k++)
      if (is_worse(&h->item[k], &h->item[worst])) worst = k;
    if (worst == at) return;
    entry swapped = h->item[at];
    h->item[at] = h->item[worst];
    h->item[worst] = swapped;
    at = worst;
  }
}

static void offer(heap *h, entry e)
{
  if (h->count < h->capacity) {
    h->item[h->count++] = e;
    if (h->count == h->capacity)
      for (size_t k = h->count / 2; k-- > 0;) sink(h, k);
  } else if (is_worse(&h->item[0], &e)) {
    h->item[0] = e;
    sink(h, 0);
  }
}

/* Sample `s`: shared draws from (seed, s), each own one from it and the
 * candidate, so that no result depends on who else is drawn. */
static void draw_sample(const ranker *r, const contenders *c, uint64_t s, heap *h, uint32_t *hits)
{
  const mho_screen_goal *goal = &r->options->goal;
  double z[MHO_SHARED_COUNT];
  mho_random random = mho_random_stream(r->options->seed, s);
  for (int p = 0, k = 0; p < MHO_SHARED_COUNT; p++) { /* of all, whoever is in the list */
    double draw = mho_random_normal(&random);
    if (k < r->actives && r->active[k] == p) z[k++] = draw;
  }
  uint64_t own_seed = mho_random_bits(&random);
  h->count = 0;
  for (size_t k = 0; k < c->count; k++) {
    const double *a = c->shared + k * (size_t)r->actives;
    double shift = 0;
    for (int p = 0; p < r->actives; p++) shift += a[p] * z[p];
    double slope = slope_of(goal, c->value[k]), value = c->value[k] + slope * shift;
    bool hopeless = goal->aim != MHO_AIM_MATCH && h->count == h->capacity &&
                    slope * value + FAR_SIGMA * c->own[k] < h->item[0].score;
    if (hopeless) continue;
    mho_random own = mho_random_stream(own_seed, r->entry[c->at[k]].index);
    if (c->own[k] > 0) value += slope * c->own[k] * mho_random_normal(&own);
    offer(h, (entry){k, score_of(goal, value)});
  }
  for (size_t k = 0; k < h->count; k++) hits[h->item[k].index]++;
}

static mho_status sample(const ranker *r, const contenders *c, mho_screen_place *place)
{
  size_t top = r->top < c->count ? r->top : c->count;
  int threads = omp_get_max_threads(), samples = r->options->samples;
  double affordable = DRAWS_MAX / (double)(c->count ? c->count : 1);
  if (samples > affordable) samples = affordable > SAMPLES_MIN ? (int)affordable : SAMPLES_MIN;
  uint32_t *hits = calloc((size_t)threads * c->count + 1, sizeof *hits);
  entry *item = malloc(((size_t)threads * top + 1) * sizeof *item);
  mho_status status = hits && item ? MHO_OK : MHO_ERR_MEMORY;
  if (status == MHO_OK) {
#pragma omp parallel num_threads(threads)
    {
      size_t me = (size_t)omp_get_thread_num();
      heap h = {item + me * top, 0, top};
#pragma omp for schedule(static)
      for (int s = 0; s < samples; s++)
        draw_sample(r, c, (uint64_t)s, &h, hits + me * c->count);
    }
    for (size_t k = 0; k < c->count; k++) {
      uint64_t sum = 0;
      for (int t = 0; t < threads; t++) sum += hits[(size_t)t * c->count + k];
      place[r->entry[c->at[k]].index].top_probability = (double)sum / samples;
    }
  }
  free(hits);
  free(item);
  return status;
}

/* --- all ---------------------------------------------------------------------- */

static size_t count_groups(const ranker *r)
{
  size_t groups = r->top > 0, first = 0, top = r->top < r->defined ? r->top : r->defined;
  for (size_t k = 1; k < top; k++) {
    spread a = spread_of(r, &r->entry[first]), b = spread_of(r, &r->entry[k]);
    double ahead = r->entry[first].score - r->entry[k].score;
    if (!(ahead > SIGMA_90 * sigma_of_difference(r, &a, &b))) continue;
    groups++;
    first = k;
  }
  return groups + (top > 0 && r->top > top);
}

static mho_status check_options(const mho_screen_rank_options *options, mho_error *error)
{
  const mho_screen_quantity *q = mho_screen_quantity_at(options->goal.quantity);
  if (!q || q->form == MHO_FORM_LINKER || q->form == MHO_FORM_WARNINGS)
    return mho_fail(error, MHO_ERR_RANGE, "screen", "goal", "a goal needs a quantity that is a number");
  if (options->top < 1)
    return mho_fail(error, MHO_ERR_RANGE, "screen", "top", "top must be at least 1");
  if (options->samples < SAMPLES_MIN || options->samples > SAMPLES_MAX)
    return mho_fail(error, MHO_ERR_RANGE, "screen", "samples", "samples must be %d to %d",
                    SAMPLES_MIN, SAMPLES_MAX);
  return MHO_OK;
}

mho_status mho_screen_rank(const mho_screen_quantities *candidate, size_t n,
                           const mho_screen_rank_options *options, mho_screen_place *place,
                           mho_screen_ranking *ranking, mho_error *error)
{
  mho_screen_rank_options defaults = mho_screen_rank_defaults();
  if (!options) options = &defaults;
  *ranking = (mho_screen_ranking){0};
  if (n) memset(place, 0, n * sizeof *place);
  mho_status status = check_options(options, error);
  if (status != MHO_OK) return status;
  ranker r = {.candidate = candidate, .options = options};
  contenders c = {0};
  set_sigmas(&options->sigma, r.sigma);
  r.entry = malloc((n + 1) * sizeof *r.entry);
  if (!r.entry) return mho_fail(error, MHO_ERR_MEMORY, "screen", NULL, "out of memory");
  set_order(&r, n);
  for (size_t k = 0; k < r.count; k++) {
    mho_screen_place *at = &place[r.entry[k].index];
    *at = (mho_screen_place){k + 1, k >= r.defined && k < r.top, spread_of(&r, &r.entry[k]).total};
  }
  status = find_contenders(&r, &c);
  if (status == MHO_OK) status = sample(&r, &c, place);
  if (status != MHO_OK) mho_fail(error, status, "screen", NULL, "out of memory");
  *ranking = (mho_screen_ranking){r.count, n - r.count, r.count - r.defined, r.top,
                                  count_groups(&r)};
  clear_contenders(&c);
  free(r.entry);
  return status;
}
