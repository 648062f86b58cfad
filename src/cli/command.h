/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The command line: one table of verbs and one of options give parsing,
 * dispatch and help.
 */
#ifndef MHOLECULE_CLI_COMMAND_H
#define MHOLECULE_CLI_COMMAND_H

#include <mho/mho.h>

#include "report/table.h"
#include "study/interference.h"
#include "study/screening.h"
#include "study/twist.h"

enum { EXIT_DONE = 0, EXIT_RUNTIME = 1, EXIT_INPUT = 2 };

typedef enum { FORMAT_SCREEN, FORMAT_CSV, FORMAT_JSON } output_format;

/* Which table of measured traces is asked for. */
typedef enum {
  MEASURED_DEFAULT, MEASURED_MAP, MEASURED_PEAKS, MEASURED_COMB, MEASURED_PLATEAUS,
  MEASURED_LINEAR, MEASURED_CLUSTERS, MEASURED_CORRELATION, MEASURED_FLICKER, MEASURED_STEPS,
  MEASURED_DWELLS
} measured_table;

/* What options say about measured traces. */
typedef struct {
  mho_trace_options traces;
  mho_histogram_options histogram;
  mho_telegraph_options blink;
  measured_table table;
  bool has_search; /* where peaks and clusters are looked for */
  double search_low_g0, search_high_g0;
  bool all; /* no rejection */
  const char *figure;
} measured_options;

/* What options say about a screening. */
typedef struct {
  const char *store; /* --store, or NULL */
  bool resume, show, failed, dry_run;
  mho_screening_question question;
} screen_options;

/* Everything that options can say; each verb uses its part. */
typedef struct {
  const char *verb;
  const char *line; /* the whole command line, for provenance */
  mho_settings overrides;
  output_format format;
  bool exact, quiet, verbose, poles, nodes, sensitivity;
  const char *output; /* -o, or NULL */
  const char *drawing; /* --draw, or NULL; "-" is stdout */
  bool has_energies, has_samples, has_at;
  double energy_low_ev, energy_high_ev, at_ev;
  long samples;
  bool currents, orbitals, channels; /* views at one energy */
  bool widths, parts;               /* of poles, of channels */
  mho_twist_question twist;
  mho_interference_question interference;
  double window_ev;
  bool has_window;
  unsigned long seed;
  measured_options measured;
  screen_options screen;
  int files;
  char **file;
} command;

/* A verb returns the exit status; causes are in error. */
typedef int verb_function(const command *cmd, mho_error *error);

verb_function command_blink, command_check, command_conductance, command_histogram,
    command_interference, command_run, command_screen, command_transmission, command_twist;

/* Exit status that belongs to a status. */
int exit_of(mho_status status);

/* `mho VERB: message` on stderr for a mistake of the command line; returns 2. */
int usage_error(const char *verb, const char *format, ...) MHO_PRINTF(2, 3);

/* Reads a quantity of an option into the base unit; prints what is wrong. */
int read_quantity(const char *verb, const char *option, const char *text,
                  mho_dimension dimension, double low, double high, double *value);
int read_range(const command *cmd, const char *option, const char *text,
               mho_dimension dimension, const char *example, double least, double most,
               double *low, double *high); /* `LOW, HIGH` */
int read_count(const char *verb, const char *option, const char *text, long low, long high,
               long *value);

/* Seconds of a clock that only runs forward. */
double seconds_now(void);

/* A bar with a text on stderr in place of the one before, and none. */
void draw_bar(double fraction, const char *format, ...) MHO_PRINTF(2, 3);
void clear_bar(void);

/* Becomes non-zero by SIGINT, SIGTERM or SIGHUP, which end nothing from now on. */
const volatile int *catch_signals(void);

void measured_options_init(measured_options *options);
/* Adds a --require, or sets the goal. */
int read_require(command *cmd, const char *text);
int read_goal(command *cmd, const char *text);

/* An option of `histogram` or `blink`. */
/* The name of a picture; it ends in .svg. */
int read_svg_name(const command *cmd, const char *option, const char *text, const char **name);
int read_measured_option(command *cmd, const char *name, const char *text);

/* A bar over the bytes that were read, on a terminal after a second. */
typedef struct {
  double start;
  bool shown;
} byte_progress;
void begin_byte_progress(const command *cmd, byte_progress *progress, mho_trace_options *traces);
void end_byte_progress(const byte_progress *progress);

/* MHO_OK where at least one file could be read. */
MHO_MUST_USE mho_status check_any_file(const mho_trace_report *report);
/* Renders a script to --figure; without gnuplot it is left out, and says so. */
MHO_MUST_USE mho_status figure_write(const command *cmd, const mho_buffer *script,
                                     mho_error *error);

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
 * (.smi, .csv), structures (.mol, .sdf, .xyz), or else a SMILES itself.  Names
 * must differ; in a list the row, in an SDF the record is added where they do
 * not.  A bad row or record of many is told on stderr and left out.  With need_contacts a molecule without two contacts is an error.  The
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
int screen_width_of(const command *cmd);

/* The form that the options and the ending of -o PATH ask for. */
output_format format_of(const command *cmd);

#endif
