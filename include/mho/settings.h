/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Settings that a command line, a study and a molecule file share, with one
 * table of their names, units and ranges.
 */
#ifndef MHOLECULE_SETTINGS_H
#define MHOLECULE_SETTINGS_H

#include <mho/molecule.h>
#include <mho/status.h>

typedef struct {
  bool has_beta, has_temperature, has_coupling, has_fermi;
  double beta_ev, temperature_k, coupling_ev;
  mho_fermi fermi;
  const mho_parameter_set *parameters; /* NULL: not set */
} mho_settings;

MHO_BEGIN_DECLARATIONS

/* Names: beta, temperature, coupling, fermi, parameters. */
MHO_API const char *const *mho_settings_names(size_t *count);

/* Reads one setting from text.  On failure `reason` says what is allowed.
 * Errors: MHO_ERR_KEY (no such name), MHO_ERR_UNIT, MHO_ERR_SYNTAX,
 * MHO_ERR_RANGE, MHO_ERR_REFERENCE. */
MHO_API MHO_MUST_USE mho_status mho_settings_read(mho_settings *settings,
                                                  const char *name,
                                                  const char *text, char *reason,
                                                  size_t reason_size);

/* `0.2 eV`, `midgap`, `homo + 1.2 eV`, `lumo - 0.3 eV`. */
MHO_API MHO_MUST_USE mho_status mho_fermi_read(const char *text,
                                               mho_fermi *fermi, char *reason,
                                               size_t reason_size);

/* The same in words, for reports; returns buffer. */
MHO_API const char *mho_fermi_write(const mho_fermi *fermi, char *buffer,
                                    size_t size);

/* Puts what is set into the molecule; coupling goes to both contacts. */
MHO_API void mho_settings_apply(const mho_settings *settings,
                                mho_molecule *molecule);

MHO_END_DECLARATIONS

#endif
