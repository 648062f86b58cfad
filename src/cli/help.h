/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Help and manual page, from the tables of verbs and options that main.c reads
 * the command line with.
 */
#ifndef MHOLECULE_CLI_HELP_H
#define MHOLECULE_CLI_HELP_H

#include "cli/command.h"

typedef struct {
  int bit;
  const char *name, *arguments, *summary, *details;
  verb_function *run;
} verb;

typedef struct {
  int verbs; /* bits */
  const char *name;
  char letter; /* of a short form, or 0 */
  const char *argument; /* NULL for a flag */
  const char *help;
} option_row;

void print_help(const verb *verbs, int count);
void print_verb_help(const verb *v, const option_row *options, int count);
void print_version(void);

/* The page mho(1), in the man macros. */
void print_manual(const verb *verbs, int verb_count, const option_row *options, int count);

#endif
