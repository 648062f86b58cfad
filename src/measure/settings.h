/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The quantities among the options of traces by name, for the command line and
 * for study files.
 */
#ifndef MHOLECULE_MEASURE_SETTINGS_H
#define MHOLECULE_MEASURE_SETTINGS_H

#include <mho/traces.h>

/* bias, series-resistance, sampling, speed; floor and saturation, which are a
 * conductance or a current. */
const char *const *mho_trace_setting_names(size_t *count);

/* Reads one of them.  On failure `reason` says what is wrong and what is
 * allowed.  Errors: MHO_ERR_KEY (no such name), MHO_ERR_UNIT, MHO_ERR_SYNTAX,
 * MHO_ERR_RANGE. */
MHO_MUST_USE mho_status mho_trace_setting_read(mho_trace_options *options, const char *name,
                                               const char *text, char *reason,
                                               size_t reason_size);

#endif
