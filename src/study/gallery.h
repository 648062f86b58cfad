/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The figures of a results folder: files in it, and pictures of the report.
 */
#ifndef MHOLECULE_STUDY_GALLERY_H
#define MHOLECULE_STUDY_GALLERY_H

#include "report/html.h"
#include "study/folder.h"

typedef struct {
  const mho_folder *folder;
  mho_figure *figure;
  size_t figures;
  bool without_gnuplot; /* found missing: scripts are passed over from then on */
} mho_gallery;

void mho_gallery_clear(mho_gallery *gallery);

/* Draws a script with gnuplot.  Takes file and caption, NULL is a lack of memory.
 * Errors: MHO_ERR_MEMORY, MHO_ERR_WRITE, those of mho_figure_render. */
MHO_MUST_USE mho_status mho_gallery_draw(mho_gallery *gallery, const char *section, char *file,
                                         char *caption, const mho_buffer *script,
                                         mho_error *error);

/* Adds a finished picture; takes it too.  Errors: MHO_ERR_MEMORY, MHO_ERR_WRITE. */
MHO_MUST_USE mho_status mho_gallery_hang(mho_gallery *gallery, const char *section, char *file,
                                         char *caption, mho_buffer *svg, mho_error *error);

#endif
