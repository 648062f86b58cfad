/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Magic integers.  For a molecule in two halves with all rings hexagons
 * det B = +-K, the number of Kekule structures (M. J. S. Dewar and H. C.
 * Longuet-Higgins, Proc. R. Soc. A 214, 482 (1952)), so K B^-1 is integer; it
 * grows beyond 64 bits, hence exact arithmetic throughout.
 */
#include <math.h>
#include <stdlib.h>
#include <string.h>

#include <flint/flint.h>
#include <flint/fmpz.h>
#include <flint/fmpz_mat.h>

#include "analysis/pairs.h"
#include "base/text.h"

#define SAME 1e-12

/* One energy and one hopping throughout. */
static bool is_uniform(const mho_junction *j)
{
  size_t n = (size_t)j->sites;
  const double *h = j->hamiltonian_ev;
  double hopping = 0;
  for (size_t p = 0; p < n; p++)
    for (size_t q = 0; q < p; q++) {
      if (h[p * n + q] == 0) continue;
      if (hopping == 0) hopping = h[p * n + q];
      if (fabs(h[p * n + q] - hopping) > SAME * fabs(hopping)) return false;
    }
  for (size_t p = 1; p < n; p++)
    if (fabs(h[p * n + p] - h[0]) > SAME * fabs(hopping)) return false;
  return hopping != 0;
}

/* Closed walks of six different sites whose smallest is `first`, both ways. */
static long count_rings(const mho_pair_graph *g, int first, int at, int depth, int *path)
{
  long count = 0;
  for (int k = g->start[at]; k < g->start[at + 1]; k++) {
    int next = g->next[k];
    bool seen = false;
    for (int i = 0; i < depth; i++) seen |= path[i] == next;
    if (depth == 6) count += next == first;
    else if (next > first && !seen) {
      path[depth] = next;
      count += count_rings(g, first, next, depth + 1, path);
    }
  }
  return count;
}

/* Connected, in two equal halves, and every independent ring a hexagon. */
static bool is_benzenoid(const mho_pair_graph *g)
{
  int halves = 0, path[6];
  long rings = 0;
  for (int i = 0; i < g->count; i++) {
    if (g->distance[i] < 0 || g->start[i + 1] - g->start[i] > 3) return false;
    halves += g->colour[i] ? 1 : -1;
    path[0] = i;
    rings += count_rings(g, i, i, 1, path);
  }
  return g->two_coloured && halves == 0 && rings / 2 == g->start[g->count] / 2 - g->count + 1;
}

static char *decimal(const fmpz_t value)
{
  size_t size = fmpz_sizeinbase(value, 10) + 2;
  char *text = malloc(size);
  return text ? fmpz_get_str(text, 10, value) : NULL;
}

/* K = |det B|, M = K B^-1. */
static mho_status invert(const mho_pair_graph *g, const int *place, mho_interference *map)
{
  slong half = g->count / 2;
  fmpz_mat_t b, inverse;
  fmpz_t structures, denominator, value;
  fmpz_mat_init(b, half, half);
  fmpz_mat_init(inverse, half, half);
  fmpz_init(structures);
  fmpz_init(denominator);
  fmpz_init(value);
  for (int i = 0; i < g->count; i++)
    for (int k = g->start[i]; g->colour[i] == 0 && k < g->start[i + 1]; k++)
      fmpz_one(fmpz_mat_entry(b, place[i], place[g->next[k]]));
  fmpz_mat_det(structures, b);
  mho_status status = MHO_OK;
  bool regular = !fmpz_is_zero(structures) && fmpz_mat_inv(inverse, denominator, b);
  for (size_t p = 0; regular && status == MHO_OK && p < map->count; p++) {
    mho_pair *pair = &map->pair[p];
    int first = pair->site[0], second = pair->site[1];
    fmpz_zero(value);
    if (g->colour[first] != g->colour[second]) {
      int row = g->colour[first] ? first : second, column = g->colour[first] ? second : first;
      fmpz_mul(value, structures, fmpz_mat_entry(inverse, place[row], place[column]));
      fmpz_divexact(value, value, denominator);
      fmpz_abs(value, value);
    }
    if (!(pair->magic = decimal(value))) status = MHO_ERR_MEMORY;
  }
  fmpz_clear(value);
  fmpz_clear(denominator);
  fmpz_clear(structures);
  fmpz_mat_clear(inverse);
  fmpz_mat_clear(b);
  flint_cleanup();
  return status;
}

mho_status mho_pairs_magic(const mho_junction *junction, const mho_pair_graph *graph,
                           mho_interference *map)
{
  if (!is_uniform(junction) || !is_benzenoid(graph)) return MHO_OK;
  int *place = malloc((size_t)graph->count * sizeof *place), used[2] = {0, 0};
  if (!place) return MHO_ERR_MEMORY;
  for (int i = 0; i < graph->count; i++) place[i] = used[graph->colour[i]]++;
  mho_status status = invert(graph, place, map);
  free(place);
  return status;
}
