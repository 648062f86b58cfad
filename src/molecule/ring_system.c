/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Places a system of fused rings: regular polygons, one after the other, each
 * on the bond or the path that it shares with those before it.  What does not
 * close that way (large rings across others, bridges, helices) is left to
 * stress majorization.
 */
#include "molecule/ring_system.h"

#include <math.h>
#include <string.h>

#define PI 3.14159265358979323846

typedef struct {
  const mho_ring_list *rings;
  double (*position)[2];
  bool *placed; /* [points] */
  const int *ring; /* [count] of the system */
  int count;
} builder;

enum { TOTAL_LIMIT = 1500 }; /* points of all rings together */

static int size_of(const mho_ring_list *r, int ring)
{
  return r->start[ring + 1] - r->start[ring];
}

/* Point `i` of a ring, counted round it. */
static int point_of(const mho_ring_list *r, int ring, int i)
{
  int size = size_of(r, ring);
  return r->point[r->start[ring] + ((i % size) + size) % size];
}

static void place_polygon(builder *b, int ring)
{
  int size = size_of(b->rings, ring);
  double radius = 0.5 / sin(PI / size);
  for (int i = 0; i < size; i++) {
    int v = point_of(b->rings, ring, i);
    double angle = PI / 2 + 2 * PI * i / size;
    b->position[v][0] = radius * cos(angle);
    b->position[v][1] = radius * sin(angle);
    b->placed[v] = true;
  }
}

/* The one run of placed points in a ring: its first index and its length.
 * False where they form several runs. */
static bool find_run(const builder *b, int ring, int *first, int *length)
{
  int size = size_of(b->rings, ring), starts = 0;
  *length = 0;
  for (int i = 0; i < size; i++) {
    bool here = b->placed[point_of(b->rings, ring, i)];
    *length += here;
    if (!here || b->placed[point_of(b->rings, ring, i - 1)]) continue;
    *first = i;
    starts++;
  }
  return starts == 1;
}

/* Angle of an arc whose `steps` chords of length 1 span the distance `span`:
 * sin(angle/2) / sin(angle/2/steps) = span, falling with the angle. */
static double arc_angle(double span, int steps)
{
  double low = 1e-6, high = 2 * PI - 1e-6;
  for (int i = 0; i < 60; i++) {
    double middle = (low + high) / 2;
    if (sin(middle / 2) / sin(middle / 2 / steps) > span) low = middle;
    else high = middle;
  }
  return (low + high) / 2;
}

/* Side of the line p-q (+1 left, -1 right) on which the new points go: away
 * from the points of the run between its ends, or else from the ring that
 * shares the bond. */
static double free_side(const builder *b, int ring, int first, int length,
                        const double *p, const double *q)
{
  double middle[2] = {0, 0};
  int count = 0;
  for (int i = 1; i + 1 < length; i++, count++)
    for (int k = 0; k < 2; k++) middle[k] += b->position[point_of(b->rings, ring, first + i)][k];
  int ends[2] = {point_of(b->rings, ring, first), point_of(b->rings, ring, first + length - 1)};
  for (int k = 0; length == 2 && k < b->count; k++) {
    int r = b->ring[k], shared = 0, ready = 0, size = size_of(b->rings, r);
    for (int i = 0; i < size; i++) {
      int v = point_of(b->rings, r, i);
      shared += v == ends[0] || v == ends[1];
      ready += b->placed[v];
    }
    if (shared < 2 || ready < size) continue;
    for (int i = 0; i < size; i++, count++)
      for (int axis = 0; axis < 2; axis++)
        middle[axis] += b->position[point_of(b->rings, r, i)][axis];
  }
  if (!count) return 1;
  double cross = (q[0] - p[0]) * (middle[1] / count - p[1]) -
                 (q[1] - p[1]) * (middle[0] / count - p[0]);
  return cross > 0 ? -1 : 1;
}

/* Closes a ring over its run of placed points; false where it cannot. */
static bool close_ring(builder *b, int ring, int first, int length)
{
  int size = size_of(b->rings, ring), missing = size - length;
  if (!missing) return true;
  const double *p = b->position[point_of(b->rings, ring, first + length - 1)];
  const double *q = b->position[point_of(b->rings, ring, first)];
  double dx = q[0] - p[0], dy = q[1] - p[1], span = sqrt(dx * dx + dy * dy);
  if (span < 0.3 || span > missing + 0.9) return false;
  double angle = arc_angle(span, missing + 1);
  double radius = 0.5 / sin(angle / 2 / (missing + 1));
  double side = free_side(b, ring, first, length, p, q);
  /* The centre lies on the free side if the arc is more than half a circle. */
  double rise = -radius * cos(angle / 2) * side;
  double ux = dx / span, uy = dy / span;
  double centre[2] = {p[0] + dx / 2 - uy * rise, p[1] + dy / 2 + ux * rise};
  double from = atan2(p[1] - centre[1], p[0] - centre[0]);
  for (int i = 1; i <= missing; i++) {
    int v = point_of(b->rings, ring, first + length - 1 + i);
    double at = from - side * angle * i / (missing + 1);
    b->position[v][0] = centre[0] + radius * cos(at);
    b->position[v][1] = centre[1] + radius * sin(at);
    b->placed[v] = true;
  }
  return true;
}

/* The ring of the system to place next: the one with most placed points. */
static int choose_ring(const builder *b, const bool *done)
{
  int best = -1, most = 1;
  for (int i = 0; i < b->count; i++) {
    int placed = 0, ring = b->ring[i], size = size_of(b->rings, ring);
    if (done[ring]) continue;
    for (int k = 0; k < size; k++) placed += b->placed[point_of(b->rings, ring, k)];
    if (placed > most) {
      most = placed;
      best = i;
    }
  }
  return best < 0 ? -1 : b->ring[best];
}

bool mho_ring_system_build(const mho_ring_list *rings, const int *ring, int count,
                           bool *done, bool *placed, double (*position)[2])
{
  builder b = {rings, position, placed, ring, count};
  int start = ring[0], most = -1, total = 0;
  for (int i = 0; i < count; i++) total += size_of(rings, ring[i]);
  if (total > TOTAL_LIMIT) return false;
  for (int i = 0; i < count; i++) {
    /* Begin in the middle: the ring that shares most points. */
    int shared = 0, size = size_of(rings, ring[i]);
    for (int k = 0; k < count; k++)
      for (int j = 0; k != i && j < size_of(rings, ring[k]); j++)
        for (int m = 0; m < size; m++)
          shared += point_of(rings, ring[k], j) == point_of(rings, ring[i], m);
    if (size > 8 && shared > size / 2) return false; /* a macrocycle across others */
    if (shared > most) {
      most = shared;
      start = ring[i];
    }
  }
  place_polygon(&b, start);
  done[start] = true;
  for (int left = count - 1; left > 0; left--) {
    int next = choose_ring(&b, done), first, length;
    if (next < 0 || !find_run(&b, next, &first, &length) ||
        !close_ring(&b, next, first, length)) {
      /* A ring whose points are all placed needs no run. */
      bool whole = next >= 0;
      for (int k = 0; whole && k < size_of(rings, next); k++)
        whole = placed[point_of(rings, next, k)];
      if (!whole) return false;
    }
    done[next] = true;
  }
  return true;
}
