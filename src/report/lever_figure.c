/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Figures of twists and of pairs of contacts.  Dark is a high transmission; the
 * sign of a pair's Green's function is a mark of its own, + or -, and a node
 * is a ring, so that nothing rests on colour.
 */
#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "report/plot.h"

enum { WIDTH = 820, HEIGHT = 480, SQUARE = 760, SITES_NAMED_MAX = 60 };

/* Decades below the largest value that a figure shows. */
#define SHOWN_DECADES 6.0

#define PALETTE "set palette defined (0 '#f4f5f7', 0.35 '#cfe3df', 0.7 '#2a8f85', 1 '#14213d')\n"

static const mho_cell *cell_at(const mho_table *table, size_t row, size_t column)
{
  return &table->cell[row * table->columns + column];
}

static bool begins_curve(const mho_table *table, size_t row)
{
  return row == 0 || strcmp(cell_at(table, row, 0)->text, cell_at(table, row - 1, 0)->text) != 0;
}

int mho_figure_twist(mho_buffer *script, const mho_table *table, int first)
{
  size_t rows = mho_table_rows(table);
  const char *name[MHO_CURVES_MAX];
  int curves = 0, seen = 0;
  begin_figure(script, WIDTH, HEIGHT);
  for (size_t i = 0; i < rows && curves <= MHO_CURVES_MAX; i++) {
    if (begins_curve(table, i) && seen++ >= first) {
      if (curves == MHO_CURVES_MAX) break;
      mho_buffer_print(script, "%s$curve%d << END\n", curves ? "END\n" : "", curves);
      name[curves++] = cell_at(table, i, 0)->text;
    }
    const mho_cell *value = cell_at(table, i, 4);
    if (curves == 0 || value->kind != MHO_CELL_NUMBER) continue;
    add_number(script, cell_at(table, i, 2)->number);
    add_number(script, log10(value->number));
    mho_buffer_add(script, "\n");
  }
  mho_buffer_add(script, "END\nset xlabel 'angle (deg)'\nset ylabel 'conductance (G_0)'\n"
                         "set format y '10^{%.1f}'\nplot ");
  for (int c = 0; c < curves; c++) {
    mho_buffer_print(script,
                     "%s$curve%d using 1:2 with lines linewidth 2 linecolor '%s' dashtype %s title ",
                     c ? ", " : "", c, ink[c], dash[c]);
    add_quoted(script, name[c]);
  }
  mho_buffer_add(script, "\n");
  return curves;
}

static bool is_of(const mho_table *table, size_t row, const char *molecule)
{
  return !molecule || !strcmp(cell_at(table, row, 0)->text, molecule);
}

/* log10 T over two columns of a table. */
void mho_figure_twist_map(mho_buffer *script, const mho_table *table, const char *molecule)
{
  bool plane = table->columns == 6; /* of two angles */
  size_t x = 2, y = plane ? 4 : 3, z = table->columns - 1, rows = mho_table_rows(table);
  double highest = -INFINITY;
  for (size_t i = 0; i < rows; i++)
    if (is_of(table, i, molecule) && cell_at(table, i, z)->kind == MHO_CELL_NUMBER &&
        cell_at(table, i, z)->number > 0)
      highest = fmax(highest, log10(cell_at(table, i, z)->number));
  if (!isfinite(highest)) highest = 0;
  begin_figure(script, WIDTH, HEIGHT + 60);
  mho_buffer_add(script, "$map << END\n");
  for (size_t i = 0; i < rows; i++) {
    const mho_cell *value = cell_at(table, i, z);
    if (!is_of(table, i, molecule)) continue;
    bool some = value->kind == MHO_CELL_NUMBER && value->number > 0;
    double log10_t = some ? log10(value->number) : highest - SHOWN_DECADES;
    add_number(script, cell_at(table, i, x)->number);
    add_number(script, cell_at(table, i, y)->number);
    add_number(script, fmax(log10_t, highest - SHOWN_DECADES));
    mho_buffer_add(script, "\n");
  }
  mho_buffer_print(script, "END\n" PALETTE "set xlabel 'angle (deg)'\nset ylabel '%s'\n"
                           "set cblabel 'log_{10} T'\nset autoscale fix\n"
                           "plot $map using 1:2:3 with image notitle\n",
                   plane ? "angle of the second bond (deg)" : "E − E_F (eV)");
}

static double pair_log10(const mho_pair *pair)
{
  return pair->transmission > 0 ? log10(pair->transmission) : -INFINITY;
}

/* Both halves of the matrix, as far as log10 T lies in (low, high]. */
static void add_cells(mho_buffer *script, const mho_interference *map, const int *place,
                      double highest, const char *name, double low, double high)
{
  mho_buffer_print(script, "$%s << END\n", name);
  for (size_t p = 0; p < map->count; p++)
    for (int turn = 0; turn < 2; turn++) {
      const mho_pair *pair = &map->pair[p];
      double value = fmax(pair_log10(pair), highest - SHOWN_DECADES);
      if (!(value > low && value <= high)) continue;
      add_number(script, place[pair->site[turn]]);
      add_number(script, place[pair->site[!turn]]);
      add_number(script, value);
      mho_buffer_add(script, pair->transmission == 0 ? " o\n" : pair->green_per_ev > 0 ? " +\n"
                             : pair->green_per_ev < 0 ? " −\n" : " .\n");
    }
  if (low > -INFINITY || high < INFINITY) mho_buffer_add(script, "-9 -9 0 .\n"); /* never empty */
  mho_buffer_add(script, "END\n");
}

/* Names of the sites that pairs are made of, on one axis. */
static void add_names(mho_buffer *script, const mho_molecule *molecule, const char *axis,
                      const int *place, int count)
{
  mho_buffer_print(script, "set %s noenhanced (", axis);
  for (int i = 0, first = 1; i < molecule->site_count; i++) {
    if (place[i] < 0 || (count > SITES_NAMED_MAX && place[i] % (count / 30 + 1))) continue;
    if (!first) mho_buffer_add(script, ", ");
    first = 0;
    add_quoted(script, molecule->site[i].id);
    mho_buffer_print(script, " %d", place[i]);
  }
  mho_buffer_add(script, ")\n");
}

void mho_figure_pairs(mho_buffer *script, const mho_molecule *molecule,
                      const mho_interference *map)
{
  double highest = -INFINITY, lowest = INFINITY;
  int count = 0, *place = calloc((size_t)molecule->site_count + 1, sizeof *place);
  if (!place) {
    script->failed = true;
    return;
  }
  for (int i = 0; i < molecule->site_count; i++) place[i] = -1;
  for (size_t p = 0; p < map->count; p++) {
    for (int end = 0; end < 2; end++) place[map->pair[p].site[end]] = 0;
    highest = fmax(highest, pair_log10(&map->pair[p]));
  }
  for (int i = 0; i < molecule->site_count; i++)
    if (place[i] == 0) place[i] = count++;
  if (!isfinite(highest)) highest = 0;
  for (size_t p = 0; p < map->count; p++)
    lowest = fmin(lowest, fmax(pair_log10(&map->pair[p]), highest - SHOWN_DECADES));
  if (!(lowest < highest - 0.5)) lowest = highest - 0.5;
  double middle = 0.5 * (lowest + highest); /* of the palette: words turn white */
  begin_figure(script, SQUARE, SQUARE - 60);
  add_cells(script, map, place, highest, "pairs", -INFINITY, INFINITY);
  add_cells(script, map, place, highest, "dark", middle, INFINITY);
  add_cells(script, map, place, highest, "light", -INFINITY, middle);
  mho_buffer_add(script, "set cbrange [");
  mho_buffer_number(script, 8, lowest);
  mho_buffer_add(script, ":");
  mho_buffer_number(script, 8, highest);
  mho_buffer_add(script, "]\n");
  add_names(script, molecule, "xtics rotate", place, count);
  add_names(script, molecule, "ytics", place, count);
  mho_buffer_print(script,
                   PALETTE "set cblabel 'log_{10} T'\nset size ratio 1\nset xrange [-0.5:%d.5]\n"
                   "set yrange [-0.5:%d.5]\nset boxwidth 1\nset style fill solid noborder\n"
                   "plot $pairs using 1:2:(0.5):(0.5):3 with boxxyerror palette notitle%s\n",
                   count - 1, count - 1,
                   count <= SITES_NAMED_MAX / 2
                       ? ", $dark using 1:2:4 with labels font ',15' textcolor '#ffffff' notitle, "
                         "$light using 1:2:4 with labels font ',15' textcolor '#222222' notitle"
                       : "");
  free(place);
}
