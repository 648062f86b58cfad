/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * An order of the sites in which H and Sigma have a narrow band: breadth
 * first from a site far from everything, neighbours by ascending degree
 * (E. Cuthill and J. McKee, Proc. 24th ACM Nat. Conf. (1969) 157).
 */
#include "solver/plan.h"

#include <stdlib.h>
#include <string.h>

/* Below this many sites a full matrix is as fast. */
enum { FULL_SITES = 48 };

static size_t degree(const mho_plan *plan, int site)
{
  return plan->neighbour_start[site + 1] - plan->neighbour_start[site];
}

/* Appends the component of `start` to order, breadth first; returns the new
 * length.  level[] must be negative for unvisited sites. */
static size_t visit(const mho_plan *plan, int start, int *order, size_t length, int *level)
{
  size_t head = length;
  order[length++] = start;
  level[start] = 0;
  while (head < length) {
    int site = order[head++];
    size_t first = length;
    for (size_t k = plan->neighbour_start[site]; k < plan->neighbour_start[site + 1]; k++) {
      int next = plan->neighbour[k];
      if (level[next] >= 0) continue;
      level[next] = level[site] + 1;
      size_t at = length++;
      for (; at > first && degree(plan, order[at - 1]) > degree(plan, next); at--)
        order[at] = order[at - 1];
      order[at] = next;
    }
  }
  return length;
}

/* Walks to the far end of a component until it gets no farther (N. E. Gibbs,
 * W. G. Poole and P. K. Stockmeyer, SIAM J. Numer. Anal. 13, 236 (1976)). */
static int far_end(const mho_plan *plan, int start, int *order, size_t length, int *level)
{
  enum { WALKS_MAX = 8 };
  int depth = -1;
  for (int walk = 0; walk < WALKS_MAX; walk++) {
    size_t end = visit(plan, start, order, length, level);
    int last = order[end - 1], reached = level[last];
    for (size_t k = length; k < end; k++) level[order[k]] = -1;
    if (reached <= depth) break;
    depth = reached;
    start = last;
  }
  return start;
}

mho_status mho_plan_order(mho_plan *plan)
{
  size_t n = (size_t)plan->sites, length = 0;
  plan->order = malloc(n * sizeof(int));
  plan->place = malloc(n * sizeof(int));
  int *level = malloc(n * sizeof(int));
  if (!plan->order || !plan->place || !level) {
    free(level);
    return MHO_ERR_MEMORY;
  }
  for (size_t i = 0; i < n; i++) level[i] = -1;
  for (int i = 0; i < plan->sites; i++)
    if (level[i] < 0) {
      int start = far_end(plan, i, plan->order, length, level);
      length = visit(plan, start, plan->order, length, level);
    }
  for (size_t p = 0; p < n; p++) plan->place[plan->order[p]] = (int)p;
  plan->bandwidth = 1;
  for (size_t i = 0; i < n; i++)
    for (size_t k = plan->neighbour_start[i]; k < plan->neighbour_start[i + 1]; k++) {
      int width = abs(plan->place[i] - plan->place[plan->neighbour[k]]);
      if ((size_t)width > plan->bandwidth) plan->bandwidth = (size_t)width;
    }
  free(level);
  bool narrow = n > FULL_SITES && 3 * plan->bandwidth + 1 < n;
  plan->band = narrow ? plan->bandwidth : 0;
  return MHO_OK;
}
