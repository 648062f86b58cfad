/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * What a stage shows on a molecule.  Signs are shapes: a filled disc or bar is
 * positive, a hatched one negative, an arrow points along its current, and a
 * ring current is a circular arrow.  Every mark carries its value as the title
 * that a viewer shows on hovering.
 */
#include <mho/quantity.h>

#include <stdio.h>
#include <string.h>

#include "molecule/rings.h"
#include "report/picture.h"

#define FILLED "fill=\"" INK "\" fill-opacity=\"0.4\" stroke=\"" INK "\""
#define HATCHED "fill=\"url(#hatch)\" stroke=\"" INK "\" stroke-dasharray=\"3 2\""

enum { RING_POINTS_MAX = 8 };

static void begin_mark(picture *p, const char *kind, const char *const *note, int index)
{
  mho_buffer_print(p->svg, "<g class=\"%s\">", kind);
  if (!note || !note[index] || !*note[index]) return;
  mho_buffer_add(p->svg, "<title>");
  mho_buffer_escape(p->svg, note[index]);
  mho_buffer_add(p->svg, "</title>");
}

static void end_mark(picture *p) { mho_buffer_add(p->svg, "</g>\n"); }

static void draw_disc(picture *p, int site)
{
  double value = value_of(p->marks->site_value, site);
  int point = p->d->site_point[site];
  if (value == 0 || p->d->point_site[point] != site) return;
  begin_mark(p, "site", p->marks->site_note, site);
  circle(p, x_of(p, point), y_of(p, point), fmax(19 * sqrt(fabs(value)), 3.5),
         value > 0 ? FILLED : HATCHED);
  end_mark(p);
}

/* A polygon of `count` points, `along` a line from its start and `across` it,
 * in pixels. */
static void polygon(picture *p, double x, double y, double ux, double uy, int count,
                    const double *along, const double *across, const char *style)
{
  for (int i = 0; i < count; i++) {
    put(p, i ? "L" : "<path d=\"M", x + along[i] * ux - across[i] * uy);
    put(p, " ", y + along[i] * uy + across[i] * ux);
  }
  mho_buffer_print(p->svg, "Z\" %s/>", style);
}

static void arrow(picture *p, double x, double y, double ux, double uy, double length, double width)
{
  double head = fmin(fmax(9, 1.3 * width), 0.5 * length), half = 0.5 * width;
  double wide = half + fmax(3.5, 0.35 * width), neck = length - head;
  const double along[] = {0, neck, neck, length, neck, neck, 0};
  const double across[] = {-half, -half, -wide, 0, wide, half, half};
  polygon(p, x, y, ux, uy, 7, along, across, FILLED);
}

/* A bond's value: an arrow, or a bar across its middle. */
static void draw_bond_value(picture *p, int bond)
{
  const mho_drawing *d = p->d;
  double value = value_of(p->marks->bond_value, bond);
  if (value == 0) return;
  const mho_bond *of = &d->molecule->bond[bond];
  bool turned = !p->marks->bars && value < 0;
  int a = d->site_point[of->site[turned]], b = d->site_point[of->site[!turned]];
  double x = x_of(p, a), y = y_of(p, a), ux = x_of(p, b) - x, uy = y_of(p, b) - y;
  double length = sqrt(ux * ux + uy * uy), size = fabs(value);
  if (length < 1) return;
  ux /= length;
  uy /= length;
  begin_mark(p, "bond", p->marks->bond_note, bond);
  if (p->marks->bars) {
    double half = 4 + 6 * size, reach = 0.34 * length;
    const double along[] = {-reach, reach, reach, -reach}, across[] = {-half, -half, half, half};
    polygon(p, x + 0.5 * length * ux, y + 0.5 * length * uy, ux, uy, 4, along, across,
            value > 0 ? FILLED : HATCHED);
  } else {
    arrow(p, x + 0.1 * length * ux, y + 0.1 * length * uy, ux, uy, 0.82 * length, 1.6 + 10 * size);
  }
  end_mark(p);
}

static void write_words(picture *p, double x, double y, const char *words)
{
  text(p, x, y, "font-size=\"11\" font-weight=\"bold\" fill=\"" INK "\" text-anchor=\"middle\" " HALO,
       words);
}

/* One line, or two with a line feed between them. */
static void draw_site_text(picture *p, int site)
{
  const char *words = p->marks->site_text ? p->marks->site_text[site] : NULL;
  int point = p->d->site_point[site];
  char first[64];
  if (!words || !*words || p->d->point_site[point] != site) return;
  const char *feed = strchr(words, '\n'), *second = feed ? feed + 1 : "";
  snprintf(first, sizeof first, "%.*s", feed ? (int)(feed - words) : (int)strlen(words), words);
  double angle = mho_picture_free_direction(p, point), longer = (double)strlen(first);
  longer = fmax(longer, (double)strlen(second));
  double away = 28 + 3.3 * fabs(cos(angle)) * longer + (feed ? 6 * fabs(sin(angle)) : 0);
  double x = x_of(p, point) + away * cos(angle), y = y_of(p, point) + away * sin(angle) + 4;
  write_words(p, x, y - (feed ? 6 : 0), first);
  if (feed) write_words(p, x, y + 7, second);
}

/* On an arrow, or beside a bar, away from the angle of a bond that turns. */
static void draw_bond_text(picture *p, int bond)
{
  const char *words = p->marks->bond_text ? p->marks->bond_text[bond] : NULL;
  if (!words || !*words) return;
  const int *site = p->d->molecule->bond[bond].site;
  int a = p->d->site_point[site[0]], b = p->d->site_point[site[1]];
  double dx = x_of(p, b) - x_of(p, a), dy = y_of(p, b) - y_of(p, a);
  double length = sqrt(dx * dx + dy * dy), off = p->marks->bars && length > 1 ? 21 / length : 0;
  if (dy > 0.01 || (fabs(dy) <= 0.01 && dx < 0)) off = -off;
  write_words(p, (x_of(p, a) + x_of(p, b)) / 2 + off * dy,
              (y_of(p, a) + y_of(p, b)) / 2 - off * dx + 4, words);
}

/* --- ring currents -------------------------------------------------------- */

/* The value that flows from one point to the next, or 0. */
static double flow_between(const picture *p, int from, int to)
{
  const mho_drawing *d = p->d;
  for (int b = 0; b < d->bonds; b++) {
    int of = d->bond_of[b];
    if (of < 0) continue;
    const int *site = d->molecule->bond[of].site;
    if (d->site_point[site[0]] == from && d->site_point[site[1]] == to)
      return p->marks->bond_value[of];
    if (d->site_point[site[0]] == to && d->site_point[site[1]] == from)
      return -p->marks->bond_value[of];
  }
  return 0;
}

/* What goes round a ring: the least of its flows where all have one sense, +
 * in the order of its points. */
static double circulation(const picture *p, const int *point, int count)
{
  double least = INFINITY, most = -INFINITY;
  for (int i = 0; i < count; i++) {
    double flow = flow_between(p, point[i], point[(i + 1) % count]);
    least = fmin(least, flow);
    most = fmax(most, flow);
  }
  return least > 0 ? least : most < 0 ? most : 0;
}

void mho_drawing_percent(double percent, char *words, size_t size)
{
  double rounded = percent >= 9.95 ? round(percent) : percent;
  mho_number_write(words, size, percent >= 9.95 && percent < 1e5 ? 5 : 2, rounded);
}

static void draw_ring(picture *p, const int *point, int count)
{
  double value = circulation(p, point, count), area = 0, x = 0, y = 0;
  if (value == 0 || count > RING_POINTS_MAX) return;
  for (int i = 0; i < count; i++) {
    int next = point[(i + 1) % count];
    x += x_of(p, point[i]) / count;
    y += y_of(p, point[i]) / count;
    area += x_of(p, point[i]) * y_of(p, next) - x_of(p, next) * y_of(p, point[i]);
  }
  double r = 15, width = 1.5 + 5 * fabs(value), sense = (value > 0) == (area > 0) ? 1 : -1;
  double end = sense * 1.6 * PI - PI / 2; /* of the arc, begun at the top */
  char words[40];
  mho_number_write(words, sizeof words, 6, fabs(value) * p->marks->ring_scale / 100);
  mho_buffer_print(p->svg, "<g class=\"ring\"><title>ring current: %s of T</title>", words);
  mho_drawing_percent(fabs(value) * p->marks->ring_scale, words, sizeof words);
  put(p, "<path d=\"M", x);
  put(p, " ", y - r);
  put(p, "A", r);
  put(p, " ", r);
  mho_buffer_print(p->svg, " 0 1 %d", sense > 0);
  put(p, " ", x + r * cos(end));
  put(p, " ", y + r * sin(end));
  put(p, "\" fill=\"none\" stroke=\"" ACCENT "\" stroke-width=\"", width);
  mho_buffer_add(p->svg, "\"/>");
  double ux = -sense * sin(end), uy = sense * cos(end), wide = 3 + 0.8 * width;
  const double along[] = {-2, 9, -2}, across[] = {-wide, 0, wide};
  polygon(p, x + r * cos(end), y + r * sin(end), ux, uy, 3, along, across, "fill=\"" ACCENT "\"");
  text(p, x, y + 4, "font-size=\"10\" font-weight=\"bold\" fill=\"" ACCENT "\" text-anchor=\"middle\"",
       words);
  end_mark(p);
}

static void draw_rings(picture *p)
{
  const mho_drawing *d = p->d;
  mho_layout_graph graph = {d->points, d->bonds, (const int(*)[2])d->bond, d->bond_order};
  mho_neighbours neighbours;
  mho_ring_list rings = {0};
  bool complete;
  if (mho_neighbours_make(&graph, &neighbours) != MHO_OK) {
    p->svg->failed = true;
    return;
  }
  if (mho_rings_find(&neighbours, 1000000, &rings, &complete) != MHO_OK) p->svg->failed = true;
  for (int r = 0; !p->svg->failed && r < rings.count; r++)
    draw_ring(p, rings.point + rings.start[r], rings.start[r + 1] - rings.start[r]);
  mho_rings_clear(&rings);
  mho_neighbours_clear(&neighbours);
}

/* --- all of it ------------------------------------------------------------ */

void mho_marks_draw_below(picture *p)
{
  for (int s = 0; s < p->d->molecule->site_count; s++) draw_disc(p, s);
  for (int b = 0; b < p->d->molecule->bond_count; b++) draw_bond_value(p, b);
}

void mho_marks_draw_above(picture *p)
{
  if (p->marks->ring_scale > 0 && p->marks->bond_value) draw_rings(p);
  for (int s = 0; s < p->d->molecule->site_count; s++) draw_site_text(p, s);
  for (int b = 0; b < p->d->molecule->bond_count; b++) draw_bond_text(p, b);
}

/* A sample of the shape beside its words, to the left under the picture. */
void mho_marks_draw_key(picture *p, double top)
{
  static const double along[] = {-9, 9, 9, -9}, across[] = {-5, -5, 5, 5};
  for (int k = 0; k < p->marks->keys; k++) {
    const mho_drawing_key *key = &p->marks->key[k];
    double x = 24, y = top + LINE * k - 4;
    switch (key->shape) {
    case MHO_SHAPE_DISC: circle(p, x, y, 6, FILLED); break;
    case MHO_SHAPE_HATCHED: circle(p, x, y, 6, HATCHED); break;
    case MHO_SHAPE_BAR: polygon(p, x, y, 1, 0, 4, along, across, FILLED); break;
    case MHO_SHAPE_HATCHED_BAR: polygon(p, x, y, 1, 0, 4, along, across, HATCHED); break;
    case MHO_SHAPE_ARROW: arrow(p, x - 10, y, 1, 0, 20, 4); break;
    case MHO_SHAPE_NONE: break;
    }
    text(p, x + 18, y + 4, "font-size=\"11\" fill=\"#1c2028\"", key->words);
  }
}
