/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * libmho: tight-binding transport through molecular junctions.
 */
#ifndef MHOLECULE_MHO_H
#define MHOLECULE_MHO_H

#include <mho/compare.h>
#include <mho/conductance.h>
#include <mho/constants.h>
#include <mho/gradient.h>
#include <mho/graph.h>
#include <mho/histogram.h>
#include <mho/inside.h>
#include <mho/interference.h>
#include <mho/junction.h>
#include <mho/linker.h>
#include <mho/modify.h>
#include <mho/molecule.h>
#include <mho/molecule_file.h>
#include <mho/nodes.h>
#include <mho/parameters.h>
#include <mho/peaks.h>
#include <mho/quantity.h>
#include <mho/screen.h>
#include <mho/sensitivity.h>
#include <mho/settings.h>
#include <mho/status.h>
#include <mho/structure.h>
#include <mho/study.h>
#include <mho/telegraph.h>
#include <mho/torsion.h>
#include <mho/traces.h>
#include <mho/transmission.h>
#include <mho/twist.h>
#include <mho/version.h>
#include <mho/warning.h>

#endif
