/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Rules of thumb for a pair of contacts, to stand beside the exact result:
 *
 *   starring: sites an odd number of bonds apart conduct, an even number make a
 *     node (exact for alternants at their centre);
 *   orbital: the pair conducts where the product of its amplitudes differs in
 *     sign between HOMO and LUMO (K. Yoshizawa, Acc. Chem. Res. 45, 1612 (2012));
 *   cross-conjugation: the pair conducts where some Kekule structure of the
 *     rest is left when both sites are taken out, that is where alternate
 *     single and double bonds can join them.
 */
#include <math.h>
#include <stdlib.h>

#include "analysis/pairs.h"
#include "molecule/matching.h"

/* Amplitude products below this part of 1/sites say nothing. */
#define AMPLITUDE_FLOOR 1e-8

static mho_rule_verdict by_orbitals(const mho_junction *j, int homo, const int *site)
{
  size_t n = (size_t)j->sites, a = (size_t)site[0], b = (size_t)site[1];
  const double *h = j->orbital + (size_t)homo * n, *l = h + n;
  double high = h[a] * h[b] * (double)n, low = l[a] * l[b] * (double)n;
  if (fabs(high) < AMPLITUDE_FLOOR || fabs(low) < AMPLITUDE_FLOOR) return MHO_RULE_SILENT;
  return (high > 0) != (low > 0) ? MHO_RULE_CONDUCTS : MHO_RULE_NODE;
}

/* Index of a HOMO that stands alone beside a LUMO that does, or -1. */
static int frontier(const mho_junction *j)
{
  int homo = j->electrons / 2 - 1, n = j->sites;
  if (j->electrons % 2 || homo < 0 || homo + 1 >= n) return -1;
  double near = 1e-6 * (j->level_ev[n - 1] - j->level_ev[0]);
  for (int k = homo - 1; k <= homo + 1; k++)
    if (k >= 0 && k + 1 < n && j->level_ev[k + 1] - j->level_ev[k] <= near) return -1;
  return homo;
}

typedef struct {
  int *start, *next, *mate;
  bool *missed;
} remainder_graph;

/* Of site i in the molecule without another. */
#define PLACE(i, without) ((i) - ((i) > (without)))

/* missed[j]: has the molecule without the site and j a Kekule structure?  One
 * matching without the site tells it for all j (T. Gallai and J. Edmonds). */
static mho_status by_structures(const mho_pair_graph *g, int site, remainder_graph *r)
{
  int count = g->count - 1, links = 0, vacant = 0;
  for (int i = 0; i < g->count; i++) {
    if (i == site) continue;
    r->start[PLACE(i, site)] = links;
    r->mate[PLACE(i, site)] = -1;
    for (int k = g->start[i]; k < g->start[i + 1]; k++)
      if (g->next[k] != site) r->next[links++] = PLACE(g->next[k], site);
  }
  r->start[count] = links;
  mho_match_graph rest = {count, r->start, r->next};
  mho_status status = mho_match_maximum(&rest, r->mate, r->missed);
  for (int i = 0; i < count; i++) vacant += r->mate[i] < 0;
  for (int i = 0; i < count && vacant > 1; i++) r->missed[i] = false;
  return status;
}

mho_status mho_pairs_rules(const mho_junction *junction, const mho_pair_graph *graph,
                           mho_interference *map)
{
  size_t n = (size_t)graph->count;
  int homo = frontier(junction);
  remainder_graph rest = {malloc((n + 1) * sizeof(int)),
                          malloc(((size_t)graph->start[n] + 1) * sizeof(int)),
                          malloc((n + 1) * sizeof(int)), malloc((n + 1) * sizeof(bool))};
  mho_status status =
      rest.start && rest.next && rest.mate && rest.missed ? MHO_OK : MHO_ERR_MEMORY;
  int done = -1; /* pairs come in order of their first site */
  for (size_t p = 0; status == MHO_OK && p < map->count; p++) {
    mho_pair *pair = &map->pair[p];
    int distance = graph->distance[(size_t)pair->site[0] * n + (size_t)pair->site[1]];
    pair->starring = distance < 0   ? MHO_RULE_SILENT
                     : distance % 2 ? MHO_RULE_CONDUCTS
                                    : MHO_RULE_NODE;
    pair->orbital = homo < 0 ? MHO_RULE_SILENT : by_orbitals(junction, homo, pair->site);
    if (distance < 0 || n % 2) continue;
    if (done != pair->site[0]) status = by_structures(graph, done = pair->site[0], &rest);
    if (status != MHO_OK) break;
    pair->cross_conjugation =
        rest.missed[PLACE(pair->site[1], done)] ? MHO_RULE_CONDUCTS : MHO_RULE_NODE;
  }
  free(rest.start);
  free(rest.next);
  free(rest.mate);
  free(rest.missed);
  return status;
}

bool mho_pair_disagrees(const mho_pair *pair, mho_rule_verdict rule)
{
  if (rule == MHO_RULE_SILENT) return false;
  return (rule == MHO_RULE_CONDUCTS) != (pair->kind == MHO_PAIR_CONSTRUCTIVE);
}
