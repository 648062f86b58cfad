/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Figures of twists and of pairs of contacts.  Dark is a high transmission; the
 * sign of a pair's Green's function is a mark of its own, + or -, and a node
 * is a ring, so that nothing rests on colour.
 */
#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "report/drawing.h"
#include "report/plot.h"

enum { WIDTH = 820, HEIGHT = 480, SQUARE = 760, SITES_NAMED_MAX = 60 };

/* Decades below the largest value that a figure shows. */
#define SHOWN_DECADES 6.0

#define PALETTE "set palette defined (0 '#f4f5f7', 0.35 '#cfe3df', 0.7 '#2a8f85', 1 '#14213d')\n"

static const mho_cell *cell_at(const mho_table *table, size_t row, size_t column)
{
  return &table->cell[row * table->columns + column];
}

void mho_figure_twist(mho_buffer *script, const mho_table *table)
{
  size_t rows = mho_table_rows(table), start = 0;
  int curves = 0;
  begin_figure(script, WIDTH, HEIGHT);
  for (size_t i = 0; i < rows; i++) {
    const char *name = cell_at(table, i, 0)->text;
    if (i == 0 || strcmp(name, cell_at(table, start, 0)->text)) {
      start = i;
      if (curves == MHO_CURVES_MAX) break;
      mho_buffer_print(script, "%s$curve%d << END\n", curves ? "END\n" : "", curves);
      curves++;
    }
    const mho_cell *value = cell_at(table, i, 4);
    if (value->kind != MHO_CELL_NUMBER) continue;
    add_number(script, cell_at(table, i, 2)->number);
    add_number(script, log10(value->number));
    mho_buffer_add(script, "\n");
  }
  mho_buffer_add(script, "END\nset xlabel 'angle (deg)'\nset ylabel 'conductance (G_0)'\n"
                         "set format y '10^{%.1f}'\nplot ");
  int curve = 0;
  for (size_t i = 0; i < rows && curve < curves; i++) {
    const char *name = cell_at(table, i, 0)->text;
    if (i > 0 && !strcmp(name, cell_at(table, i - 1, 0)->text)) continue;
    mho_buffer_print(script,
                     "%s$curve%d using 1:2 with lines linewidth 2 linecolor '%s' dashtype %s title ",
                     curve ? ", " : "", curve, ink[curve], dash[curve]);
    add_quoted(script, name);
    curve++;
  }
  mho_buffer_add(script, "\n");
}

/* log10 T over two columns of a table of one molecule. */
void mho_figure_twist_map(mho_buffer *script, const mho_table *table)
{
  bool plane = table->columns == 6; /* of two angles */
  size_t x = 2, y = plane ? 4 : 3, z = table->columns - 1, rows = mho_table_rows(table);
  double highest = -INFINITY;
  for (size_t i = 0; i < rows; i++)
    if (cell_at(table, i, z)->kind == MHO_CELL_NUMBER && cell_at(table, i, z)->number > 0)
      highest = fmax(highest, log10(cell_at(table, i, z)->number));
  if (!isfinite(highest)) highest = 0;
  begin_figure(script, WIDTH, HEIGHT + 60);
  mho_buffer_add(script, "$map << END\n");
  for (size_t i = 0; i < rows; i++) {
    const mho_cell *value = cell_at(table, i, z);
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
  double highest = -INFINITY;
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
  begin_figure(script, SQUARE, SQUARE - 60);
  add_cells(script, map, place, highest, "pairs", -INFINITY, INFINITY);
  add_cells(script, map, place, highest, "dark", highest - 0.5 * SHOWN_DECADES, INFINITY);
  add_cells(script, map, place, highest, "light", -INFINITY, highest - 0.5 * SHOWN_DECADES);
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

mho_status mho_drawing_write_pairs(const mho_molecule *molecule, const mho_interference *map,
                                   int from, mho_buffer *svg, mho_error *error)
{
  size_t sites = (size_t)molecule->site_count;
  double highest = -INFINITY, *value = calloc(sites + 1, sizeof *value);
  const char **text = calloc(sites + 1, sizeof *text);
  mho_drawing drawing = {0};
  mho_status status = value && text ? mho_drawing_make(molecule, &drawing, error)
                                    : mho_fail(error, MHO_ERR_MEMORY, "report", NULL,
                                               "out of memory");
  for (size_t p = 0; p < map->count; p++) highest = fmax(highest, pair_log10(&map->pair[p]));
  for (size_t p = 0; status == MHO_OK && p < map->count; p++) {
    const mho_pair *pair = &map->pair[p];
    if (pair->site[0] != from && pair->site[1] != from) continue;
    int other = pair->site[0] == from ? pair->site[1] : pair->site[0];
    double size = 1 - (highest - pair_log10(pair)) / SHOWN_DECADES;
    value[other] = pair->transmission > 0 ? copysign(fmax(size, 0.05), pair->green_per_ev) : 0;
    text[other] = pair->transmission > 0 ? "" : "node";
  }
  if (status == MHO_OK) {
    text[from] = "from";
    mho_drawing_marks marks = {.title = molecule->name, .site_value = value, .site_text = text};
    mho_drawing_write(&drawing, &marks, svg);
  }
  mho_drawing_clear(&drawing);
  free(value);
  free(text);
  return status;
}
