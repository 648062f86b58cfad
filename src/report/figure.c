/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "report/figure.h"

#include <errno.h>
#include <fcntl.h>
#include <math.h>
#include <spawn.h>
#include <stdlib.h>
#include <string.h>
#include <sys/wait.h>

#include "report/plot.h"

extern char **environ;

enum { MARKED_SITES_MAX = 120 }; /* of larger molecules finding all nodes takes seconds */

/* Below this a node is drawn as running out of the figure. */
#define LOWEST_LOG10 (-9.0)

/* Range of log10 T that shows every curve and mark. */
static void find_range(const mho_curve *curve, int curves, double *low, double *high)
{
  *low = 0.0;
  *high = 0.0;
  for (int c = 0; c < curves; c++) {
    for (size_t i = 0; i < curve[c].count; i++) {
      const mho_point *p = &curve[c].point[i];
      double value = p->node ? LOWEST_LOG10 : p->log10_transmission;
      *low = fmin(*low, value);
      *high = fmax(*high, value);
    }
    if (!curve[c].has_measured) continue;
    *low = fmin(*low, curve[c].measured_low);
    *high = fmax(*high, curve[c].measured_high);
  }
  *low = fmax(floor(*low), LOWEST_LOG10);
  *high = ceil(*high - 0.05) + 0.3;
  if (*high - *low < 2) *low = *high - 2;
}

mho_status mho_figure_nodes(const mho_plan *plan, double fermi_ev, double **node_ev, size_t *nodes,
                            mho_error *error)
{
  mho_nodes found;
  *node_ev = NULL;
  *nodes = 0;
  if (mho_plan_sites(plan) > MARKED_SITES_MAX) return MHO_OK;
  mho_status status = mho_nodes_find(plan, &found, error);
  if (status == MHO_OK && found.count > 0) {
    *node_ev = malloc(found.count * sizeof **node_ev);
    if (!*node_ev) status = mho_fail(error, MHO_ERR_MEMORY, "report", NULL, "out of memory");
  }
  for (size_t i = 0; status == MHO_OK && i < found.count; i++)
    if (found.node[i].kind == MHO_NODE_EXACT)
      (*node_ev)[(*nodes)++] = found.node[i].energy_ev - fermi_ev;
  mho_nodes_clear(&found);
  return status;
}

static void add_curve_data(mho_buffer *script, const mho_curve *curve, int index, double low)
{
  mho_buffer_print(script, "$curve%d << END\n", index);
  for (size_t i = 0; i < curve->count; i++) {
    const mho_point *p = &curve->point[i];
    double value = p->node ? low - 1 : fmax(p->log10_transmission, low - 1);
    add_number(script, curve->energy_ev[i]);
    add_number(script, value);
    mho_buffer_add(script, "\n");
  }
  mho_buffer_add(script, "END\n");
  if (curve->nodes > 0) mho_buffer_print(script, "$nodes%d << END\n", index);
  for (size_t i = 0; i < curve->nodes; i++) {
    add_number(script, curve->node_ev[i]);
    add_number(script, low);
    mho_buffer_add(script, "\n");
  }
  if (curve->nodes > 0) mho_buffer_add(script, "END\n");
  if (!curve->has_measured) return;
  mho_buffer_print(script, "$measured%d << END\n 0", index);
  add_number(script, curve->measured_log10_g0);
  add_number(script, curve->measured_low);
  add_number(script, curve->measured_high);
  mho_buffer_add(script, "\nEND\n");
}

void mho_figure_transmission(mho_buffer *script, const mho_curve *curve,
                             int curves, double window_ev)
{
  double low, high;
  bool noted = false;
  find_range(curve, curves, &low, &high);
  begin_figure(script, 820, 480);
  for (int c = 0; c < curves; c++) add_curve_data(script, &curve[c], c, low);
  mho_buffer_add(script, "set xlabel 'E − E_F (eV)'\nset ylabel 'transmission T(E)'\n"
                         "set format y '10^{%.0f}'\nset ytics 1\nset yrange [");
  add_number(script, low);
  mho_buffer_add(script, ":");
  add_number(script, high);
  mho_buffer_add(script, "]\nset xrange [");
  add_number(script, curve[0].energy_ev[0]);
  mho_buffer_add(script, ":");
  add_number(script, curve[0].energy_ev[curve[0].count - 1]);
  mho_buffer_add(script, "]\n");
  if (high - low > 9) mho_buffer_add(script, "set ytics 2\n");
  if (window_ev > 0) {
    mho_buffer_add(script, "set object 1 rectangle from ");
    mho_buffer_number(script, 8, -window_ev);
    mho_buffer_add(script, ", graph 0 to ");
    mho_buffer_number(script, 8, window_ev);
    mho_buffer_add(script, ", graph 1 behind fillcolor '" SHADE "' fillstyle solid noborder\n");
  }
  mho_buffer_add(script, "set arrow 1 from 0, graph 0 to 0, graph 1 nohead back linecolor '" NEUTRAL
                         "' dashtype '-'\nplot ");
  for (int c = 0; c < curves; c++) {
    mho_buffer_print(script, "%s$curve%d using 1:2 with lines linewidth 2 linecolor '%s' dashtype %s title ",
                     c ? ", " : "", c, ink[c], dash[c]);
    add_quoted(script, curve[c].name);
    if (curve[c].nodes > 0)
      mho_buffer_print(script,
                       ", $nodes%d using 1:2:(0):(%.3f) with vectors nohead linewidth 1 "
                       "linecolor '%s' dashtype '.' notitle, $nodes%d using 1:2 with points "
                       "pointtype %d pointsize 1.5 linecolor '%s' title '%s'",
                       c, 0.12 * (high - low), ink[c], c, 8 + c % 2, ink[c],
                       noted ? "" : "node");
    noted |= curve[c].nodes > 0;
    if (!curve[c].has_measured) continue;
    mho_buffer_print(script,
                     ", $measured%d using 1:2:3:4 with yerrorbars linewidth 2 pointtype 12 "
                     "pointsize 1.4 linecolor '%s' notitle",
                     c, ink[c]);
  }
  mho_buffer_add(script, "\n");
}

static bool is_shown(const mho_comparison *c) { return c->has_measured; }

void mho_figure_comparison(mho_buffer *script, const char *const *molecule, const mho_comparison *comparison,
                           int count)
{
  int rows = 0;
  for (int i = 0; i < count; i++) rows += is_shown(&comparison[i]);
  begin_figure(script, 820, 150 + 42 * rows);
  mho_buffer_add(script, "$computed << END\n");
  for (int i = 0, row = rows; i < count; i++) {
    const mho_comparison *c = &comparison[i];
    if (!is_shown(c)) continue;
    if (c->has_computed) {
      add_number(script, c->computed_log10_g0);
      add_number(script, row + 0.14);
      add_number(script, c->has_error ? c->computed_low : c->computed_log10_g0);
      add_number(script, c->has_error ? c->computed_high : c->computed_log10_g0);
      mho_buffer_add(script, "\n");
    }
    row--;
  }
  mho_buffer_add(script, "END\n$measured << END\n");
  for (int i = 0, row = rows; i < count; i++) {
    const mho_comparison *c = &comparison[i];
    if (!is_shown(c)) continue;
    add_number(script, c->measured_log10_g0);
    add_number(script, row - 0.14);
    add_number(script, c->has_spread ? c->measured_low : c->measured_log10_g0);
    add_number(script, c->has_spread ? c->measured_high : c->measured_log10_g0);
    mho_buffer_add(script, "\n");
    row--;
  }
  mho_buffer_add(script, "END\nset ytics noenhanced (");
  for (int i = 0, row = rows; i < count; i++) {
    if (!is_shown(&comparison[i])) continue;
    mho_buffer_add(script, row == rows ? "" : ", ");
    add_quoted(script, molecule[i]);
    mho_buffer_print(script, " %d", row--);
  }
  mho_buffer_print(script,
                   ")\nset yrange [0.4:%d.6]\nset xlabel 'log_{10}(G / G_0)'\n"
                   "set offsets graph 0.04, graph 0.04, 0, 0\n"
                   "set grid xtics linecolor '" SHADE "' linetype 1\n"
                   "plot $computed using 1:2:3:4 with xerrorbars linewidth 2 pointtype 7 "
                   "pointsize 1.1 linecolor '%s' title 'computed (bar: error)', "
                   "$measured using 1:2:3:4 with xerrorbars linewidth 2 pointtype 12 "
                   "pointsize 1.4 linecolor '%s' title 'measured (bar: spread)'\n",
                   rows, ink[0], ink[1]);
}

mho_status mho_figure_render(const char *script_path, const char *svg_path, bool *available, mho_error *error)
{
  /* -d: no start-up file of the user, the same figure for everyone. */
  char program[] = "gnuplot", no_startup[] = "-d";
  char *const arguments[] = {program, no_startup, (char *)(size_t)script_path, NULL};
  posix_spawn_file_actions_t actions;
  if (posix_spawn_file_actions_init(&actions) != 0)
    return mho_fail(error, MHO_ERR_MEMORY, "report", NULL, "out of memory");
  posix_spawn_file_actions_addopen(&actions, 0, "/dev/null", O_RDONLY, 0);
  posix_spawn_file_actions_addopen(&actions, 1, svg_path, O_WRONLY | O_CREAT | O_TRUNC, 0666);
  posix_spawn_file_actions_addopen(&actions, 2, "/dev/null", O_WRONLY, 0);
  pid_t child;
  int code = posix_spawnp(&child, "gnuplot", &actions, NULL, arguments, environ);
  posix_spawn_file_actions_destroy(&actions);
  *available = code == 0;
  if (code != 0) return MHO_OK;
  int result = 0;
  while (waitpid(child, &result, 0) < 0 && errno == EINTR) {}
  if (WIFEXITED(result) && WEXITSTATUS(result) == 127) *available = false;
  else if (!WIFEXITED(result) || WEXITSTATUS(result) != 0)
    return mho_fail(error, MHO_ERR_WRITE, "report", "figure", "gnuplot could not draw a figure");
  return MHO_OK;
}
