/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef MHOLECULE_MOLECULE_TEXTS_H
#define MHOLECULE_MOLECULE_TEXTS_H

#include <mho/graph.h>

/* Appends a text.  Errors: MHO_ERR_MEMORY. */
MHO_MUST_USE mho_status mho_texts_add(mho_texts *texts, const char *format, ...)
    MHO_PRINTF(2, 3);

void mho_texts_clear(mho_texts *texts);

#endif
