/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Pieces of a gnuplot script that every figure shares; the style is told in
 * figure.h.
 */
#ifndef MHOLECULE_REPORT_PLOT_H
#define MHOLECULE_REPORT_PLOT_H

#include "report/figure.h"

/* Dark to light, so that they differ in grey. */
static const char *const ink[MHO_CURVES_MAX] = {"#14213d", "#b23a1e", "#2a8f85", "#d99a2b"};
static const char *const dash[MHO_CURVES_MAX] = {"solid", "'_'", "'.-'", "'.'"};

#define NEUTRAL "#5a6270"
#define SHADE "#eef0f3"

/* A name in gnuplot's single quotes, where nothing is expanded.  An apostrophe
 * in the name of a molecule is a prime, and is drawn as one. */
static inline void add_quoted(mho_buffer *script, const char *text)
{
  mho_buffer_add(script, "'");
  for (; *text; text++) {
    if (*text == '\'') mho_buffer_add(script, "\xE2\x80\xB2");
    else if ((unsigned char)*text < ' ') mho_buffer_add(script, " ");
    else mho_buffer_add_bytes(script, text, 1);
  }
  mho_buffer_add(script, "'");
}

static inline void add_number(mho_buffer *script, double value)
{
  mho_buffer_add(script, " ");
  mho_buffer_number(script, 8, value);
}

static inline void begin_figure(mho_buffer *script, int width, int height)
{
  mho_buffer_print(script,
                   "set encoding utf8\n"
                   "set terminal svg size %d,%d fixed enhanced font 'DejaVu Sans,13' "
                   "background '#ffffff' linewidth 1\n",
                   width, height);
  mho_buffer_add(script,
                 "set border 3 linecolor '" NEUTRAL "'\n"
                 "set tics nomirror out textcolor '#222222'\n"
                 "set key noenhanced outside below horizontal left samplen 3\n");
}

#endif
