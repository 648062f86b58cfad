/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Mutated SMILES: whatever comes in, either a consistent molecule comes out
 * or an error with a reason and a column inside the text.
 * fuzz_smiles CORPUS COUNT [SEED]
 */
#include <mho/structure.h>

#include <math.h>
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

enum { TEXT_SIZE = 1024, CORPUS_SIZE = 1000 };

static uint64_t state;

/* xorshift64*, G. Marsaglia, J. Stat. Softw. 8(14) (2003). */
static unsigned draw(unsigned below)
{
  state ^= state >> 12;
  state ^= state << 25;
  state ^= state >> 27;
  return (unsigned)((state * 2685821657736338717ull) >> 33) % below;
}

static const char *const token[] = {
    "C", "c", "N", "n", "O", "o", "S", "s", "P", "p", "B", "b", "F", "Cl", "Br", "I", "*",
    "(", ")", "[", "]", "1", "2", "%10", "%", "0", "=", "#", "$", ":", "-", "/", "\\", ".",
    "[nH]", "[N+]", "[O-]", "[Au]", "[SH:1]", "[CH2:2]", "[C-]", "[C+]", "[13C@@H]", "@TH9",
    "[H]", "=C=", "C#C", "C#N", "[se]", "c1ccccc1", "C1=CC=CC1", "+", "-2", " ", "\t", "\xC3\xA9",
    "[Fe+2]", "N(=O)=O", "SC(C)=O", "C=C=C", "[999U]", "((", "))", "[n-]", "[B-]"};
enum { TOKENS = sizeof token / sizeof *token };

static void splice(char *text, size_t at, size_t removed, const char *inserted, size_t size)
{
  size_t length = strlen(text);
  if (at > length) at = length;
  if (removed > length - at) removed = length - at;
  if (length - removed + size >= TEXT_SIZE) return;
  memmove(text + at + size, text + at + removed, length - at - removed + 1);
  memcpy(text + at, inserted, size);
}

static void mutate(char *text, char (*corpus)[TEXT_SIZE], unsigned count)
{
  unsigned length = (unsigned)strlen(text), at = draw(length + 1);
  const char *word = token[draw(TOKENS)];
  char part[64];
  switch (draw(7)) {
    case 0: splice(text, at, 1 + draw(3), "", 0); break;
    case 1: splice(text, at, 0, word, strlen(word)); break;
    case 2: splice(text, at, 1, word, strlen(word)); break;
    case 3:
      if (length) text[draw(length)] = (char)(1 + draw(255));
      break;
    case 4:
      if (length) text[draw(length)] = "CcNnOoSs123()[]=#%.:+-"[draw(22)];
      break;
    case 5: { /* repeat a part of it */
      unsigned size = at < length ? 1 + draw(length - at < 40 ? length - at : 40) : 0;
      memcpy(part, text + at, size);
      splice(text, draw(length + 1), 0, part, size);
      break;
    }
    default: { /* a part of another one */
      const char *other = corpus[draw(count)];
      unsigned size = (unsigned)strlen(other), from = draw(size);
      splice(text, at, draw(4), other + from, size - from);
    }
  }
}

#define HOLD(condition, text)                                             \
  do {                                                                    \
    if (!(condition)) {                                                   \
      fprintf(stderr, "does not hold: %s\nfor: %s\n", #condition, text);  \
      abort();                                                            \
    }                                                                     \
  } while (0)

static void hold_molecule(const mho_molecule *m, const mho_structure *s, const char *text)
{
  HOLD(m->site_count > 0, text);
  for (int i = 0; i < m->site_count; i++) {
    HOLD(isfinite(mho_molecule_onsite_ev(m, i)), text);
    HOLD(s->site_atom[i] >= 0 && s->site_atom[i] < s->graph.atom_count, text);
    HOLD(m->site[i].electrons >= 0 && m->site[i].electrons <= 2, text);
  }
  for (int b = 0; b < m->bond_count; b++) {
    const int *ends = m->bond[b].site;
    HOLD(ends[0] >= 0 && ends[1] >= 0 && ends[0] != ends[1], text);
    HOLD(ends[0] < m->site_count && ends[1] < m->site_count, text);
    double hopping = mho_molecule_hopping_ev(m, b);
    HOLD(isfinite(hopping) && (hopping < 0 || fabs(m->bond[b].twist_deg) > 80), text);
  }
  for (int side = 0; side < 2; side++)
    for (int i = 0; i < m->contact[side].count; i++)
      HOLD(m->contact[side].site[i] < m->site_count, text);
}

/* Every double bond of an aromatic ring is one of a matching: the sum of
 * orders, hydrogens and open valences is a usual valence. */
static void hold_graph(const mho_graph *g, const char *text)
{
  for (int a = 0; a < g->atom_count; a++) {
    if (g->atom[a].element != 6) continue;
    int sum = g->atom[a].hydrogens + g->atom[a].radical + abs(g->atom[a].charge);
    for (int i = g->start[a]; i < g->start[a + 1]; i++) sum += g->bond[g->link[i].bond].order;
    HOLD(sum == 4 || abs(g->atom[a].charge) > 1, text);
  }
}

/* Returns true where the text was read. */
static bool run(const char *text)
{
  static const char *const sets[] = {"van-catledge", "streitwieser"};
  mho_molecule molecule;
  mho_structure structure;
  mho_error error;
  mho_structure_options options;
  mho_molecule_init(&molecule);
  mho_structure_init(&structure);
  mho_error_init(&error);
  mho_structure_options_init(&options);
  options.parameters = mho_parameters_builtin(sets[draw(2)]);
  options.alkyl = (mho_alkyl)draw(3);
  options.alternation = (mho_alternation)draw(2);
  options.contacts_optional = draw(2);
  options.place = (mho_place){"corpus", 1, 1, false};
  mho_status status = mho_structure_read_smiles(text, &options, &molecule, &structure, &error);
  bool read = structure.graph.atom_count > 0;
  if (read) hold_graph(&structure.graph, text);
  if (status == MHO_OK) {
    hold_molecule(&molecule, &structure, text);
  } else {
    HOLD(mho_status_is_input(status), text);
    HOLD(error.count > 0 && error.cause[0].message[0], text);
    HOLD(error.cause[0].column >= 0 && error.cause[0].column <= (long)strlen(text) + 1, text);
  }
  mho_structure_clear(&structure);
  mho_molecule_clear(&molecule);
  return read;
}

int main(int count, char **argument)
{
  static char corpus[CORPUS_SIZE][TEXT_SIZE];
  FILE *file = count > 2 ? fopen(argument[1], "r") : NULL;
  if (!file) return 2;
  unsigned lines = 0;
  while (lines < CORPUS_SIZE && fgets(corpus[lines], TEXT_SIZE, file)) {
    corpus[lines][strcspn(corpus[lines], "\n")] = 0;
    lines += corpus[lines][0] != 0;
  }
  fclose(file);
  long runs = atol(argument[2]), read = 0;
  state = count > 3 ? strtoull(argument[3], NULL, 10) : 1;
  for (long i = 0; i < runs; i++) {
    char text[TEXT_SIZE];
    strcpy(text, corpus[draw(lines)]);
    for (unsigned changes = 1 + draw(2); changes; changes--) mutate(text, corpus, lines);
    read += run(text);
  }
  printf("%ld texts, %ld read as molecules\n", runs, read);
  return read > runs / 100 ? 0 : 1;
}
