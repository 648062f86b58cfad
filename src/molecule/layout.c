/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Rings first, as regular polygons; then the tree of rings and chains that
 * the other bonds form, with angles of 120 degrees; then branches are turned
 * over where atoms or bonds meet.  A part that still overlaps is placed by its
 * distances in the graph, and the better of the two pictures is kept.
 */
#include "molecule/layout.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "molecule/ring_system.h"
#include "molecule/rings.h"

#define PI 3.14159265358979323846
#define PAIR_ANGLE (PI / 5) /* of two substituents on a ring, off its bisector */
#define NEAR 0.85     /* closer points repel */
#define PART_GAP 1.8  /* between two parts of a drawing */

enum { STRESS_LIMIT = 200, WORK_LIMIT = 8000000, RING_WORK = 2000000, FAN_LIMIT = 16 };

typedef struct {
  const mho_layout_graph *graph;
  mho_neighbours links;
  mho_ring_list rings;
  double (*position)[2];
  int *system;  /* [points] union-find of fused rings, -1 outside rings */
  int *parent;  /* [points] in the tree; -1 at a root */
  int *order;   /* [points] in which they were placed */
  int *scratch; /* [points] */
  signed char *turn; /* [points] of a zigzag */
  signed char *linear; /* [points] pi bonds, up to 2 */
  bool *placed, *done; /* [points]; [rings] */
  int placed_count;
  long work;
  mho_layout_kind kind;
} layout;

static int root_of(int *part, int v)
{
  while (part[v] != v) v = part[v] = part[part[v]];
  return v;
}

static void find_systems(layout *l)
{
  const mho_ring_list *r = &l->rings;
  for (int v = 0; v < l->graph->points; v++) l->system[v] = -1;
  for (int i = 0; i < r->start[r->count]; i++) l->system[r->point[i]] = r->point[i];
  for (int ring = 0; ring < r->count; ring++)
    for (int i = r->start[ring] + 1; i < r->start[ring + 1]; i++)
      l->system[root_of(l->system, r->point[i])] = root_of(l->system, r->point[i - 1]);
  for (int v = 0; v < l->graph->points; v++)
    if (l->system[v] >= 0) l->system[v] = root_of(l->system, v);
}

static int collect_members(const layout *l, int system, int *member)
{
  int count = 0;
  for (int v = 0; v < l->graph->points; v++)
    if (l->system[v] == system) member[count++] = v;
  return count;
}

/* Members of a fused system onto a circle, for what is too large. */
static void place_circle(layout *l, const int *member, int count)
{
  double radius = count > 1 ? 0.5 / sin(PI / (count > 2 ? count : 2)) : 0;
  for (int i = 0; i < count; i++) {
    l->position[member[i]][0] = radius * cos(2 * PI * i / count);
    l->position[member[i]][1] = radius * sin(2 * PI * i / count);
  }
  l->kind = MHO_LAYOUT_CIRCLE;
}

/* Each ring system in coordinates of its own. */
static mho_status place_systems(layout *l)
{
  const mho_ring_list *r = &l->rings;
  int *ring = malloc(((size_t)r->count + 1) * sizeof *ring);
  mho_status status = ring ? MHO_OK : MHO_ERR_MEMORY;
  for (int s = 0; status == MHO_OK && s < l->graph->points; s++) {
    if (l->system[s] != s) continue;
    int count = 0;
    for (int k = 0; k < r->count; k++)
      if (l->system[r->point[r->start[k]]] == s) ring[count++] = k;
    if (mho_ring_system_build(r, ring, count, l->done, l->placed, l->position)) continue;
    count = collect_members(l, s, l->scratch);
    l->work -= 240L * count * count;
    if (count > STRESS_LIMIT || l->work < 0) {
      place_circle(l, l->scratch, count);
      continue;
    }
    if (l->kind == MHO_LAYOUT_RINGS) l->kind = MHO_LAYOUT_STRESS;
    status = mho_stress_place(&l->links, l->scratch, count, r, false, l->position);
  }
  free(ring);
  memset(l->placed, 0, (size_t)l->graph->points);
  return status;
}

static double direction(const layout *l, int from, int to)
{
  return atan2(l->position[to][1] - l->position[from][1],
               l->position[to][0] - l->position[from][0]);
}

/* Middle of the largest gap between the angles; its width in *gap. */
static double widest_gap(double *angle, int count, double *gap)
{
  for (int i = 1; i < count; i++)
    for (int k = i; k > 0 && angle[k] < angle[k - 1]; k--) {
      double swap = angle[k];
      angle[k] = angle[k - 1];
      angle[k - 1] = swap;
    }
  double from = 0;
  *gap = -1;
  for (int i = 0; i < count; i++) {
    double next = i + 1 < count ? angle[i + 1] : angle[0] + 2 * PI;
    if (next - angle[i] > *gap + 1e-9) {
      *gap = next - angle[i];
      from = angle[i];
    }
  }
  return from + *gap / 2;
}

/* Direction out of a ring system at one of its points, from placed or local
 * coordinates. */
static double outward(const layout *l, int v)
{
  double angle[FAN_LIMIT], gap;
  int count = 0;
  for (int i = l->links.start[v]; i < l->links.start[v + 1] && count < FAN_LIMIT; i++)
    if (l->system[l->links.next[i]] == l->system[v])
      angle[count++] = direction(l, v, l->links.next[i]);
  return count ? widest_gap(angle, count, &gap) : 0;
}

static void take(layout *l, int v, int parent)
{
  l->placed[v] = true;
  l->parent[v] = parent;
  l->order[l->placed_count++] = v;
}

/* Puts v (with its ring system) at one bond from its parent. */
static void attach(layout *l, int parent, int v, double angle)
{
  double x = l->position[parent][0] + cos(angle), y = l->position[parent][1] + sin(angle);
  if (l->system[v] < 0) {
    l->position[v][0] = x;
    l->position[v][1] = y;
    take(l, v, parent);
    return;
  }
  double turn = angle + PI - outward(l, v), c = cos(turn), s = sin(turn);
  double x0 = l->position[v][0], y0 = l->position[v][1];
  take(l, v, parent);
  for (int w = 0; w < l->graph->points; w++) {
    if (l->system[w] != l->system[v]) continue;
    double dx = l->position[w][0] - x0, dy = l->position[w][1] - y0;
    l->position[w][0] = x + c * dx - s * dy;
    l->position[w][1] = y + s * dx + c * dy;
    if (w != v) take(l, w, v);
  }
}

static bool is_linear(const layout *l, int v)
{
  return l->graph->order && l->linear[v] >= 2;
}

/* Places the neighbours of a placed point that are not placed yet. */
static void grow(layout *l, int v)
{
  double angle[FAN_LIMIT], gap = 2 * PI, from = 0;
  int fixed = 0, open = 0, start = l->links.start[v], end = l->links.start[v + 1];
  for (int i = start; i < end; i++) {
    if (!l->placed[l->links.next[i]]) open++;
    else if (fixed < FAN_LIMIT) angle[fixed++] = direction(l, v, l->links.next[i]);
  }
  if (!open) return;
  double back = fixed ? angle[0] : PI;
  if (fixed > 1) from = widest_gap(angle, fixed, &gap) - gap / 2;
  for (int i = start, k = 1; i < end; i++) {
    int next = l->links.next[i];
    if (l->placed[next]) continue;
    double at;
    if (fixed > 1 && open == 2 && gap > PI) at = from + gap / 2 + (2 * k - 3) * PAIR_ANGLE;
    else if (fixed > 1) at = from + gap * k / (open + 1);
    else if (fixed == 1 && open == 1 && is_linear(l, v)) at = back + PI;
    else if (fixed == 1 && open == 1) at = back + l->turn[v] * 2 * PI / 3;
    else if (fixed == 1) at = back + 2 * PI * k / (open + 1);
    else at = back + PI + (open == 2 && !is_linear(l, v) ? (k - 1) * 2 * PI / 3 : 2 * PI * (k - 1) / open);
    l->turn[next] = (signed char)(is_linear(l, v) ? l->turn[v] : -l->turn[v]);
    attach(l, v, next, at);
    k++;
  }
}

/* A tree grows from its largest ring system, or an end of its longest chain. */
static int choose_root(layout *l, int any, int *count)
{
  int head = 0, tail = 0, best = any, last = any;
  int *queue = l->scratch;
  bool *seen = l->done; /* free by now, and long enough */
  memset(seen, 0, (size_t)l->graph->points);
  seen[any] = true;
  queue[tail++] = any;
  while (head < tail) {
    int v = last = queue[head++];
    if (l->system[v] >= 0 && l->system[best] < 0) best = v;
    for (int i = l->links.start[v]; i < l->links.start[v + 1]; i++) {
      int next = l->links.next[i];
      if (seen[next]) continue;
      seen[next] = true;
      queue[tail++] = next;
    }
  }
  *count = tail;
  return l->system[best] >= 0 ? best : last;
}

static void grow_part(layout *l, int root)
{
  int head = l->placed_count;
  l->turn[root] = 1;
  if (l->system[root] < 0) l->position[root][0] = l->position[root][1] = 0;
  take(l, root, -1);
  for (int w = 0; l->system[root] >= 0 && w < l->graph->points; w++)
    if (w != root && l->system[w] == l->system[root]) take(l, w, root);
  for (; head < l->placed_count; head++) {
    int v = l->order[head];
    if (!l->turn[v]) l->turn[v] = 1;
    grow(l, v);
  }
}

/* --- quality -------------------------------------------------------------- */

static double side_of(const double *a, const double *b, const double *p)
{
  return (b[0] - a[0]) * (p[1] - a[1]) - (b[1] - a[1]) * (p[0] - a[0]);
}

static bool cross(const double *a, const double *b, const double *c, const double *d)
{
  return side_of(a, b, c) * side_of(a, b, d) < 0 && side_of(c, d, a) * side_of(c, d, b) < 0;
}

/* How much a part overlaps: close points, and bonds that cross.  The part's
 * points are member[count]; in_part marks them. */
static double overlap(layout *l, const int *member, int count, double (*at)[2])
{
  double sum = 0;
  for (int i = 0; i < count; i++)
    for (int k = i + 1; k < count; k++) {
      const double *p = at[member[i]], *q = at[member[k]];
      double dx = p[0] - q[0], dy = p[1] - q[1], d2 = dx * dx + dy * dy;
      if (d2 < NEAR * NEAR) sum += 4 * (NEAR - sqrt(d2)) * (NEAR - sqrt(d2));
    }
  for (int i = 0; i < count; i++)
    for (int m = l->links.start[member[i]]; m < l->links.start[member[i] + 1]; m++) {
      int a = member[i], b = l->links.next[m];
      if (b < a) continue;
      for (int k = 0; k < count; k++)
        for (int n = l->links.start[member[k]]; n < l->links.start[member[k] + 1]; n++) {
          int c = member[k], d = l->links.next[n];
          if (d < c || c <= a || a == d || b == c || b == d) continue;
          sum += cross(at[a], at[b], at[c], at[d]);
        }
    }
  l->work -= 5L * count * count;
  return sum;
}

/* Mirrors what hangs on v in the tree at the line from its parent to v. */
static void turn_over(layout *l, const int *member, int count, int v)
{
  int p = l->parent[v];
  double ux = l->position[v][0] - l->position[p][0], uy = l->position[v][1] - l->position[p][1];
  double length = ux * ux + uy * uy;
  bool *hangs = l->done;
  if (length < 1e-12) return;
  for (int i = 0; i < count; i++) { /* parents come first */
    int w = member[i];
    hangs[w] = w == v || (l->parent[w] >= 0 && hangs[l->parent[w]]);
    if (!hangs[w]) continue;
    double dx = l->position[w][0] - l->position[p][0], dy = l->position[w][1] - l->position[p][1];
    double along = 2 * (dx * ux + dy * uy) / length;
    l->position[w][0] = l->position[p][0] + along * ux - dx;
    l->position[w][1] = l->position[p][1] + along * uy - dy;
  }
}

static double untangle(layout *l, const int *member, int count)
{
  double now = overlap(l, member, count, l->position);
  for (int round = 0; round < 3 && now > 0; round++)
    for (int i = 1; i < count && now > 0 && l->work > 0; i++) {
      int v = member[i];
      bool bridge = l->parent[v] >= 0 && (l->system[v] < 0 || l->system[v] != l->system[l->parent[v]]);
      if (!bridge || l->links.start[v + 1] - l->links.start[v] < 2) continue;
      turn_over(l, member, count, v);
      double other = overlap(l, member, count, l->position);
      if (other < now - 1e-9) now = other;
      else turn_over(l, member, count, v);
    }
  return now;
}

/* The best of the tree, the tree relaxed by distances, and distances alone. */
static mho_status improve(layout *l, const int *member, int count)
{
  if (5L * count * count > l->work) return MHO_OK;
  double now = untangle(l, member, count);
  if (now < 1e-9 || count > STRESS_LIMIT) return MHO_OK;
  double (*tried)[2] = malloc(((size_t)l->graph->points + 1) * sizeof *tried);
  if (!tried) return MHO_ERR_MEMORY;
  mho_status status = MHO_OK;
  for (int warm = 1; warm >= 0 && status == MHO_OK && now > 1e-9; warm--) {
    l->work -= 240L * count * count;
    if (l->work < 0) break;
    for (int i = 0; i < count; i++)
      memcpy(tried[member[i]], l->position[member[i]], sizeof *tried);
    status = mho_stress_place(&l->links, member, count, &l->rings, warm, tried);
    double other = status == MHO_OK ? overlap(l, member, count, tried) : now;
    if (other >= now) continue;
    now = other;
    for (int i = 0; i < count; i++)
      memcpy(l->position[member[i]], tried[member[i]], sizeof *tried);
    if (l->kind == MHO_LAYOUT_RINGS) l->kind = MHO_LAYOUT_STRESS;
  }
  free(tried);
  return status;
}

/* --- the whole ------------------------------------------------------------ */

/* Turns a part so that it is wide rather than high, and puts it to the right
 * of *right. */
static void settle(layout *l, const int *member, int count, double *right)
{
  double mean[2] = {0, 0}, xx = 0, yy = 0, xy = 0, low[2], high[2];
  for (int i = 0; i < count; i++)
    for (int k = 0; k < 2; k++) mean[k] += l->position[member[i]][k] / count;
  for (int i = 0; i < count; i++) {
    double x = l->position[member[i]][0] - mean[0], y = l->position[member[i]][1] - mean[1];
    xx += x * x;
    yy += y * y;
    xy += x * y;
  }
  double angle = fabs(xx - yy) + fabs(xy) < 1e-6 ? 0 : -atan2(2 * xy, xx - yy) / 2;
  for (int i = 0; i < count; i++) {
    double *p = l->position[member[i]], x = p[0] - mean[0], y = p[1] - mean[1];
    p[0] = cos(angle) * x - sin(angle) * y;
    p[1] = sin(angle) * x + cos(angle) * y;
    for (int k = 0; k < 2; k++) {
      if (i == 0 || p[k] < low[k]) low[k] = p[k];
      if (i == 0 || p[k] > high[k]) high[k] = p[k];
    }
  }
  for (int i = 0; i < count; i++) l->position[member[i]][0] += *right - low[0];
  *right += high[0] - low[0] + PART_GAP;
}

static mho_status place_parts(layout *l)
{
  double right = 0;
  mho_status status = MHO_OK;
  for (int v = 0; v < l->graph->points && status == MHO_OK; v++) {
    int count, first = l->placed_count;
    if (l->placed[v]) continue;
    int root = choose_root(l, v, &count);
    grow_part(l, root);
    status = improve(l, l->order + first, count);
    settle(l, l->order + first, count, &right);
  }
  return status;
}

static mho_status lay_out(layout *l)
{
  size_t n = (size_t)l->graph->points;
  bool complete = true;
  mho_status status = mho_rings_find(&l->links, RING_WORK, &l->rings, &complete);
  if (status != MHO_OK) return status;
  if (!complete) {
    for (int v = 0; v < l->graph->points; v++) l->order[v] = v;
    place_circle(l, l->order, l->graph->points);
    return MHO_OK;
  }
  l->done = calloc(n + (size_t)l->rings.count + 1, 1);
  if (!l->done) return MHO_ERR_MEMORY;
  if (!l->rings.count) {
    for (size_t v = 0; v < n; v++) l->system[v] = -1;
  } else {
    find_systems(l);
    status = place_systems(l);
  }
  return status == MHO_OK ? place_parts(l) : status;
}

mho_status mho_layout(const mho_layout_graph *graph, double (*position)[2],
                      mho_layout_kind *kind)
{
  size_t n = (size_t)graph->points;
  layout l = {.graph = graph, .position = position, .work = WORK_LIMIT};
  int *memory = malloc((4 * n + 1) * sizeof *memory);
  l.turn = calloc(3 * n + 1, 1);
  mho_status status = memory && l.turn ? MHO_OK : MHO_ERR_MEMORY;
  if (status == MHO_OK) {
    l.system = memory;
    l.parent = memory + n;
    l.order = memory + 2 * n;
    l.scratch = memory + 3 * n;
    l.linear = l.turn + n;
    l.placed = (bool *)(l.turn + 2 * n);
    for (int b = 0; graph->order && b < graph->bonds; b++)
      for (int end = 0; end < 2; end++)
        if (l.linear[graph->bond[b][end]] < 2)
          l.linear[graph->bond[b][end]] += (signed char)(graph->order[b] - 1);
    if (graph->points > MHO_LAYOUT_LIMIT) {
      for (int v = 0; v < graph->points; v++) l.order[v] = v;
      place_circle(&l, l.order, graph->points);
    } else {
      status = mho_neighbours_make(graph, &l.links);
      if (status == MHO_OK) status = lay_out(&l);
    }
  }
  mho_rings_clear(&l.rings);
  mho_neighbours_clear(&l.links);
  free(l.done);
  free(l.turn);
  free(memory);
  if (kind) *kind = l.kind;
  return status;
}
