/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * libmho: tight-binding transport through molecular junctions.
 */
#ifndef MHOLECULE_MHO_H
#define MHOLECULE_MHO_H

#include <mho/constants.h>
#include <mho/histogram.h>
#include <mho/molecule.h>
#include <mho/parameters.h>
#include <mho/peaks.h>
#include <mho/quantity.h>
#include <mho/status.h>
#include <mho/telegraph.h>
#include <mho/traces.h>
#include <mho/version.h>

#endif
