/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * What the parts of a drawing share: skeleton.c has the molecule, marks.c what
 * a stage shows on it.
 */
#ifndef MHOLECULE_REPORT_PICTURE_H
#define MHOLECULE_REPORT_PICTURE_H

#include <math.h>
#include <stdlib.h>

#include "report/drawing.h"

#define NEUTRAL "#5a6270"
#define INK "#14213d"
#define ACCENT "#b23a1e"
#define FAINT "#eef0f3"

/* Of a text, so that it reads on anything. */
#define HALO "stroke=\"#ffffff\" stroke-width=\"3\" stroke-opacity=\"0.85\" paint-order=\"stroke\""

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

static inline double x_of(const picture *p, int point)
{
  return p->left + (p->d->position[point][0] - p->low[0]) * SCALE;
}

static inline double y_of(const picture *p, int point)
{
  return p->top + (p->high[1] - p->d->position[point][1]) * SCALE;
}

/* Pixels to a tenth, without the locale and without -0. */
static inline void put(picture *p, const char *before, double value)
{
  long tenths = lround(value * 10);
  mho_buffer_print(p->svg, "%s%s%ld", before, tenths < 0 ? "-" : "", labs(tenths) / 10);
  if (tenths % 10) mho_buffer_print(p->svg, ".%ld", labs(tenths) % 10);
}

static inline void line(picture *p, double x1, double y1, double x2, double y2, const char *style)
{
  put(p, "<path d=\"M", x1);
  put(p, " ", y1);
  put(p, "L", x2);
  put(p, " ", y2);
  mho_buffer_print(p->svg, "\" %s/>\n", style);
}

static inline void circle(picture *p, double x, double y, double r, const char *style)
{
  put(p, "<circle cx=\"", x);
  put(p, "\" cy=\"", y);
  put(p, "\" r=\"", r);
  mho_buffer_print(p->svg, "\" %s/>\n", style);
}

static inline void text(picture *p, double x, double y, const char *style, const char *words)
{
  put(p, "<text x=\"", x);
  put(p, "\" y=\"", y);
  mho_buffer_print(p->svg, "\" %s>", style);
  mho_buffer_escape(p->svg, words);
  mho_buffer_add(p->svg, "</text>\n");
}

static inline double value_of(const double *value, int index)
{
  return value && index >= 0 ? fmax(-1, fmin(1, value[index])) : 0;
}

/* Direction of the middle of the largest gap between the bonds and leads at a
 * point, as an angle in the picture. */
double mho_picture_free_direction(const picture *p, int point);

/* Discs, arrows and bars beneath the skeleton; rings and texts above it; the
 * key from `top` on. */
void mho_marks_draw_below(picture *p);
void mho_marks_draw_above(picture *p);
void mho_marks_draw_key(picture *p, double top);

#endif
