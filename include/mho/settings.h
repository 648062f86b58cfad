/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Settings that a command line, a study and a molecule file share, with one
 * table of their names, units and ranges.
 */
#ifndef MHOLECULE_SETTINGS_H
#define MHOLECULE_SETTINGS_H

#include <mho/molecule.h>
#include <mho/status.h>
#include <mho/structure.h>

/* A dihedral angle of the bond between two sites or atoms. */
typedef struct {
  char site[2][MHO_ID_SIZE];
  double angle_deg;
} mho_twist;

typedef struct {
  bool has_beta, has_temperature, has_coupling, has_fermi, has_alternation, has_alkyl,
      has_hopping;
  double beta_ev, temperature_k, coupling_ev;
  mho_fermi fermi;
  mho_alternation alternation;
  mho_alkyl alkyl;
  mho_hopping hopping;
  const mho_parameter_set *parameters; /* NULL: not set */
  mho_parameter_set *own_parameters;   /* read from a file; freed by clear */
  int twist_count;
  mho_twist *twist;       /* later ones count */
  bool contacts_optional; /* a structure without two linkers is no mistake */
} mho_settings;

MHO_BEGIN_DECLARATIONS

/* Frees what settings own; settings that are all zero are empty ones.  A
 * molecule that was read with a parameter set of a file must not outlive the
 * settings that own the set. */
MHO_API void mho_settings_clear(mho_settings *settings);

/* Names: beta, temperature, coupling, fermi, parameters, alternation, alkyl,
 * hopping. */
MHO_API const char *const *mho_settings_names(size_t *count);

/* Reads one setting from text.  `parameters` is a built-in set or the path of
 * a file, relative to the folder of `beside` (a file; NULL for the current
 * folder).  On failure `reason` says what is allowed; mistakes inside a
 * parameter file are added to error (may be NULL).
 * Errors: MHO_ERR_KEY (no such name), MHO_ERR_UNIT, MHO_ERR_SYNTAX,
 * MHO_ERR_RANGE, MHO_ERR_REFERENCE, and those of mho_parameters_read. */
MHO_API MHO_MUST_USE mho_status mho_settings_read(mho_settings *settings,
                                                  const char *name,
                                                  const char *text,
                                                  const char *beside, char *reason,
                                                  size_t reason_size,
                                                  mho_error *error);

/* Adds a twist: the bond as `C5-C8`, the angle as `38 deg`. */
MHO_API MHO_MUST_USE mho_status mho_settings_read_twist(mho_settings *settings,
                                                        const char *bond,
                                                        const char *angle,
                                                        char *reason,
                                                        size_t reason_size);

/* Puts what `over` sets on top of `settings`; a parameter set stays the
 * property of `over`.  Errors: MHO_ERR_MEMORY. */
MHO_API MHO_MUST_USE mho_status mho_settings_merge(mho_settings *settings,
                                                   const mho_settings *over);

/* `0.2 eV`, `midgap`, `homo + 1.2 eV`, `lumo - 0.3 eV`. */
MHO_API MHO_MUST_USE mho_status mho_fermi_read(const char *text,
                                               mho_fermi *fermi, char *reason,
                                               size_t reason_size);

/* The same in words, for reports; returns buffer. */
MHO_API const char *mho_fermi_write(const mho_fermi *fermi, char *buffer,
                                    size_t size);

/* Puts what is set into a molecule: beta, temperature, Fermi level, the
 * coupling of both contacts (wide bands, also in the place of chains), twists.
 * The parameter set, alternation, alkyl groups and hopping have their effect while
 * a molecule is built and are not touched.
 * Errors: MHO_ERR_REFERENCE (a twist's bond does not exist). */
MHO_API MHO_MUST_USE mho_status mho_settings_apply(const mho_settings *settings,
                                                   mho_molecule *molecule,
                                                   mho_error *error);

MHO_END_DECLARATIONS

#endif
