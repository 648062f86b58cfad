/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The command line: one table of verbs and one of options give parsing,
 * dispatch and help.
 */
#ifndef MHOLECULE_CLI_COMMAND_H
#define MHOLECULE_CLI_COMMAND_H

#include <mho/mho.h>

#include "report/table.h"

enum { EXIT_DONE = 0, EXIT_RUNTIME = 1, EXIT_INPUT = 2 };

typedef enum { FORMAT_SCREEN, FORMAT_CSV, FORMAT_JSON } output_format;

/* Everything that options can say; each verb uses its part. */
typedef struct {
  const char *verb;
  const char *line; /* the whole command line, for provenance */
  mho_settings overrides;
  output_format format;
  bool exact, quiet, verbose, poles, nodes, sensitivity;
  const char *output; /* -o, or NULL */
  bool has_energies, has_samples, has_at;
  double energy_low_ev, energy_high_ev, at_ev;
  long samples;
  bool map, has_angles, rules, modify, every_site;
  double angle_low_deg, angle_high_deg, at_deg;
  int bonds;
  const char *bond[8], *torsion;
  double window_ev;
  bool has_window;
  unsigned long seed;
  int files;
  char **file;
} command;

/* A verb returns the exit status; causes are in error. */
typedef int verb_function(const command *cmd, mho_error *error);

verb_function command_check, command_conductance, command_transmission, command_twist,
    command_interference, command_run;

/* Exit status that belongs to a status. */
int exit_of(mho_status status);

/* `mho VERB: message` on stderr for a mistake of the command line; returns 2. */
int usage_error(const char *verb, const char *format, ...) MHO_PRINTF(2, 3);

/* A molecule, its numbers and its warnings, as every verb needs them. */
typedef struct {
  mho_molecule molecule;
  mho_junction junction;
  unsigned warnings;
} subject;

typedef struct {
  int count, capacity;
  subject *item;
} subjects;

/* Reads every argument of the command: a molecule file, a list of SMILES
 * (.smi, .csv), or else a SMILES itself.  Names must differ; in a list the row
 * is added where they do not.  A bad row of a list is told on stderr and left
 * out.  With need_contacts a molecule without two contacts is an error.  The
 * caller frees, also after a failure. */
MHO_MUST_USE mho_status subjects_read(const command *cmd, bool need_contacts,
                                      subjects *list, mho_error *error);
void subjects_free(subjects *list);

/* The causes on stderr, one a line. */
void print_causes(const command *cmd, mho_error *error);

/* Writes an output in the chosen form to stdout or to -o PATH. */
MHO_MUST_USE mho_status output_write(const command *cmd, const mho_output *output,
                                     mho_error *error);
MHO_MUST_USE mho_status text_write(const command *cmd, const mho_buffer *buffer,
                                   mho_error *error);
int digits_of(const command *cmd);

#endif
