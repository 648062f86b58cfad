/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The picture of a molecule: its skeleton with contacts, linkers and
 * rotatable bonds, and what a stage wants to show on sites and bonds.
 */
#ifndef MHOLECULE_REPORT_DRAWING_H
#define MHOLECULE_REPORT_DRAWING_H

#include <mho/inside.h>
#include <mho/interference.h>
#include <mho/modify.h>
#include <mho/molecule.h>
#include <mho/sensitivity.h>

#include "base/buffer.h"

/* Points are the atoms of the structure, hydrogens at an end left out, or the
 * sites where there is no structure.  Bond lengths are about 1, y goes up, and
 * the left contact lies to the left. */
typedef struct {
  const mho_molecule *molecule; /* outlives the drawing */
  int points, bonds;
  double (*position)[2]; /* [points] */
  int (*bond)[2];        /* [bonds] points */
  int *point_atom;       /* [points] atom, or -1 for a site without one */
  int *bond_order;       /* [bonds] 1 to 4 */
  int *bond_of;          /* [bonds] bond of the molecule, or -1 */
  int *site_point;       /* [site_count] */
  int *point_site;       /* [points] first site of the point, or -1 */
} mho_drawing;

typedef enum {
  MHO_SHAPE_NONE, MHO_SHAPE_DISC, MHO_SHAPE_HATCHED, MHO_SHAPE_BAR, MHO_SHAPE_HATCHED_BAR,
  MHO_SHAPE_ARROW
} mho_shape;

/* A line of the key under a picture. */
typedef struct {
  mho_shape shape;
  const char *words;
} mho_drawing_key;

/* What to show besides; every array may be NULL.  Values run from -1 to 1:
 * a site gets a disc of that area, filled where positive and hatched where
 * negative; a bond gets an arrow of that width, from its first to its second
 * site where positive, or with `bars` a bar, filled or hatched.  Texts (of a
 * site with a line feed: two lines) stand beside site and bond, notes are shown on hovering; "" or NULL for none. */
typedef struct {
  const char *title;          /* above the picture; NULL for none */
  const double *site_value;   /* [site_count] */
  const double *bond_value;   /* [bond_count] of the molecule */
  const char *const *site_text, *const *bond_text;
  const char *const *site_note, *const *bond_note;
  bool bars;
  double ring_scale; /* > 0: ring currents too, value * ring_scale percent */
  const mho_drawing_key *key;
  int keys;
} mho_drawing_marks;

/* Percents as the marks write them. */
void mho_drawing_percent(double percent, char *words, size_t size);

/* Lays a molecule out.  The caller clears the drawing, also after a failure.
 * Errors: MHO_ERR_MEMORY. */
MHO_MUST_USE mho_status mho_drawing_make(const mho_molecule *molecule,
                                         mho_drawing *drawing,
                                         mho_error *error);
void mho_drawing_clear(mho_drawing *drawing);

/* Appends one <svg> element; marks may be NULL. */
void mho_drawing_write(const mho_drawing *drawing,
                       const mho_drawing_marks *marks, mho_buffer *svg);

/* The molecule with T between the site `from` and each other one as a disc, by
 * decades, filled where the Green's function is positive, hatched where it is
 * negative. */
MHO_MUST_USE mho_status mho_drawing_write_pairs(const mho_molecule *molecule,
                                                const mho_interference *map, int from,
                                                mho_buffer *svg, mho_error *error);

/* Currents through bonds as arrows, and what goes round rings, as parts of T. */
MHO_MUST_USE mho_status mho_drawing_write_currents(const mho_molecule *molecule,
                                                   const mho_inside *inside,
                                                   mho_buffer *svg, mho_error *error);

/* The angles within which bond[bonds] keep 80 % and half of the planar
 * conductance. */
MHO_MUST_USE mho_status mho_drawing_write_twist(const mho_molecule *molecule, const int *bond,
                                                int bonds, const double limit_deg[2],
                                                mho_buffer *svg, mho_error *error);

/* What should I change?  Where a donor and where an acceptor raises the
 * conductance, and what a weaker bond does where one can turn. */
MHO_MUST_USE mho_status mho_drawing_write_sensitivity(const mho_molecule *molecule,
                                                      const mho_sensitivity *sensitivity,
                                                      mho_buffer *svg, mho_error *error);

/* The change with the largest effect on each site. */
MHO_MUST_USE mho_status mho_drawing_write_modifications(
    const mho_molecule *molecule, const mho_modifications *modifications, mho_buffer *svg,
    mho_error *error);

/* Several drawings below each other, a whole SVG file. */
MHO_MUST_USE mho_status mho_drawing_write_file(const mho_molecule *const *molecule,
                                               size_t count, mho_buffer *svg,
                                               mho_error *error);

#endif
