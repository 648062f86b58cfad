/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * What coordinates in space say about a pi system.
 */
#ifndef MHOLECULE_MODEL_GEOMETRY_H
#define MHOLECULE_MODEL_GEOMETRY_H

#include <mho/graph.h>

/* Angle between the p orbitals at the two ends of a bond, 0 to 90 degrees,
 * from the planes of their neighbours.  Along a linear chain (alkyne) the
 * angle between its ends belongs to the first bond of its two, the other is 0.
 * False where the coordinates do not tell. */
bool mho_geometry_twist(const mho_graph *graph, int bond, double *angle_deg);

/* beta(r)/beta of mho/structure.h for a bond. */
double mho_geometry_strength(const mho_graph *graph, int bond);

#endif
