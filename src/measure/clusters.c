/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Clusters of traces by shape: k-means with the seeding of D. Arthur and
 * S. Vassilvitskii, Proc. SODA (2007).
 */
#include <mho/peaks.h>

#include "base/random.h"
#include "measure/sample.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

enum {
  FEATURE_LIMIT = 64,
  RESTARTS = 8,
  ROUNDS = 100,
  HALVES = 20,
  SILHOUETTE_POINTS = 800,
  RESAMPLES = 200
};

#define FEATURE_DECADES 0.2
#define LEAST_SILHOUETTE 0.25
#define LEAST_STABILITY 0.6
#define SMOOTH_DECADES 0.05

typedef struct {
  size_t count;
  int features;
  double *at; /* [count * features] */
} cloud;

static double distance(const double *a, const double *b, int n)
{
  double sum = 0.0;
  for (int i = 0; i < n; i++) sum += (a[i] - b[i]) * (a[i] - b[i]);
  return sum;
}

static mho_status make_cloud(const mho_histogram *h, double low, double high, cloud *c,
                             mho_error *error)
{
  int per_decade = h->all.bins_per_decade, bins = h->all.bins;
  c->count = h->samples;
  c->features = (int)ceil((high - low) / FEATURE_DECADES);
  if (c->count == 0 || !(low < high) || c->features > FEATURE_LIMIT)
    return mho_fail(error, MHO_ERR_RANGE, "measure", "clusters",
                    "traces kept by the histogram and a window of at most %g decades are needed",
                    FEATURE_LIMIT * FEATURE_DECADES);
  c->at = calloc(c->count * (size_t)c->features, sizeof *c->at);
  if (!c->at) return mho_fail(error, MHO_ERR_MEMORY, "measure", NULL, "out of memory");
  for (size_t i = 0; i < c->count; i++) {
    double *to = c->at + i * (size_t)c->features, total = 0.0;
    for (int j = 0; j < bins; j++) {
      double x = h->all.low_log10_g0 + (j + 0.5) / per_decade;
      if (x < low || x >= high) continue;
      int feature = (int)((x - low) / FEATURE_DECADES);
      double count = h->sample_count[i * (size_t)bins + (size_t)j];
      to[feature < c->features ? feature : c->features - 1] += count;
      total += count;
    }
    for (int j = 0; j < c->features; j++) to[j] = total > 0.0 ? sqrt(to[j] / total) : 0.0;
  }
  return MHO_OK;
}

static int nearest(const double *x, const double *centre, int k, int n, double *best)
{
  int which = 0;
  *best = INFINITY;
  for (int i = 0; i < k; i++) {
    double d = distance(x, centre + i * n, n);
    if (d < *best) *best = d, which = i;
  }
  return which;
}

/* The next centre is drawn with probability of its squared distance. */
static void seed_centres(const cloud *c, const size_t *member, size_t count, int k,
                         mho_random *random, double *centre)
{
  int n = c->features;
  size_t bytes = (size_t)n * sizeof(double);
  memcpy(centre, c->at + member[mho_random_below(random, count)] * (size_t)n, bytes);
  for (int i = 1; i < k; i++) {
    double total = 0.0, d;
    for (size_t j = 0; j < count; j++) {
      nearest(c->at + member[j] * (size_t)n, centre, i, n, &d);
      total += d;
    }
    double drawn = total * ((double)(mho_random_bits(random) >> 11) * 0x1p-53);
    size_t chosen = 0;
    for (size_t j = 0; j < count && drawn >= 0.0; j++) {
      nearest(c->at + member[j] * (size_t)n, centre, i, n, &d);
      drawn -= d;
      chosen = j;
    }
    memcpy(centre + i * n, c->at + member[chosen] * (size_t)n, bytes);
  }
}

static double improve(const cloud *c, const size_t *member, size_t count, int k,
                      double *centre)
{
  int n = c->features;
  double sum[MHO_CLUSTER_LIMIT * FEATURE_LIMIT], cost = INFINITY;
  for (int round = 0; round < ROUNDS; round++) {
    size_t held[MHO_CLUSTER_LIMIT] = {0};
    double now = 0.0, d;
    memset(sum, 0, sizeof sum);
    for (size_t j = 0; j < count; j++) {
      const double *x = c->at + member[j] * (size_t)n;
      int i = nearest(x, centre, k, n, &d);
      now += d;
      held[i]++;
      for (int f = 0; f < n; f++) sum[i * n + f] += x[f];
    }
    for (int i = 0; i < k; i++)
      for (int f = 0; held[i] > 0 && f < n; f++) centre[i * n + f] = sum[i * n + f] / (double)held[i];
    if (!(now < cost * (1.0 - 1e-9))) break;
    cost = now;
  }
  return cost;
}

static void k_means(const cloud *c, const size_t *member, size_t count, int k, uint64_t seed,
                    double *centre)
{
  double trial[MHO_CLUSTER_LIMIT * FEATURE_LIMIT], best = INFINITY;
  for (int r = 0; r < RESTARTS; r++) {
    mho_random random = mho_random_stream(seed, (uint64_t)(k * RESTARTS + r));
    seed_centres(c, member, count, k, &random, trial);
    double cost = improve(c, member, count, k, trial);
    if (!(cost < best)) continue;
    best = cost;
    memcpy(centre, trial, (size_t)(k * c->features) * sizeof *centre);
  }
}

static void assign(const cloud *c, const double *centre, int k, int *member)
{
  double d;
  for (size_t i = 0; i < c->count; i++)
    member[i] = nearest(c->at + i * (size_t)c->features, centre, k, c->features, &d);
}

/* Mean silhouette of at most SILHOUETTE_POINTS evenly chosen traces. */
static double silhouette(const cloud *c, const int *member, int k)
{
  size_t step = (c->count + SILHOUETTE_POINTS - 1) / SILHOUETTE_POINTS, used = 0;
  double total = 0.0;
  for (size_t i = 0; i < c->count; i += step, used++) {
    double sum[MHO_CLUSTER_LIMIT] = {0}, other = INFINITY;
    size_t held[MHO_CLUSTER_LIMIT] = {0};
    for (size_t j = 0; j < c->count; j += step) {
      if (j == i) continue;
      sum[member[j]] += sqrt(distance(c->at + i * (size_t)c->features,
                                      c->at + j * (size_t)c->features, c->features));
      held[member[j]]++;
    }
    int own = member[i];
    if (held[own] == 0) continue;
    for (int m = 0; m < k; m++)
      if (m != own && held[m] > 0) other = fmin(other, sum[m] / (double)held[m]);
    double inside = sum[own] / (double)held[own];
    if (isfinite(other) && fmax(inside, other) > 0.0) total += (other - inside) / fmax(inside, other);
  }
  return used ? total / (double)used : 0.0;
}

static double pairs(double n)
{
  return 0.5 * n * (n - 1.0);
}

/* L. Hubert and P. Arabie, J. Classif. 2, 193 (1985). */
static double adjusted_rand(const int *a, const int *b, size_t n)
{
  double table[MHO_CLUSTER_LIMIT][MHO_CLUSTER_LIMIT] = {{0}}, rows[MHO_CLUSTER_LIMIT] = {0},
         columns[MHO_CLUSTER_LIMIT] = {0}, both = 0.0, first = 0.0, second = 0.0;
  for (size_t i = 0; i < n; i++) table[a[i]][b[i]]++, rows[a[i]]++, columns[b[i]]++;
  for (int i = 0; i < MHO_CLUSTER_LIMIT; i++) {
    for (int j = 0; j < MHO_CLUSTER_LIMIT; j++) both += pairs(table[i][j]);
    first += pairs(rows[i]);
    second += pairs(columns[i]);
  }
  double expected = first * second / fmax(pairs((double)n), 1.0), most = 0.5 * (first + second);
  return most > expected ? (both - expected) / (most - expected) : 1.0;
}

/* Clusters found in random halves against those of all traces. */
static double stability(const cloud *c, const int *member, int k, uint64_t seed, size_t *half,
                        int *other)
{
  double centre[MHO_CLUSTER_LIMIT * FEATURE_LIMIT], sum = 0.0;
  for (int r = 0; r < HALVES; r++) {
    mho_random random = mho_random_stream(seed, (uint64_t)(1000 + r));
    size_t count = 0;
    for (size_t i = 0; i < c->count; i++)
      if (mho_random_bits(&random) >> 63) half[count++] = i;
    if (count < (size_t)k) continue;
    k_means(c, half, count, k, seed + (uint64_t)r, centre);
    assign(c, centre, k, other);
    sum += adjusted_rand(member, other, c->count);
  }
  return sum / HALVES;
}

/* Highest point of counts[bins] smoothed by a triangle. */
static double highest_point(const mho_histogram *h, const double *count, double low, double high)
{
  int reach = (int)ceil(2.45 * SMOOTH_DECADES * h->all.bins_per_decade), bins = h->all.bins;
  double best = -1.0, where = low;
  for (int i = 0; i < bins; i++) {
    double x = h->all.low_log10_g0 + (i + 0.5) / h->all.bins_per_decade, sum = 0.0;
    if (x < low || x >= high) continue;
    for (int j = -reach; j <= reach; j++)
      if (i + j >= 0 && i + j < bins) sum += (reach + 1 - abs(j)) * count[i + j];
    if (sum > best) best = sum, where = x;
  }
  return where;
}

static void describe(const mho_histogram *h, double low, double high, uint64_t seed,
                     const mho_clusters *clusters, int which, size_t *held, double *count,
                     mho_cluster *result)
{
  size_t bins = (size_t)h->all.bins, n = 0;
  double peaks[RESAMPLES];
  for (size_t i = 0; i < h->samples; i++)
    if (clusters->member[i] == which) held[n++] = i;
  *result = (mho_cluster){.traces = n, .share = (double)n / (double)h->samples};
  for (int r = 0; r <= RESAMPLES && n > 0; r++) {
    mho_random random = mho_random_stream(seed, (uint64_t)(2000 + which * RESAMPLES + r));
    memset(count, 0, bins * sizeof *count);
    for (size_t i = 0; i < n; i++) {
      size_t from = held[r == RESAMPLES ? i : mho_random_below(&random, n)];
      for (size_t j = 0; j < bins; j++) count[j] += h->sample_count[from * bins + j];
    }
    double at = highest_point(h, count, low, high);
    if (r == RESAMPLES) result->log10_g0 = at;
    else peaks[r] = at;
  }
  if (n == 0) return;
  result->low = mho_quantile(peaks, RESAMPLES, 0.025);
  result->high = mho_quantile(peaks, RESAMPLES, 0.975);
}

static void choose(const cloud *c, uint64_t seed, size_t *index, int *other,
                   mho_clusters *clusters)
{
  double centre[MHO_CLUSTER_LIMIT * FEATURE_LIMIT], best = LEAST_SILHOUETTE;
  clusters->count = 1;
  clusters->stability = 1.0;
  for (int k = 2; k <= MHO_CLUSTER_LIMIT && (size_t)k * 5 <= c->count; k++) {
    for (size_t i = 0; i < c->count; i++) index[i] = i;
    k_means(c, index, c->count, k, seed, centre);
    assign(c, centre, k, other);
    double width = silhouette(c, other, k);
    if (width <= best) continue;
    int *trial = other + c->count;
    double stable = stability(c, other, k, seed, index, trial);
    if (stable < LEAST_STABILITY) continue;
    best = width;
    clusters->count = k;
    clusters->silhouette = width;
    clusters->stability = stable;
    memcpy(clusters->member, other, c->count * sizeof *other);
  }
}

mho_status mho_clusters_find(const mho_histogram *histogram, double low_log10_g0,
                             double high_log10_g0, uint64_t seed, mho_clusters *clusters,
                             mho_error *error)
{
  *clusters = (mho_clusters){0};
  cloud c = {0};
  mho_status status = make_cloud(histogram, low_log10_g0, high_log10_g0, &c, error);
  if (status != MHO_OK) return status;
  size_t *index = malloc(c.count * sizeof *index);
  int *other = malloc(2 * c.count * sizeof *other);
  double *count = malloc((size_t)histogram->all.bins * sizeof *count);
  clusters->member = calloc(c.count, sizeof *clusters->member);
  if (index && other && count && clusters->member) {
    choose(&c, seed, index, other, clusters);
    for (int i = 0; i < clusters->count; i++)
      describe(histogram, low_log10_g0, high_log10_g0, seed, clusters, i, index, count,
               &clusters->cluster[i]);
  } else {
    status = mho_fail(error, MHO_ERR_MEMORY, "measure", NULL, "out of memory");
    mho_clusters_clear(clusters);
  }
  free(c.at);
  free(index);
  free(other);
  free(count);
  return status;
}

void mho_clusters_clear(mho_clusters *clusters)
{
  free(clusters->member);
  *clusters = (mho_clusters){0};
}
