/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The picture.  Contacts, linkers and twists lead, in dark ink and by their
 * shapes; the skeleton stands back in the neutral ink.  Contacts are bars
 * marked L and R, linkers ringed, rotatable bonds crossed by a bow with its
 * angle.  Bonds outside the pi system are dashed.
 */
#include <mho/quantity.h>

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "report/drawing.h"

#define NEUTRAL "#5a6270"
#define INK "#14213d"
#define ACCENT "#b23a1e"
#define FAINT "#eef0f3"

#define SCALE 46.0 /* pixels a bond */
#define MARGIN 62.0
#define LINE 17.0
#define PI 3.14159265358979323846

enum { NARROWEST = 300, TITLE_LIMIT = 70 };

typedef struct {
  const mho_drawing *d;
  const mho_drawing_marks *marks;
  mho_buffer *svg;
  double left, top; /* of the first point, in the picture */
  double low[2], high[2];
  double width, height;
} picture;

static double x_of(const picture *p, int point)
{
  return p->left + (p->d->position[point][0] - p->low[0]) * SCALE;
}

static double y_of(const picture *p, int point)
{
  return p->top + (p->high[1] - p->d->position[point][1]) * SCALE;
}

/* Pixels to a tenth, without the locale and without -0. */
static void put(picture *p, const char *before, double value)
{
  long tenths = lround(value * 10);
  mho_buffer_print(p->svg, "%s%s%ld", before, tenths < 0 ? "-" : "", labs(tenths) / 10);
  if (tenths % 10) mho_buffer_print(p->svg, ".%ld", labs(tenths) % 10);
}

static void line(picture *p, double x1, double y1, double x2, double y2, const char *style)
{
  put(p, "<path d=\"M", x1);
  put(p, " ", y1);
  put(p, "L", x2);
  put(p, " ", y2);
  mho_buffer_print(p->svg, "\" %s/>\n", style);
}

static void circle(picture *p, double x, double y, double r, const char *style)
{
  put(p, "<circle cx=\"", x);
  put(p, "\" cy=\"", y);
  put(p, "\" r=\"", r);
  mho_buffer_print(p->svg, "\" %s/>\n", style);
}

static void text(picture *p, double x, double y, const char *style, const char *words)
{
  put(p, "<text x=\"", x);
  put(p, "\" y=\"", y);
  mho_buffer_print(p->svg, "\" %s>", style);
  mho_buffer_escape(p->svg, words);
  mho_buffer_add(p->svg, "</text>\n");
}

static int count_characters(const char *words)
{
  int count = 0;
  for (; *words; words++) count += ((unsigned char)*words & 0xC0) != 0x80;
  return count < TITLE_LIMIT ? count : TITLE_LIMIT;
}

/* A title of many characters ends in dots. */
static void draw_title(picture *p)
{
  char words[4 * TITLE_LIMIT + 4];
  size_t used = 0;
  int count = 0;
  for (const char *c = p->marks->title; *c; c++) {
    count += ((unsigned char)*c & 0xC0) != 0x80;
    if (count > TITLE_LIMIT) {
      memcpy(words + used - 1, "…", 4);
      used += 2;
      break;
    }
    if (used < sizeof words - 4) words[used++] = *c;
  }
  words[used] = '\0';
  text(p, p->width / 2, 24,
       "font-size=\"14\" font-weight=\"bold\" fill=\"#1c2028\" text-anchor=\"middle\"", words);
}

static void measure(picture *p)
{
  const mho_drawing *d = p->d;
  for (int i = 0; i < d->points; i++)
    for (int k = 0; k < 2; k++) {
      if (i == 0 || d->position[i][k] < p->low[k]) p->low[k] = d->position[i][k];
      if (i == 0 || d->position[i][k] > p->high[k]) p->high[k] = d->position[i][k];
    }
  double wide = (p->high[0] - p->low[0]) * SCALE, high = (p->high[1] - p->low[1]) * SCALE;
  p->width = fmax(ceil(wide + 2 * MARGIN), NARROWEST);
  if (p->marks->title) p->width = fmax(p->width, 9.5 * count_characters(p->marks->title) + 20);
  p->left = (p->width - wide) / 2;
  p->top = (p->marks->title ? 30 : 8) + MARGIN * 0.75;
  p->height = ceil(p->top + high + MARGIN * 0.75 + 2 * LINE);
}

static bool is_carbon(const picture *p, int point)
{
  int atom = p->d->point_atom[point];
  return atom >= 0 && p->d->molecule->graph.atom[atom].element == 6;
}

/* A site without an atom, of carbon or of an explicit energy: a small disc. */
static bool is_bare(const picture *p, int point)
{
  if (p->d->point_atom[point] >= 0) return false;
  const mho_molecule *m = p->d->molecule;
  const char *row = mho_parameters_row_name(m->parameters, m->site[p->d->point_site[point]].row);
  return !row || !strcmp(row, "C");
}

/* Carbon atoms are corners, other elements words on a white disc: how far a
 * bond stays away. */
static double clearance(const picture *p, int point)
{
  if (is_bare(p, point)) return 5;
  return is_carbon(p, point) ? 0 : 13;
}

static double value_of(const double *value, int index)
{
  return value && index >= 0 ? fmax(-1, fmin(1, value[index])) : 0;
}

/* --- bonds ---------------------------------------------------------------- */

/* The side of a bond on which its second line lies: towards other neighbours. */
static double inner_side(const picture *p, int bond)
{
  const mho_drawing *d = p->d;
  int a = d->bond[bond][0], b = d->bond[bond][1];
  double ux = d->position[b][0] - d->position[a][0], uy = d->position[b][1] - d->position[a][1];
  int sum = 0;
  for (int k = 0; k < d->bonds; k++) {
    if (k == bond) continue;
    for (int end = 0; end < 2; end++) {
      int at = d->bond[k][end], other = d->bond[k][!end];
      if (at != a && at != b) continue;
      double vx = d->position[other][0] - d->position[at][0];
      double vy = d->position[other][1] - d->position[at][1];
      double side = ux * vy - uy * vx;
      sum += side > 0.1 ? 1 : side < -0.1 ? -1 : 0;
    }
  }
  return sum < 0 ? -1 : sum > 0 ? 1 : 0;
}

static void draw_bond(picture *p, int bond)
{
  const mho_drawing *d = p->d;
  int a = d->bond[bond][0], b = d->bond[bond][1];
  double x1 = x_of(p, a), y1 = y_of(p, a), x2 = x_of(p, b), y2 = y_of(p, b);
  double dx = x2 - x1, dy = y2 - y1, length = sqrt(dx * dx + dy * dy);
  if (length < 1) return;
  dx /= length;
  dy /= length;
  double from = fmin(clearance(p, a), length / 3), to = fmin(clearance(p, b), length / 3);
  x1 += dx * from;
  y1 += dy * from;
  x2 -= dx * to;
  y2 -= dy * to;
  const char *style = d->bond_of[bond] < 0
                          ? "stroke=\"" NEUTRAL "\" stroke-width=\"1.3\" stroke-dasharray=\"3 3\""
                          : "stroke=\"" NEUTRAL "\" stroke-width=\"2\"";
  double side = inner_side(p, bond);
  int order = d->bond_order[bond];
  if (order != 2 || side != 0) line(p, x1, y1, x2, y2, style);
  for (int k = 0; order == 2 && side == 0 && k < 2; k++) {
    double off = k ? 2.5 : -2.5;
    line(p, x1 - dy * off, y1 + dx * off, x2 - dy * off, y2 + dx * off, style);
  }
  for (int k = 1; k < order && side != 0 && order == 2; k++) {
    /* y goes down in the picture, so left of the bond is -side. */
    double off = -side * 5, in = length > 30 ? 5 : 0;
    double cut1 = from > 0 ? 0 : in, cut2 = to > 0 ? 0 : in;
    line(p, x1 - dy * off + dx * cut1, y1 + dx * off + dy * cut1, x2 - dy * off - dx * cut2,
         y2 + dx * off - dy * cut2, style);
  }
  for (int k = 0; order > 2 && k < 2; k++) {
    double off = k ? 4.5 : -4.5;
    line(p, x1 - dy * off, y1 + dx * off, x2 - dy * off, y2 + dx * off, style);
  }
}

/* A bond's value: an arrow beneath the skeleton. */
static void draw_arrow(picture *p, int bond)
{
  const mho_drawing *d = p->d;
  double value = value_of(p->marks->bond_value, d->bond_of[bond]);
  if (value == 0) return;
  const mho_bond *of = &d->molecule->bond[d->bond_of[bond]];
  int a = d->site_point[of->site[value < 0]], b = d->site_point[of->site[value > 0]];
  double x1 = x_of(p, a), y1 = y_of(p, a), dx = x_of(p, b) - x1, dy = y_of(p, b) - y1;
  double width = 1.5 + 9.5 * fabs(value), head = 0.28;
  double length = sqrt(dx * dx + dy * dy);
  if (length < 1) return;
  double nx = -dy / length, ny = dx / length;
  const double along[] = {0.12, 1 - head, 1 - head, 0.95, 1 - head, 1 - head, 0.12};
  const double across[] = {-0.5, -0.5, -1.1, 0, 1.1, 0.5, 0.5};
  for (int i = 0; i < 7; i++) {
    put(p, i ? "L" : "<path d=\"M", x1 + along[i] * dx + across[i] * width * nx);
    put(p, " ", y1 + along[i] * dy + across[i] * width * ny);
  }
  mho_buffer_add(p->svg, "Z\" fill=\"" INK "\" fill-opacity=\"0.35\" stroke=\"" INK
                         "\" stroke-width=\"0.8\"/>\n");
}

static bool touches(const picture *p, int side, int point)
{
  const mho_contact *c = &p->d->molecule->contact[side];
  for (int i = 0; i < c->count; i++)
    if (p->d->site_point[c->site[i]] == point) return true;
  return false;
}

/* Is something drawn within reach on that side of a point? */
static bool is_blocked(const picture *p, int point, double way)
{
  const mho_drawing *d = p->d;
  for (int i = 0; i < d->points; i++) {
    double dx = (d->position[i][0] - d->position[point][0]) * way;
    double dy = d->position[i][1] - d->position[point][1];
    if (i != point && dx > 0.05 && dx < 1.6 && fabs(dy) < 0.7) return true;
  }
  return false;
}

/* Middle of the largest gap between the bonds and leads at a point, as an angle
 * in the picture. */
static double free_direction(const picture *p, int point)
{
  const mho_drawing *d = p->d;
  double best = -PI / 2, most = -1;
  for (int step = 0; step < 24; step++) {
    double angle = -PI / 2 + step * PI / 12, nearest = PI;
    for (int k = 0; k < d->bonds; k++)
      for (int end = 0; end < 2; end++) {
        if (d->bond[k][end] != point) continue;
        int other = d->bond[k][!end];
        double to = atan2(y_of(p, other) - y_of(p, point), x_of(p, other) - x_of(p, point));
        nearest = fmin(nearest, fabs(remainder(to - angle, 2 * PI)));
      }
    if (touches(p, MHO_LEFT, point) && !is_blocked(p, point, -1)) nearest = fmin(nearest, fabs(remainder(PI - angle, 2 * PI)));
    if (touches(p, MHO_RIGHT, point) && !is_blocked(p, point, 1)) nearest = fmin(nearest, fabs(remainder(angle, 2 * PI)));
    if (nearest > most + 1e-6) {
      most = nearest;
      best = angle;
    }
  }
  return best;
}

/* A bow across a rotatable bond, and its angle. */
static void draw_twist(picture *p, int bond)
{
  const mho_drawing *d = p->d;
  if (d->bond_of[bond] < 0) return;
  const mho_bond *of = &d->molecule->bond[d->bond_of[bond]];
  if (!of->rotatable) return;
  int a = d->bond[bond][0], b = d->bond[bond][1];
  double x = (x_of(p, a) + x_of(p, b)) / 2, y = (y_of(p, a) + y_of(p, b)) / 2;
  double dx = x_of(p, b) - x_of(p, a), dy = y_of(p, b) - y_of(p, a);
  double length = sqrt(dx * dx + dy * dy);
  if (length < 1) return;
  dx /= length;
  dy /= length;
  if (dy > 0.01 || (fabs(dy) <= 0.01 && dx < 0)) { /* the words stand on one side */
    dx = -dx;
    dy = -dy;
  }
  double nx = -dy, ny = dx, reach = 10;
  put(p, "<path d=\"M", x + nx * reach - dx * 3);
  put(p, " ", y + ny * reach - dy * 3);
  put(p, "Q", x + dx * 8);
  put(p, " ", y + dy * 8);
  put(p, " ", x - nx * reach - dx * 3);
  put(p, " ", y - ny * reach - dy * 3);
  mho_buffer_add(p->svg, "\" fill=\"none\" stroke=\"" ACCENT "\" stroke-width=\"2.4\" "
                         "stroke-linecap=\"round\"/>\n");
  char angle[40];
  int size = mho_number_write(angle, sizeof angle, 3, of->twist_deg);
  snprintf(angle + size, sizeof angle - (size_t)size, "°");
  text(p, x + nx * 22, y + ny * 22 + 4,
       "font-size=\"12\" font-weight=\"bold\" fill=\"" ACCENT "\" text-anchor=\"middle\"", angle);
}

/* --- atoms ---------------------------------------------------------------- */

static const char *name_of(const picture *p, int point, char *buffer, size_t size)
{
  const mho_drawing *d = p->d;
  int atom = d->point_atom[point], site = d->point_site[point];
  if (atom >= 0) mho_graph_atom_name(&d->molecule->graph, atom, buffer, size);
  else snprintf(buffer, size, "%s", d->molecule->site[site].id);
  return buffer;
}

/* The charge as chemists write it, `+` or `2−`, up to the right of the name. */
static void draw_charge(picture *p, int point, double away)
{
  int atom = p->d->point_atom[point];
  int charge = atom >= 0 ? p->d->molecule->graph.atom[atom].charge : 0;
  char words[32];
  const char *sign = charge > 0 ? "+" : "−";
  if (!charge) return;
  if (abs(charge) == 1) snprintf(words, sizeof words, "%s", sign);
  else snprintf(words, sizeof words, "%d%s", abs(charge), sign);
  text(p, x_of(p, point) + away, y_of(p, point) - away + 3,
       "font-size=\"15\" font-weight=\"bold\" fill=\"" INK "\" text-anchor=\"middle\"", words);
}

/* Two dots for a pair that the site brings, a small circle for an empty one. */
static void draw_electrons(picture *p, int point, double angle, double away)
{
  int site = p->d->point_site[point];
  if (site < 0) return;
  const mho_site *s = &p->d->molecule->site[site];
  double x = x_of(p, point) + cos(angle) * away, y = y_of(p, point) + sin(angle) * away;
  if (s->electrons == 2)
    for (int k = -1; k <= 1; k += 2)
      circle(p, x - sin(angle) * 3.2 * k, y + cos(angle) * 3.2 * k, 1.9, "fill=\"" INK "\"");
  else if (s->electrons == 0 && s->row >= 0)
    circle(p, x, y, 3, "fill=\"none\" stroke=\"" INK "\" stroke-width=\"1.2\"");
}

static bool is_linker(const picture *p, int point)
{
  const mho_molecule *m = p->d->molecule;
  for (int i = 0; i < m->linker_count; i++)
    if (p->d->site_point[m->linker[i].site] == point) return true;
  return false;
}

static void draw_value(picture *p, int point)
{
  double value = value_of(p->marks->site_value, p->d->point_site[point]);
  if (value == 0) return;
  circle(p, x_of(p, point), y_of(p, point), 19 * sqrt(fabs(value)),
         value > 0 ? "fill=\"" INK "\" fill-opacity=\"0.35\" stroke=\"" INK "\""
                   : "fill=\"url(#hatch)\" stroke=\"" INK "\" stroke-dasharray=\"3 2\"");
}

static void draw_atom(picture *p, int point)
{
  char name[MHO_ID_SIZE + 16];
  double x = x_of(p, point), y = y_of(p, point), angle = free_direction(p, point);
  bool corner = is_carbon(p, point), bare = is_bare(p, point);
  name_of(p, point, name, sizeof name);
  if (is_linker(p, point))
    circle(p, x, y, corner ? 7 : 15, "fill=\"#ffffff\" stroke=\"" INK "\" stroke-width=\"2.4\"");
  else if (!corner && !bare)
    circle(p, x, y, 12, "fill=\"#ffffff\"");
  if (bare) circle(p, x, y, 4, "fill=\"" NEUTRAL "\"");
  if (!corner && !bare) {
    text(p, x, y + 4, "font-size=\"12\" font-weight=\"bold\" fill=\"" INK "\" text-anchor=\"middle\"",
         name);
    draw_electrons(p, point, angle, is_linker(p, point) ? 20 : 17);
    draw_charge(p, point, 15);
    return;
  }
  double away = 12 + 1.5 * fabs(cos(angle)) * (double)strlen(name);
  text(p, x + away * cos(angle), y + away * sin(angle) + 3.5,
       "font-size=\"10\" fill=\"" NEUTRAL "\" text-anchor=\"middle\"", name);
  draw_electrons(p, point, angle + PI / 5, 11);
  draw_charge(p, point, 8);
}

static void draw_site_text(picture *p, int site)
{
  const char *words = p->marks->site_text ? p->marks->site_text[site] : NULL;
  int point = p->d->site_point[site];
  if (!words || !*words || p->d->point_site[point] != site) return;
  double angle = free_direction(p, point);
  text(p, x_of(p, point) + 27 * cos(angle), y_of(p, point) + 27 * sin(angle) + 4,
       "font-size=\"11\" fill=\"" INK "\" text-anchor=\"middle\"", words);
}

static void draw_bond_text(picture *p, int bond)
{
  int of = p->d->bond_of[bond];
  const char *words = p->marks->bond_text && of >= 0 ? p->marks->bond_text[of] : NULL;
  if (!words || !*words) return;
  int a = p->d->bond[bond][0], b = p->d->bond[bond][1];
  text(p, (x_of(p, a) + x_of(p, b)) / 2, (y_of(p, a) + y_of(p, b)) / 2 + 4,
       "font-size=\"11\" fill=\"" INK "\" text-anchor=\"middle\" stroke=\"#ffffff\" "
       "stroke-width=\"3\" paint-order=\"stroke\"",
       words);
}

/* --- contacts ------------------------------------------------------------- */

/* A bar beyond the contact's atoms and a lead to each of them: to the left and
 * the right, or where a single atom is not free there, where it is. */
static void draw_contact(picture *p, int side)
{
  const mho_drawing *d = p->d;
  const mho_contact *c = &d->molecule->contact[side];
  if (!c->count) return;
  double way = side == MHO_LEFT ? -1 : 1, angle = side == MHO_LEFT ? PI : 0;
  bool single = c->count == 1 && is_blocked(p, d->site_point[c->site[0]], way);
  if (single) angle = free_direction(p, d->site_point[c->site[0]]);
  double ux = cos(angle), uy = sin(angle), far = -1e9, low = 1e9, high = -1e9;
  for (int i = 0; i < c->count; i++) {
    int point = d->site_point[c->site[i]];
    far = fmax(far, x_of(p, point) * ux + y_of(p, point) * uy);
    low = fmin(low, -x_of(p, point) * uy + y_of(p, point) * ux);
    high = fmax(high, -x_of(p, point) * uy + y_of(p, point) * ux);
  }
  far += 36;
  for (int i = 0; i < c->count; i++) {
    int point = d->site_point[c->site[i]];
    double x = x_of(p, point), y = y_of(p, point), rest = far - (x * ux + y * uy);
    double from = is_linker(p, point) ? 17 : is_carbon(p, point) || is_bare(p, point) ? 8 : 15;
    line(p, x + ux * from, y + uy * from, x + ux * rest, y + uy * rest,
         "stroke=\"" INK "\" stroke-width=\"2.4\" stroke-dasharray=\"1 4\" stroke-linecap=\"round\"");
  }
  line(p, far * ux - (low - 16) * uy, far * uy + (low - 16) * ux, far * ux - (high + 16) * uy,
       far * uy + (high + 16) * ux, "stroke=\"" INK "\" stroke-width=\"9\"");
  double middle = (low + high) / 2;
  text(p, (far + 14) * ux - middle * uy, (far + 14) * uy + middle * ux + 5,
       "font-size=\"15\" font-weight=\"bold\" fill=\"" INK "\" text-anchor=\"middle\"",
       side == MHO_LEFT ? "L" : "R");
}

static void write_caption(picture *p)
{
  const mho_molecule *m = p->d->molecule;
  char words[160];
  int charge = m->charge;
  int size = snprintf(words, sizeof words, "%d π electrons on %d sites", m->electrons, m->site_count);
  if (charge) snprintf(words + size, sizeof words - (size_t)size, ", charge %+d", charge);
  text(p, p->width / 2, p->height - LINE - 4,
       "font-size=\"12\" fill=\"" NEUTRAL "\" text-anchor=\"middle\"", words);
}

static void draw(picture *p)
{
  const mho_drawing *d = p->d;
  if (p->marks->title) draw_title(p);
  for (int i = 0; i < d->points; i++) draw_value(p, i);
  for (int b = 0; b < d->bonds; b++) draw_arrow(p, b);
  for (int b = 0; b < d->bonds; b++) draw_bond(p, b);
  for (int side = 0; side < 2; side++) draw_contact(p, side);
  for (int i = 0; i < d->points; i++) draw_atom(p, i);
  for (int b = 0; b < d->bonds; b++) draw_twist(p, b);
  for (int s = 0; s < d->molecule->site_count; s++) draw_site_text(p, s);
  for (int b = 0; b < d->bonds; b++) draw_bond_text(p, b);
  write_caption(p);
}

static const char hatch[] =
    "<defs><pattern id=\"hatch\" width=\"5\" height=\"5\" patternUnits=\"userSpaceOnUse\" "
    "patternTransform=\"rotate(45)\"><path d=\"M0 0V5\" stroke=\"" INK
    "\" stroke-width=\"1.4\"/></pattern></defs>\n";

static void begin(picture *p, double width, double height)
{
  put(p, "<svg xmlns=\"http://www.w3.org/2000/svg\" width=\"", width);
  put(p, "\" height=\"", height);
  put(p, "\" viewBox=\"0 0 ", width);
  put(p, " ", height);
  mho_buffer_print(p->svg, "\" font-family=\"'DejaVu Sans',Verdana,sans-serif\">\n%s", hatch);
}

void mho_drawing_write(const mho_drawing *drawing, const mho_drawing_marks *marks,
                       mho_buffer *svg)
{
  static const mho_drawing_marks none = {0};
  picture p = {.d = drawing, .marks = marks ? marks : &none, .svg = svg};
  measure(&p);
  begin(&p, p.width, p.height);
  draw(&p);
  mho_buffer_add(svg, "</svg>\n");
}

mho_status mho_drawing_write_file(const mho_molecule *const *molecule, size_t count,
                                  mho_buffer *svg, mho_error *error)
{
  mho_buffer body = {0};
  double width = NARROWEST, height = 0;
  mho_status status = MHO_OK;
  for (size_t i = 0; i < count && status == MHO_OK; i++) {
    mho_drawing drawing;
    mho_drawing_marks marks = {.title = molecule[i]->name};
    status = mho_drawing_make(molecule[i], &drawing, error);
    if (status == MHO_OK) {
      picture p = {.d = &drawing, .marks = &marks, .svg = &body};
      measure(&p);
      put(&p, "<g transform=\"translate(0 ", height);
      mho_buffer_add(&body, ")\">\n");
      draw(&p);
      mho_buffer_add(&body, "</g>\n");
      width = fmax(width, p.width);
      height += p.height;
    }
    mho_drawing_clear(&drawing);
  }
  if (status == MHO_OK) {
    picture whole = {.svg = svg};
    begin(&whole, width, height);
    mho_buffer_add(svg, "<rect width=\"100%\" height=\"100%\" fill=\"#ffffff\"/>\n");
    mho_buffer_add_bytes(svg, body.data, body.size);
    mho_buffer_add(svg, "</svg>\n");
    status = mho_buffer_check(svg, "report", error);
  }
  if (status == MHO_OK) status = mho_buffer_check(&body, "report", error);
  mho_buffer_clear(&body);
  return status;
}
