/* SPDX-License-Identifier: GPL-3.0-or-later */
#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "molecule/rings.h"

enum { ROUNDS = 120, POLYGON_LIMIT = 8 };

/* Bond lengths that nobody sees any more. */
#define STILL 1e-3

#define PI 3.14159265358979323846
#define ZIGZAG 1.7320508075688772 /* across two bonds at 120 degrees */

typedef struct {
  const mho_neighbours *graph;
  const int *member;
  int count;
  int *place;     /* [points] index among the members, or -1 */
  int *queue;     /* [count] */
  double *target; /* [count][count] */
  double *weight; /* [count][count] target^-2, behind the targets */
  double (*at)[2]; /* [count] */
} stress;

/* Distances over bonds, two bonds counting ZIGZAG. */
static void find_targets(stress *s)
{
  const mho_neighbours *g = s->graph;
  int n = s->count;
  int *depth = s->queue + n;
  for (int i = 0; i < n; i++) {
    int head = 0, tail = 0;
    for (int k = 0; k < n; k++) depth[k] = -1;
    depth[i] = 0;
    s->queue[tail++] = i;
    while (head < tail) {
      int at = s->queue[head++];
      for (int k = g->start[s->member[at]]; k < g->start[s->member[at] + 1]; k++) {
        int next = s->place[g->next[k]];
        if (next < 0 || depth[next] >= 0) continue;
        depth[next] = depth[at] + 1;
        s->queue[tail++] = next;
      }
    }
    for (int k = 0; k < n; k++) {
      double d = depth[k] < 0 ? n : depth[k];
      s->target[i * n + k] = d <= 1 ? d : d * (ZIGZAG / 2) + (depth[k] % 2 ? 0.134 : 0);
    }
  }
}

/* Small rings are regular polygons: their chords replace the targets. */
static void use_polygons(stress *s, const mho_ring_list *rings)
{
  for (int r = 0; r < rings->count; r++) {
    const int *ring = rings->point + rings->start[r];
    int size = rings->start[r + 1] - rings->start[r];
    if (size > POLYGON_LIMIT || s->place[ring[0]] < 0 || s->place[ring[1]] < 0) continue;
    for (int i = 0; i < size; i++)
      for (int k = i + 1; k < size; k++) {
        double chord = sin(PI * (k - i) / size) / sin(PI / size);
        int a = s->place[ring[i]], b = s->place[ring[k]];
        if (a < 0 || b < 0) continue;
        s->target[a * s->count + b] = s->target[b * s->count + a] = chord;
      }
  }
}

static int farthest_from(const stress *s, int i)
{
  int far = i;
  for (int k = 0; k < s->count; k++)
    if (s->target[i * s->count + k] > s->target[i * s->count + far]) far = k;
  return far;
}

/* Two pairs of far points, the second pair across the first, give the axes. */
static void start(stress *s)
{
  int n = s->count, a = farthest_from(s, 0), b = farthest_from(s, a), c = 0;
  double best = -1e9;
  for (int k = 0; k < n; k++) {
    double p = s->target[a * n + k], q = s->target[b * n + k];
    double across = fmin(p, q) - fabs(p - q);
    if (across > best) {
      best = across;
      c = k;
    }
  }
  int d = c;
  best = -1e9;
  for (int k = 0; k < n; k++) {
    double p = s->target[a * n + k], q = s->target[b * n + k];
    double across = s->target[c * n + k] - fabs(p - q);
    if (across > best) {
      best = across;
      d = k;
    }
  }
  for (int k = 0; k < n; k++) {
    s->at[k][0] = (s->target[a * n + k] - s->target[b * n + k]) / 2;
    s->at[k][1] = (s->target[c * n + k] - s->target[d * n + k]) / 2;
    /* No two points may start in one place. */
    s->at[k][0] += 0.05 * sin(7.0 * k);
    s->at[k][1] += 0.05 * cos(11.0 * k);
  }
}

/* One round; weights are target^-2, or target^-4 where the near ones count.
 * Returns the square of the largest step. */
static double relax(stress *s, bool local)
{
  int n = s->count;
  double largest = 0;
  for (int i = 0; i < n; i++) {
    double sum[2] = {0, 0}, total = 0;
    for (int k = 0; k < n; k++) {
      if (k == i) continue;
      double d = s->target[i * n + k], weight = s->weight[i * n + k];
      if (local) weight *= weight;
      double dx = s->at[i][0] - s->at[k][0], dy = s->at[i][1] - s->at[k][1];
      double length = sqrt(dx * dx + dy * dy), scale = length > 1e-6 ? d / length : 0;
      sum[0] += weight * (s->at[k][0] + dx * scale);
      sum[1] += weight * (s->at[k][1] + dy * scale);
      total += weight;
    }
    double x = sum[0] / total, y = sum[1] / total;
    double step = (x - s->at[i][0]) * (x - s->at[i][0]) + (y - s->at[i][1]) * (y - s->at[i][1]);
    largest = fmax(largest, step);
    s->at[i][0] = x;
    s->at[i][1] = y;
  }
  return largest;
}

static void relax_all(stress *s)
{
  size_t pairs = (size_t)s->count * (size_t)s->count;
  for (size_t k = 0; k < pairs; k++) s->weight[k] = 1 / (s->target[k] * s->target[k]);
  for (int local = 0; local < 2; local++)
    for (int round = 0; round < ROUNDS && relax(s, local) > STILL * STILL; round++) {}
}

mho_status mho_stress_place(const mho_neighbours *neighbours, const int *member,
                            int count, const mho_ring_list *rings, bool warm,
                            double (*position)[2])
{
  size_t n = (size_t)count;
  stress s = {.graph = neighbours, .member = member, .count = count};
  s.place = malloc(((size_t)neighbours->points + 1) * sizeof *s.place);
  s.queue = malloc((2 * n + 1) * sizeof *s.queue);
  s.target = malloc((2 * n * n + 1) * sizeof *s.target);
  s.weight = s.target ? s.target + n * n : NULL;
  s.at = malloc((n + 1) * sizeof *s.at);
  mho_status status = s.place && s.queue && s.target && s.at ? MHO_OK : MHO_ERR_MEMORY;
  if (status == MHO_OK && count > 1) {
    for (int v = 0; v < neighbours->points; v++) s.place[v] = -1;
    for (int i = 0; i < count; i++) s.place[member[i]] = i;
    find_targets(&s);
    if (!warm) start(&s);
    for (int i = 0; warm && i < count; i++) {
      s.at[i][0] = position[member[i]][0] + 0.02 * sin(7.0 * i); /* no two in one place */
      s.at[i][1] = position[member[i]][1] + 0.02 * cos(11.0 * i);
    }
    use_polygons(&s, rings);
    relax_all(&s);
    for (int i = 0; i < count; i++) memcpy(position[member[i]], s.at[i], sizeof s.at[i]);
  } else if (status == MHO_OK && count == 1) {
    position[member[0]][0] = position[member[0]][1] = 0;
  }
  free(s.place);
  free(s.queue);
  free(s.target);
  free(s.at);
  return status;
}
