/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef MHOLECULE_INPUT_MOLECULE_NODE_H
#define MHOLECULE_INPUT_MOLECULE_NODE_H

#include <mho/molecule.h>
#include <mho/settings.h>

#include "input/yaml.h"

/* The molecule that a mapping describes, a whole file or a part of a study;
 * see mho_molecule_read.  The molecule is initialised. */
MHO_MUST_USE mho_status mho_molecule_read_node(const mho_yaml *document,
                                               const mho_yaml_node *node,
                                               const mho_settings *defaults,
                                               const mho_settings *overrides,
                                               mho_molecule *molecule);

/* The key `torsion`: `frozen`, `by-kind`, a potential (see mho_torsion_read; also
 * [6 kJ/mol, 6.5 kJ/mol] or {v2: 1 kJ/mol}), {potential: ..., frozen: true}, or
 * a list of {bond: C5-C8, potential: ...}.  NULL: nothing. */
void mho_yaml_get_torsions(const mho_yaml *document, const mho_yaml_node *node,
                           mho_molecule *molecule);

#endif
