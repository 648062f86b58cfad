/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "cli/help.h"

#include <sqlite3.h>
#include <stdio.h>

#include "base/lapack.h"

void print_help(const verb *verbs, int count)
{
  printf("mho - conductance of single-molecule junctions from a tight-binding model\n\n"
         "usage: mho VERB [options] MOLECULE... | FILE...\n\n");
  for (int i = 0; i < count; i++)
    printf("  %-13s %s\n", verbs[i].name, verbs[i].summary);
  printf("\n  mho VERB --help tells the options of a verb, mho --version the build.\n"
         "\nA MOLECULE is a molecule file, a list (.smi, .csv), a file of structures\n"
         "(.mol, .sdf, .xyz) or a SMILES such as 'Nc1ccc(N)cc1'.\nQuantities carry their unit: '0.3 eV', '300 K', '38 deg', '0.2 V'.\n"
         "Exit status: 0 done, 1 failed while running, 2 bad usage or input.\n");
}

void print_verb_help(const verb *v, const option_row *options, int count)
{
  printf("usage: mho %s [options] %s\n\n%s\n\n", v->name, v->arguments, v->details);
  for (int i = 0; i < count; i++) {
    if (!(options[i].verbs & v->bit)) continue;
    char left[48];
    const char *argument = options[i].argument;
    snprintf(left, sizeof left, "%s--%s%s%s", options[i].letter == 'o' ? "-o, " : options[i].letter == 'h' ? "-h, " : "    ",
             options[i].name, argument ? " " : "", argument ? argument : "");
    printf("  %-28s %s\n", left, options[i].help);
  }
}

void print_version(void)
{
  printf("mho %s\nlinear algebra: %s\nextended precision: 113 bits\nstores: SQLite %s\n"
         "licence: GPL-3.0-or-later\n",
         mho_version(), mho_lapack_description(), sqlite3_libversion());
}

/* Text of a page: no letter is taken for a request or an escape. */
static void print_roff(const char *text)
{
  for (const char *p = text; *p; p++) {
    if (p == text || p[-1] == '\n')
      if (*p == '.' || *p == '\'') printf("\\&");
    if (*p == '-') printf("\\-");
    else if (*p == '\\') printf("\\e");
    else putchar(*p);
  }
  putchar('\n');
}

static void print_manual_option(const option_row *option)
{
  printf(".TP\n\\fB");
  if (option->letter) printf("\\-%c\\fR, \\fB", option->letter);
  printf("\\-\\-%s\\fR%s", option->name, option->argument ? " " : "");
  if (option->argument) print_roff(option->argument);
  else putchar('\n');
  print_roff(option->help);
}

void print_manual(const verb *verbs, int verb_count, const option_row *options, int count)
{
  printf(".TH MHO 1 \"\" \"mholecule %s\"\n.SH NAME\n"
         "mho \\- conductance of single\\-molecule junctions from a tight\\-binding model\n"
         ".SH SYNOPSIS\n", mho_version());
  for (int i = 0; i < verb_count; i++) {
    printf(".B mho %s\n[options] ", verbs[i].name);
    print_roff(verbs[i].arguments);
    printf(".br\n");
  }
  printf(".SH DESCRIPTION\n"
         "A MOLECULE is a molecule file, a list (.smi, .csv), a file of structures\n"
         "(.mol, .sdf, .xyz) or a SMILES such as \\(aqNc1ccc(N)cc1\\(aq.\n"
         "Quantities carry their unit: \\(aq0.3 eV\\(aq, \\(aq300 K\\(aq, \\(aq38 deg\\(aq, "
         "\\(aq0.2 V\\(aq.\n");
  for (int i = 0; i < verb_count; i++) {
    printf(".SH MHO %s\n", verbs[i].name);
    print_roff(verbs[i].details);
    for (int k = 0; k < count; k++)
      if (options[k].verbs & verbs[i].bit) print_manual_option(&options[k]);
  }
  printf(".SH EXIT STATUS\n0 done, 1 failed while running, 2 bad usage or input.\n");
}
