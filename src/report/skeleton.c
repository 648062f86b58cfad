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

#include "report/picture.h"

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

static double key_height(const picture *p) { return p->marks->keys ? (p->marks->keys + 0.7) * LINE : 0; }

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
  if (p->marks->title) p->width = fmax(p->width, 10.5 * count_characters(p->marks->title) + 20);
  for (int k = 0; k < p->marks->keys; k++)
    p->width = fmax(p->width, ceil(6.7 * count_characters(p->marks->key[k].words)) + 56);
  p->left = (p->width - wide) / 2;
  double words = p->marks->site_text ? 13 : 0; /* above and below the molecule */
  p->top = (p->marks->title ? 30 : 8) + MARGIN * 0.75 + words;
  p->height = ceil(p->top + high + MARGIN * 0.75 + 2 * LINE + key_height(p) + words);
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
double mho_picture_free_direction(const picture *p, int point)
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

static void draw_atom(picture *p, int point)
{
  char name[MHO_ID_SIZE + 16];
  double x = x_of(p, point), y = y_of(p, point), angle = mho_picture_free_direction(p, point);
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
  bool marked = p->marks->site_value || p->marks->bond_value;
  text(p, x + away * cos(angle), y + away * sin(angle) + 3.5,
       marked ? "font-size=\"10\" fill=\"#1c2028\" text-anchor=\"middle\" " HALO
              : "font-size=\"10\" fill=\"" NEUTRAL "\" text-anchor=\"middle\"", name);
  draw_electrons(p, point, angle + PI / 5, 11);
  draw_charge(p, point, 8);
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
  if (single) angle = mho_picture_free_direction(p, d->site_point[c->site[0]]);
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
  text(p, p->width / 2, p->height - key_height(p) - LINE - 4,
       "font-size=\"12\" fill=\"" NEUTRAL "\" text-anchor=\"middle\"", words);
}

static void draw(picture *p)
{
  const mho_drawing *d = p->d;
  if (p->marks->title) draw_title(p);
  mho_marks_draw_below(p);
  for (int b = 0; b < d->bonds; b++) draw_bond(p, b);
  for (int side = 0; side < 2; side++) draw_contact(p, side);
  for (int i = 0; i < d->points; i++) draw_atom(p, i);
  for (int b = 0; b < d->bonds; b++) draw_twist(p, b);
  mho_marks_draw_above(p);
  write_caption(p);
  mho_marks_draw_key(p, p->height - p->marks->keys * LINE - 8);
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
  mho_buffer_print(p->svg, "\" font-family=\"'DejaVu Sans',Verdana,sans-serif\">\n%s",
                   p->marks && (p->marks->site_value || p->marks->bars) ? hatch : "");
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
