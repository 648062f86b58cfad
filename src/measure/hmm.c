/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Scaled forward and backward recursions, Rabiner, Proc. IEEE 77, 257 (1989).
 * Blocks are independent sequences: a transition between two of them is not
 * counted, which is one in a block length.
 */
#include "measure/hmm.h"

#include "base/processor.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

enum { S = MHO_STATES, ROUNDS = 40, TRIAL_ROUNDS = 6 };

#define LOG_2PI 1.83787706640934548356
#define CONVERGED 1e-6 /* of the log likelihood a point */

/* What one block says about the parameters. */
typedef struct {
  double likelihood, held[S], sum[S], squares[S], go[S][S], first[S];
} evidence;

static double log_density(const mho_hmm *m, int k, double y)
{
  double z = (y - m->mean[k]) / m->deviation[k];
  return -0.5 * (z * z + LOG_2PI) - log(m->deviation[k]);
}

/* Densities of one point up to a factor; returns the log of the factor.
 * constant[k] is ln of the deviation. */
INLINED double densities(const mho_hmm *m, int states, const double *constant, double y,
                         double *density)
{
  double top = -INFINITY;
  for (int k = 0; k < states; k++) {
    double z = (y - m->mean[k]) / m->deviation[k];
    density[k] = -0.5 * z * z - constant[k];
    if (density[k] > top) top = density[k];
  }
  for (int k = 0; k < states; k++) density[k] = density[k] == top ? 1.0 : exp(density[k] - top);
  return top - 0.5 * LOG_2PI;
}

/* Forward variables, normalised a point: alpha[n * S], scale[n], density[n * S]. */
INLINED double forward(const mho_hmm *m, int states, const double *y, size_t n, double *alpha,
                       double *scale, double *density)
{
  double likelihood = 0.0, product = 1.0, constant[S];
  for (int k = 0; k < states; k++) constant[k] = log(m->deviation[k]);
  for (size_t t = 0; t < n; t++) {
    double *a = alpha + t * S, *d = density + t * S, sum = 0.0;
    likelihood += densities(m, states, constant, y[t], d);
    for (int k = 0; k < states; k++) {
      double come = t == 0 ? m->start[k] : 0.0;
      for (int j = 0; t > 0 && j < states; j++) come += a[j - S] * m->go[j][k];
      a[k] = come * d[k];
      sum += a[k];
    }
    if (!(sum > 1e-300)) sum = 1e-300;
    for (int k = 0; k < states; k++) a[k] /= sum;
    scale[t] = sum;
    if (product * sum > 1e-200) product *= sum; /* one logarithm for many points */
    else likelihood += log(product) + log(sum), product = 1.0;
  }
  return likelihood + log(product);
}

INLINED void gather_states(const mho_hmm *m, int states, const double *y, size_t n, double *work,
                           evidence *e)
{
  double *alpha = work, *density = work + n * S, *scale = work + 2 * n * S;
  double beta[S], next[S];
  memset(e, 0, sizeof *e);
  e->likelihood = forward(m, states, y, n, alpha, scale, density);
  for (int k = 0; k < states; k++) beta[k] = 1.0;
  for (size_t t = n; t-- > 0;) {
    const double *a = alpha + t * S;
    for (int k = 0; k < states; k++) {
      double gamma = a[k] * beta[k];
      e->held[k] += gamma;
      e->sum[k] += gamma * y[t];
      e->squares[k] += gamma * y[t] * y[t];
      if (t == 0) e->first[k] = gamma;
    }
    if (t == 0) break;
    const double *d = density + t * S, *before = a - S;
    for (int k = 0; k < states; k++) beta[k] *= d[k] / scale[t];
    for (int j = 0; j < states; j++) {
      next[j] = 0.0;
      for (int k = 0; k < states; k++) {
        double part = m->go[j][k] * beta[k];
        next[j] += part;
        e->go[j][k] += before[j] * part;
      }
    }
    for (int k = 0; k < states; k++) beta[k] = next[k];
  }
}

/* With the number of states known its loops are short lines of arithmetic. */
static void gather(const mho_hmm *m, const double *y, size_t n, double *work, evidence *e)
{
  _Static_assert(S == 3, "a case for every number of states");
  switch (m->states) {
  case 1: gather_states(m, 1, y, n, work, e); break;
  case 2: gather_states(m, 2, y, n, work, e); break;
  default: gather_states(m, S, y, n, work, e); break;
  }
}

static bool belongs(size_t block, int parity)
{
  return parity > 1 || (int)(block % 2) == parity;
}

static mho_status gather_all(const mho_blocks *blocks, int parity, const mho_hmm *model,
                             evidence *each)
{
  double *work = malloc((2 * S + 1) * blocks->length * sizeof *work);
  if (!work) return MHO_ERR_MEMORY;
  for (size_t b = 0; b < blocks->count; b++)
    if (belongs(b, parity)) gather(model, blocks->block[b], blocks->length, work, &each[b]);
  free(work);
  return MHO_OK;
}

static void add_evidence(evidence *to, const evidence *e)
{
  to->likelihood += e->likelihood;
  for (int j = 0; j < S; j++) {
    to->held[j] += e->held[j];
    to->sum[j] += e->sum[j];
    to->squares[j] += e->squares[j];
    to->first[j] += e->first[j];
    for (int k = 0; k < S; k++) to->go[j][k] += e->go[j][k];
  }
}

static void maximise(mho_hmm *m, const evidence *e, double least_deviation)
{
  double starts = 0.0;
  for (int j = 0; j < m->states; j++) starts += e->first[j];
  for (int j = 0; j < m->states; j++) {
    double held = fmax(e->held[j], 1e-12), left = 1e-12 * m->states;
    m->mean[j] = e->sum[j] / held;
    double variance = e->squares[j] / held - m->mean[j] * m->mean[j];
    m->deviation[j] = fmax(sqrt(fmax(variance, 0.0)), least_deviation);
    m->start[j] = (e->first[j] + 1e-9) / (starts + 1e-9 * m->states);
    for (int k = 0; k < m->states; k++) left += e->go[j][k];
    for (int k = 0; k < m->states; k++) m->go[j][k] = (e->go[j][k] + 1e-12) / left;
  }
}

static double baum_welch(const mho_blocks *blocks, int parity, int rounds, mho_hmm *model,
                         evidence *each, double least_deviation, mho_status *status)
{
  double before = -INFINITY;
  for (int round = 0; round < rounds; round++) {
    evidence sum = {0};
    double points = 0.0;
    *status = gather_all(blocks, parity, model, each);
    if (*status != MHO_OK) return before;
    for (size_t b = 0; b < blocks->count; b++)
      if (belongs(b, parity)) add_evidence(&sum, &each[b]), points += (double)blocks->length;
    if (sum.likelihood - before < CONVERGED * points) return sum.likelihood;
    before = sum.likelihood;
    maximise(model, &sum, least_deviation);
  }
  return before;
}

static int compare(const void *a, const void *b)
{
  double x = *(const double *)a, y = *(const double *)b;
  return (x > y) - (x < y);
}

/* At most 4096 points of the blocks, sorted. */
static size_t sorted_points(const mho_blocks *blocks, int parity, double *point)
{
  size_t used = 0, step = blocks->count * blocks->length / 2048 + 1;
  for (size_t b = 0; b < blocks->count; b++)
    for (size_t i = 0; belongs(b, parity) && i < blocks->length && used < 4096; i += step)
      point[used++] = blocks->block[b][i];
  qsort(point, used, sizeof *point, compare);
  return used;
}

/* Starts: levels at even shares of the points, or evenly between extremes. */
static mho_hmm start_model(int states, const double *point, size_t n, bool by_share)
{
  mho_hmm m = {.states = states};
  double low = point[n / 200], high = point[n - 1 - n / 200];
  for (int k = 0; k < states; k++) {
    double part = (k + 0.5) / states;
    m.mean[k] = by_share ? point[(size_t)(part * (double)(n - 1))]
                : states > 1 ? low + (high - low) * k / (states - 1) : point[n / 2];
    m.deviation[k] = fmax((high - low) / (3.0 * states), 1e-300);
    m.start[k] = 1.0 / states;
    for (int j = 0; j < states; j++)
      m.go[k][j] = states == 1 ? 1.0 : k == j ? 0.98 : 0.02 / (states - 1);
  }
  return m;
}

static void sort_states(mho_hmm *m)
{
  mho_hmm old = *m;
  int order[S] = {0, 1, 2};
  for (int i = 1; i < m->states; i++)
    for (int j = i; j > 0 && old.mean[order[j]] < old.mean[order[j - 1]]; j--) {
      int swap = order[j];
      order[j] = order[j - 1];
      order[j - 1] = swap;
    }
  for (int i = 0; i < m->states; i++) {
    m->mean[i] = old.mean[order[i]];
    m->deviation[i] = old.deviation[order[i]];
    m->start[i] = old.start[order[i]];
    for (int j = 0; j < m->states; j++) m->go[i][j] = old.go[order[i]][order[j]];
  }
}

mho_status mho_hmm_estimate(const mho_blocks *blocks, int parity, int states, mho_hmm *model)
{
  evidence *each = malloc(blocks->count * sizeof *each);
  double *point = malloc(4096 * sizeof *point), best = -INFINITY;
  mho_status status = each && point ? MHO_OK : MHO_ERR_MEMORY;
  size_t n = status == MHO_OK ? sorted_points(blocks, parity, point) : 0;
  double least = n ? 1e-4 * (point[n - 1] - point[0]) + 1e-300 : 0.0;
  for (int way = 0; status == MHO_OK && way < (states > 1 ? 2 : 1); way++) {
    mho_hmm trial = start_model(states, point, n, way == 1);
    double likelihood = baum_welch(blocks, parity, TRIAL_ROUNDS, &trial, each, least, &status);
    if (!(likelihood > best) && way > 0) continue;
    best = likelihood;
    *model = trial;
  }
  if (status == MHO_OK) baum_welch(blocks, parity, ROUNDS, model, each, least, &status);
  if (status == MHO_OK) sort_states(model);
  free(each);
  free(point);
  return status;
}

mho_status mho_hmm_score(const mho_blocks *blocks, int parity, const mho_hmm *model,
                         double *likelihood)
{
  evidence *each = malloc(blocks->count * sizeof *each);
  mho_status status = each ? gather_all(blocks, parity, model, each) : MHO_ERR_MEMORY;
  for (size_t b = 0; status == MHO_OK && b < blocks->count; b++)
    if (belongs(b, parity)) likelihood[b] = each[b].likelihood;
  free(each);
  return status;
}

void mho_hmm_path(const mho_hmm *model, const double *signal, size_t n, uint8_t *back,
                  uint8_t *path)
{
  int states = model->states;
  double score[S], next[S], go[S][S];
  for (int j = 0; j < states; j++) {
    score[j] = log(model->start[j]) + log_density(model, j, signal[0]);
    for (int k = 0; k < states; k++) go[j][k] = log(model->go[j][k]);
  }
  for (size_t t = 1; t < n; t++) {
    uint8_t from = 0; /* two bits a state */
    double top = -INFINITY;
    for (int k = 0; k < states; k++) {
      int best = 0;
      for (int j = 1; j < states; j++)
        if (score[j] + go[j][k] > score[best] + go[best][k]) best = j;
      next[k] = score[best] + go[best][k] + log_density(model, k, signal[t]);
      if (next[k] > top) top = next[k];
      from |= (uint8_t)(best << (2 * k));
    }
    for (int k = 0; k < states; k++) score[k] = next[k] - top;
    back[t] = from;
  }
  int at = 0;
  for (int k = 1; k < states; k++)
    if (score[k] > score[at]) at = k;
  for (size_t t = n; t-- > 0;) {
    path[t] = (uint8_t)at;
    if (t > 0) at = (back[t] >> (2 * at)) & 3;
  }
}
