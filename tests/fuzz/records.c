/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Mutated files of structures: each record becomes a consistent molecule, which
 * can be drawn, or an error with a reason and a line inside the file.
 * fuzz_records COUNT FILE... (.mol, .sdf, .xyz); seeds are the files.
 */
#include <mho/mho.h>

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

#include "base/random.h"
#include "base/text.h"
#include "input/records.h"
#include "report/drawing.h"

enum { SEEDS = 64, SIZE_LIMIT = 40000 };

static mho_random random_bits;
static struct {
  char *text;
  size_t size;
  const char *ending;
} seed[SEEDS];

static size_t draw(size_t below) { return (size_t)mho_random_below(&random_bits, below); }

static const char *const token[] = {
    "M  END\n", "$$$$\n", "M  V30 ", "M  CHG  1   1  -1\n", "M  RAD  1   2   2\n", "V3000", "V2000", "-\n",
    " 0", "999", "  4", "R#", "nan", "1e9", "\r\n", "\n", "\n\n", " ", "-1", "0.0000", "Au", "Fe", "Q", "Cl",
    "M  V30 END ATOM\n", "M  V30 BEGIN BOND\n", "BEGIN CTAB", "COUNTS 3 2", "CHG=1", "VAL=-1", "\xC3\xA9", "\xFF"};
enum { TOKENS = sizeof token / sizeof *token };

static size_t splice(char *text, size_t size, size_t at, size_t removed, const char *from, size_t added)
{
  if (removed > size - at) removed = size - at;
  if (size - removed + added > SIZE_LIMIT) return size;
  memmove(text + at + added, text + at + removed, size - at - removed);
  memcpy(text + at, from, added);
  return size - removed + added;
}

static size_t mutate(char *text, size_t size)
{
  static char part[200];
  size_t at = draw(size + 1), length;
  const char *word = token[draw(TOKENS)];
  switch (draw(6)) {
  case 0: return splice(text, size, at, 1 + draw(4), "", 0);
  case 1: return splice(text, size, at, 0, word, strlen(word));
  case 2: return splice(text, size, at, strlen(word), word, strlen(word));
  case 3:
    if (size) text[draw(size)] = (char)(1 + draw(255));
    return size;
  case 4: /* digits are what decides */
    for (size_t i = 0; i < 50 && size; i++) {
      at = draw(size);
      if (text[at] < '0' || text[at] > '9') continue;
      text[at] = (char)('0' + draw(10));
      break;
    }
    return size;
  default:
    length = size - at < sizeof part ? size - at : sizeof part;
    memcpy(part, text + at, length);
    return splice(text, size, draw(size + 1), 0, part, length);
  }
}

static void hold(bool condition, const char *what, const char *path)
{
  if (condition) return;
  fprintf(stderr, "does not hold: %s; see %s\n", what, path);
  abort();
}

static void hold_molecule(const mho_molecule *m, const char *path)
{
  mho_drawing drawing;
  mho_buffer svg = {0};
  hold(m->site_count > 0 && m->electrons >= 0, "sites", path);
  for (int b = 0; b < m->bond_count; b++)
    hold(isfinite(mho_molecule_hopping_ev(m, b)), "hopping", path);
  for (int s = 0; s < m->site_count; s++)
    hold(m->site_atom[s] >= 0 && m->site_atom[s] < m->graph.atom_count, "atom of a site", path);
  if (m->site_count > 200) return;
  hold(mho_drawing_make(m, &drawing, NULL) == MHO_OK, "drawing", path);
  mho_drawing_write(&drawing, NULL, &svg);
  hold(!strstr(svg.data, "nan") && !strstr(svg.data, "inf"), "finite drawing", path);
  mho_buffer_clear(&svg);
  mho_drawing_clear(&drawing);
}

/* Molecules that were read. */
static long read_file(const char *path, long lines)
{
  mho_settings settings = {.contacts_optional = draw(2), .has_hopping = true,
                           .hopping = (mho_hopping)draw(2)};
  mho_records *records;
  mho_error error;
  mho_error_init(&error);
  long good = 0;
  mho_status status = mho_records_open(path, &records, &error);
  hold(status == MHO_OK || error.count > 0, "a reason", path);
  if (status != MHO_OK) return 0;
  for (mho_record record = {.number = 1}; record.number;) {
    mho_molecule m;
    mho_molecule_init(&m);
    mho_error_init(&error);
    status = mho_molecule_read_record(records, &settings, 0, &m, &record, &error);
    if (status == MHO_OK && record.number) {
      hold_molecule(&m, path);
      good++;
    } else if (status != MHO_OK) {
      hold(mho_status_is_input(status) && error.count > 0 && error.cause[0].message[0], "a reason", path);
      hold(error.cause[0].line >= 0 && error.cause[0].line <= lines, "a line of the file", path);
    }
    mho_molecule_clear(&m);
  }
  mho_records_close(records);
  return good;
}

static long run(void)
{
  static char text[SIZE_LIMIT + 1];
  char path[64];
  size_t which = draw(SEEDS);
  while (!seed[which].text) which = draw(SEEDS);
  size_t size = seed[which].size;
  memcpy(text, seed[which].text, size);
  for (size_t changes = draw(4); changes; changes--) size = mutate(text, size);
  snprintf(path, sizeof path, "fuzz-records-%d%s", (int)getpid(), seed[which].ending);
  FILE *file = fopen(path, "wb");
  if (!file || fwrite(text, 1, size, file) != size || fclose(file)) abort();
  long lines = 1;
  for (size_t i = 0; i < size; i++) lines += text[i] == '\n';
  long good = read_file(path, lines);
  remove(path);
  return good;
}

int main(int count, char **argument)
{
  int files = 0;
  for (int i = 2; i < count && files < SEEDS; i++) {
    if (mho_read_file(argument[i], SIZE_LIMIT, "fuzz", &seed[files].text, &seed[files].size, NULL) != MHO_OK)
      continue;
    seed[files++].ending = strrchr(argument[i], '.');
  }
  if (!files) return 2;
  long runs = atol(argument[1]), good = 0;
  random_bits = mho_random_stream(1, 0);
  for (long i = 0; i < runs; i++) good += run();
  printf("%ld files, %ld molecules\n", runs, good);
  for (int i = 0; i < files; i++) free(seed[i].text);
  return good > runs / 20 ? 0 : 1;
}
