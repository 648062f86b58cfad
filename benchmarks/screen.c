/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Screening for screen.py: one SMILES a line on stdin, seconds as JSON on
 * stdout, one mho_screen_quantities a molecule in a file.
 * Usage: bench_screen THREADS VALUES < LIST, or bench_screen --layout.
 */
#include <mho/mho.h>

#include <omp.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <time.h>

enum { LINES_MAX = 1000000 };

static double now(void)
{
  struct timespec t;
  clock_gettime(CLOCK_MONOTONIC, &t);
  return (double)t.tv_sec + 1e-9 * (double)t.tv_nsec;
}

static mho_status measure(mho_screen_workspace *workspace, const char *smiles,
                          mho_screen_quantities *out, double *building)
{
  mho_molecule molecule;
  mho_error error;
  mho_error_init(&error);
  mho_molecule_init(&molecule);
  double start = now();
  mho_status status = mho_molecule_read_smiles(smiles, NULL, NULL, 0, &molecule, &error);
  *building += now() - start;
  if (status == MHO_OK) status = mho_screen_measure(workspace, &molecule, NULL, out, &error);
  if (status != MHO_OK) fprintf(stderr, "%s: %s\n", smiles, error.cause[0].message);
  mho_molecule_clear(&molecule);
  return status;
}

/* Members of the struct and where they stand, for Python's struct module. */
static int print_layout(void)
{
  const char *separator = "";
  printf("{\"size\": %zu, \"members\": {", sizeof(mho_screen_quantities));
#define PRINT(member, type, column, name, form, what)                                        \
  printf("%s\"%s\": [%zu, \"%s\"]", separator, column,                                       \
         offsetof(mho_screen_quantities, member), sizeof(type) == sizeof(int) ? "i" : "d");  \
  separator = ", ";
  MHO_SCREEN_QUANTITY_LIST(PRINT)
#undef PRINT
  printf("}}\n");
  return 0;
}

int main(int argc, char **argv)
{
  if (argc == 2 && !strcmp(argv[1], "--layout")) return print_layout();
  if (argc != 3) return 2;
  static char *line[LINES_MAX];
  static char text[1 << 16];
  int count = 0, bad = 0;
  while (count < LINES_MAX && fgets(text, sizeof text, stdin)) {
    text[strcspn(text, " \r\n")] = '\0';
    line[count++] = strdup(text);
  }
  mho_screen_quantities *value = calloc((size_t)count + 1, sizeof *value);
  if (!value) return 1;
  double start = now(), building = 0;
#pragma omp parallel num_threads(atoi(argv[1])) reduction(+ : bad, building)
  {
    mho_screen_workspace *workspace = mho_screen_workspace_create();
#pragma omp for schedule(dynamic, 16)
    for (int i = 0; i < count; i++)
      bad += measure(workspace, line[i], &value[i], &building) != MHO_OK;
    mho_screen_workspace_free(workspace);
  }
  double spent = now() - start;
  FILE *file = fopen(argv[2], "wb");
  if (!file || fwrite(value, sizeof *value, (size_t)count, file) != (size_t)count ||
      fclose(file) != 0)
    return 1;
  printf("{\"seconds\": %.9g, \"building\": %.9g, \"count\": %d, \"bad\": %d}\n", spent, building,
         count, bad);
  for (int i = 0; i < count; i++) free(line[i]);
  free(value);
  return bad ? 1 : 0;
}
