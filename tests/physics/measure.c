/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Prints the quantities of molecule files for screen_check.py, one JSON object a
 * line.  One workspace serves all.
 */
#include <mho/mho.h>

#include <stdio.h>

static void print(const char *name, const mho_screen_quantities *q)
{
  printf("{\"molecule\": \"%s\"", name);
  for (int i = 0; i < MHO_SCREEN_QUANTITIES; i++) {
    double value;
    bool has = mho_screen_value(q, i, &value);
    printf(", \"%s\": ", mho_screen_quantity_at(i)->column);
    if (has) printf("%.17g", value);
    else printf("null");
  }
  printf("}\n");
}

int main(int argc, char **argv)
{
  mho_screen_workspace *workspace = mho_screen_workspace_create();
  int failed = 0;
  for (int i = 1; i < argc; i++) {
    mho_molecule m;
    mho_screen_quantities q;
    mho_error error;
    mho_error_init(&error);
    mho_status status = mho_molecule_read(argv[i], NULL, NULL, &m, &error);
    if (status == MHO_OK) status = mho_screen_measure(workspace, &m, NULL, &q, &error);
    if (status == MHO_OK) print(m.name, &q);
    else fprintf(stderr, "%s: %s\n", argv[i], error.cause[0].message);
    failed += status != MHO_OK;
    mho_molecule_clear(&m);
  }
  mho_screen_workspace_free(workspace);
  return failed > 0;
}
