/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Steps are found by binary segmentation of log10 G: the cut that takes most
 * from the sum of squares is made where it takes more than 3 ln(n) variances
 * of the noise (Schwarz's penalty for position and two means, with a margin),
 * and so on in both parts.  The noise comes from the median of
 * absolute first differences, which steps do not move.
 */
#include "measure/pull.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

enum { SEGMENT_POINTS = 2048, SEGMENT_LIMIT = 128 };

bool mho_pull_reserve(mho_pull *pull, size_t more)
{
  size_t needed = pull->count + more;
  if (needed <= pull->capacity) return true;
  size_t capacity = pull->capacity ? pull->capacity : MHO_TRACE_CHUNK;
  while (capacity < needed) capacity *= 2;
  double *g0 = realloc(pull->g0, capacity * sizeof *g0);
  if (g0) pull->g0 = g0;
  double *x = realloc(pull->x, capacity * sizeof *x);
  if (x) pull->x = x;
  int32_t *slot = realloc(pull->slot, capacity * sizeof *slot);
  if (slot) pull->slot = slot;
  if (!g0 || !x || !slot) return false;
  pull->capacity = capacity;
  return true;
}

void mho_pull_clear(mho_pull *pull)
{
  free(pull->g0);
  free(pull->x);
  free(pull->slot);
  *pull = (mho_pull){0};
}

bool mho_pull_align(const mho_pull *pull, double crossing_g0, size_t *index, double *zero_nm)
{
  const double *g = pull->g0, *x = pull->x;
  for (size_t i = pull->count; i-- > 1;) {
    if (!(g[i] < crossing_g0 && g[i - 1] >= crossing_g0)) continue;
    double part = g[i] > 0.0 ? log(g[i - 1] / crossing_g0) / log(g[i - 1] / g[i])
                             : (g[i - 1] - crossing_g0) / (g[i - 1] - g[i]);
    *index = i - 1;
    *zero_nm = x[i - 1] + part * (x[i] - x[i - 1]);
    return isfinite(*zero_nm);
  }
  return false;
}

double mho_pull_longest_stay(const mho_pull *pull, size_t start, int first, int last,
                             int window, double *spent)
{
  if (last < first) return 0.0;
  memset(spent + first, 0, (size_t)(last - first + 1) * sizeof *spent);
  for (size_t i = start + 1; i < pull->count; i++) {
    int slot = pull->slot[i];
    double dx = pull->x[i] - pull->x[i - 1];
    if (slot >= first && slot <= last && dx > 0.0) spent[slot] += dx;
  }
  double sum = 0.0, longest = 0.0;
  for (int i = first; i <= last; i++) {
    sum += spent[i];
    if (i - window >= first) sum -= spent[i - window];
    if (sum > longest) longest = sum;
  }
  return longest;
}

static int compare(const void *a, const void *b)
{
  double x = *(const double *)a, y = *(const double *)b;
  return (x > y) - (x < y);
}

/* log10 G behind the crossing, averaged down to SEGMENT_POINTS. */
static size_t reduce(const mho_pull *pull, size_t start, double floor_g0, double *x, double *y)
{
  size_t n = pull->count - start - 1, group = n / SEGMENT_POINTS + 1, count = 0;
  for (size_t i = start + 1; i < pull->count; i += group) {
    double sum_x = 0.0, sum_y = 0.0;
    size_t used = 0;
    for (size_t j = i; j < i + group && j < pull->count; j++) {
      if (!(pull->g0[j] > 0.0 && pull->g0[j] >= floor_g0) || !isfinite(pull->x[j])) continue;
      sum_x += pull->x[j];
      sum_y += log10(pull->g0[j]);
      used++;
    }
    if (used == 0) continue;
    x[count] = sum_x / (double)used;
    y[count++] = sum_y / (double)used;
  }
  return count;
}

static double noise_variance(const double *y, size_t n, double *work)
{
  for (size_t i = 0; i + 1 < n; i++) work[i] = fabs(y[i + 1] - y[i]);
  qsort(work, n - 1, sizeof *work, compare);
  double median = work[(n - 1) / 2];
  double sigma = median / (0.6744897501960817 * 1.4142135623730951);
  return fmax(sigma * sigma, 1e-8);
}

typedef struct {
  const double *sum; /* prefix sums of y */
  double penalty;
  size_t cut[SEGMENT_LIMIT];
  size_t cuts;
} segmentation;

static void segment(segmentation *s, size_t from, size_t to)
{
  if (to - from < 8 || s->cuts + 1 >= SEGMENT_LIMIT) return;
  double best = s->penalty, total = s->sum[to] - s->sum[from], n = (double)(to - from);
  size_t where = 0;
  for (size_t i = from + 4; i + 4 <= to; i++) {
    double left = s->sum[i] - s->sum[from], a = (double)(i - from);
    double difference = left / a - (total - left) / (n - a);
    double gain = difference * difference * a * (n - a) / n;
    if (gain > best) best = gain, where = i;
  }
  if (where == 0) return;
  segment(s, from, where);
  s->cut[s->cuts++] = where;
  segment(s, where, to);
}

static mho_plateau describe(const double *x, const double *y, size_t from, size_t to)
{
  double n = (double)(to - from), mx = 0.0, my = 0.0, sxx = 0.0, sxy = 0.0;
  for (size_t i = from; i < to; i++) mx += x[i], my += y[i];
  mx /= n;
  my /= n;
  for (size_t i = from; i < to; i++) {
    sxx += (x[i] - mx) * (x[i] - mx);
    sxy += (x[i] - mx) * (y[i] - my);
  }
  double span = x[to - 1] - x[from];
  return (mho_plateau){.length_nm = n > 1 ? span * n / (n - 1) : 0.0, .log10_g0 = my,
                       .slope_decades_per_nm = sxx > 0.0 ? sxy / sxx : 0.0,
                       .step_decades = NAN};
}

/* Neighbouring segments closer than the smallest step are one. */
static size_t join_segments(segmentation *s, size_t n, double step)
{
  size_t bound[SEGMENT_LIMIT + 1], count = 0;
  bound[0] = 0;
  for (size_t i = 0; i < s->cuts; i++) bound[i + 1] = s->cut[i];
  size_t segments = s->cuts + 1, from = 0;
  for (size_t i = 1; i < segments; i++) {
    size_t end = i + 1 < segments ? bound[i + 1] : n;
    double before = (s->sum[bound[i]] - s->sum[from]) / (double)(bound[i] - from);
    double after = (s->sum[end] - s->sum[bound[i]]) / (double)(end - bound[i]);
    if (fabs(before - after) < step) continue;
    s->cut[count++] = bound[i];
    from = bound[i];
  }
  s->cuts = count;
  return count + 1;
}

size_t mho_pull_plateaus(const mho_pull *pull, size_t start, double floor_g0,
                         const mho_histogram_options *options, mho_plateau *plateau,
                         size_t limit)
{
  double x[SEGMENT_POINTS], y[SEGMENT_POINTS], sum[SEGMENT_POINTS + 1];
  size_t n = reduce(pull, start, floor_g0, x, y), found = 0;
  if (n < 8) return 0;
  segmentation s = {.sum = sum};
  s.penalty = 3.0 * log((double)n) * noise_variance(y, n, sum);
  sum[0] = 0.0;
  for (size_t i = 0; i < n; i++) sum[i + 1] = sum[i] + y[i];
  segment(&s, 0, n);
  size_t segments = join_segments(&s, n, options->step_decades);
  for (size_t i = 0; i < segments && found < limit; i++) {
    mho_plateau p = describe(x, y, i == 0 ? 0 : s.cut[i - 1],
                             i + 1 == segments ? n : s.cut[i]);
    if (p.length_nm < options->plateau_nm ||
        fabs(p.slope_decades_per_nm) > options->plateau_slope)
      continue;
    if (found > 0) plateau[found - 1].step_decades = plateau[found - 1].log10_g0 - p.log10_g0;
    plateau[found++] = p;
  }
  return found;
}
