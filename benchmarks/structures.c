/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * SMILES text to molecular graph, and to Hamiltonian: time a molecule, over the
 * lines of a file.
 * bench_structures FILE [SECONDS]
 */
#include <mho/structure.h>

#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <time.h>

enum { LINES = 10000 };

static double now_s(void)
{
  struct timespec t;
  clock_gettime(CLOCK_MONOTONIC, &t);
  return (double)t.tv_sec + 1e-9 * (double)t.tv_nsec;
}

/* Sites of the molecule, 0 where it is refused; the Hamiltonian goes to h. */
static int hamiltonian(const char *smiles, const mho_structure_options *options, double **h,
                       size_t *room)
{
  mho_molecule m;
  mho_structure s;
  mho_molecule_init(&m);
  mho_structure_init(&s);
  int n = 0;
  if (mho_structure_read_smiles(smiles, options, &m, &s, NULL) == MHO_OK) {
    n = m.site_count;
    size_t size = (size_t)n * (size_t)n;
    if (size > *room) {
      free(*h);
      *h = malloc(size * sizeof **h);
      if (!*h) exit(1);
      *room = size;
    }
    memset(*h, 0, size * sizeof **h);
    for (int i = 0; i < n; i++) (*h)[i * n + i] = mho_molecule_onsite_ev(&m, i);
    for (int b = 0; b < m.bond_count; b++) {
      const int *e = m.bond[b].site;
      (*h)[e[0] * n + e[1]] = (*h)[e[1] * n + e[0]] = mho_molecule_hopping_ev(&m, b);
    }
  }
  mho_structure_clear(&s);
  mho_molecule_clear(&m);
  return n;
}

/* Best time of one pass over all lines, a line, in microseconds. */
static double best_pass_us(char **line, size_t lines, bool to_hamiltonian, double seconds)
{
  mho_structure_options options;
  mho_structure_options_init(&options);
  options.contacts_optional = options.quiet = true;
  double best = 1e9, *h = NULL;
  size_t room = 0;
  for (double end = now_s() + seconds; now_s() < end;) {
    double start = now_s();
    for (size_t i = 0; i < lines; i++) {
      mho_graph graph;
      if (to_hamiltonian) {
        hamiltonian(line[i], &options, &h, &room);
        continue;
      }
      mho_graph_init(&graph);
      if (mho_smiles_read(line[i], NULL, &graph, NULL) != MHO_OK) exit(1);
      mho_graph_clear(&graph);
    }
    double time = (now_s() - start) / (double)lines;
    if (time < best) best = time;
  }
  free(h);
  return 1e6 * best;
}

int main(int count, char **argument)
{
  static char *line[LINES];
  char *text = NULL;
  size_t room = 0, lines = 0;
  FILE *file = count > 1 ? fopen(argument[1], "r") : NULL;
  if (!file) return 2;
  while (lines < LINES && getline(&text, &room, file) > 0) {
    text[strcspn(text, "\r\n")] = 0;
    line[lines++] = strdup(text);
  }
  fclose(file);
  double seconds = count > 2 ? atof(argument[2]) : 2.0;
  printf("{\"graph_us\": %.3f, \"hamiltonian_us\": %.3f}\n",
         best_pass_us(line, lines, false, seconds), best_pass_us(line, lines, true, seconds));
  for (size_t i = 0; i < lines; i++) free(line[i]);
  free(text);
  return 0;
}
