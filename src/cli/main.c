/* SPDX-License-Identifier: GPL-3.0-or-later */
#include <errno.h>
#include <getopt.h>
#include <signal.h>
#include <stdarg.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "base/text.h"
#include "cli/help.h"

enum {
  CHECK = 1, CONDUCTANCE = 2, TRANSMISSION = 4, RUN = 8, HISTOGRAM = 16, BLINK = 32, TWIST = 64,
  INTERFERENCE = 128, SCREEN = 256
};
enum {
  TABLES = CONDUCTANCE | TRANSMISSION | TWIST | INTERFERENCE, MOLECULES = CHECK | TABLES,
  ALL = MOLECULES | RUN, SETTINGS = ALL | SCREEN
};
enum { MEASURED = HISTOGRAM | BLINK, EVERY = SETTINGS | MEASURED };

static const verb verbs[] = {
    {CHECK, "check", "MOLECULE...", "say what was understood of a molecule",
     "Sites, bonds, electrons, levels, contacts and warnings of each molecule.\n"
     "Needs no contacts.",
     command_check},
    {CONDUCTANCE, "conductance", "MOLECULE...",
     "conductance at the Fermi level and how far it may be off",
     "Thermal zero-bias conductance of each molecule at its Fermi level, and its\n"
     "5 % and 95 % quantiles while the Fermi level moves over the alignment window.",
     command_conductance},
    {TRANSMISSION, "transmission", "MOLECULE...", "transmission T(E), its resonances and nodes",
     "T(E) against the energy above the Fermi level.  Without --samples the energies\n"
     "follow resonances and nodes, so that none is missed.  --poles, --nodes, --currents,\n"
     "--orbitals and --channels list something else; the last three look at one energy\n"
     "(--at, default the Fermi level).",
     command_transmission},
    {TWIST, "twist", "MOLECULE...", "how flat a bond must be, and its thermal average",
     "T and thermal conductance against the angle of a bond, the Fermi level held\n"
     "where the molecule as given has it.  With --average or --torsion the average over\n"
     "the thermal motion instead: of G (motional: it turns faster than anyone measures)\n"
     "and of log G (frozen: every junction keeps its angle).  Two --bond and --map\n"
     "give T of both angles.",
     command_twist},
    {INTERFERENCE, "interference", "MOLECULE...", "where the linkers should go: all pairs of sites",
     "T between every two sites that a linker may sit on, at the Fermi level and with\n"
     "one coupling: the bare Green's function with its sign, magic integers of\n"
     "benzenoids, what kind of pair it is, its nearest node, and how far the Fermi\n"
     "level may move before the verdict turns.  Needs no contacts, but for --modify.",
     command_interference},
    {HISTOGRAM, "histogram", "FILE...", "peaks of measured traces that can be trusted",
     "Histogram of measured conductances of all files together: text (also in gzip)\n"
     "or .npy, columns named as distance_nm, time_s, conductance_G0, conductance_S,\n"
     "log10_G0, current_nA.  Intervals are 95 %, by bootstrap over whole traces.",
     command_histogram},
    {BLINK, "blink", "FILE...", "levels of a junction that switches, and how long it stays",
     "Conductance or current against time: levels, their steps and dwell times by a\n"
     "hidden Markov model.  Files are as for mho histogram.",
     command_blink},
    {SCREEN, "screen", "LIST | STORE", "which of these many to make: a list becomes a ranked store",
     "Computes every candidate of a list (.smi, .csv with smiles and name, .sdf, or a\n"
     "folder of molecule files) into the store of --store, one SQLite file, and shows\n"
     "the best.  What is done is kept, whatever happens: --resume goes on.  A bad row\n"
     "is kept with its reason and stops nothing.  With --show or --failed the argument\n"
     "is a store, and nothing is computed.\n"
     "QUANTITY is conductance, gap, length, nodes, error, twist, window-low, rings ...;\n"
     "a wrong one is answered with all of them.",
     command_screen},
    {RUN, "run", "STUDY.yaml", "the whole study: predictions against measured values",
     "Reads a study file and writes a results folder: report.html, results.json,\n"
     "provenance.json, one CSV a table and one SVG a figure.  The folder is\n"
     "STUDY-results beside the study unless -o says otherwise; an earlier results\n"
     "folder is replaced only by a complete new one, and only where nobody has put\n"
     "files of their own into it.  What was found is told in a few sentences.",
     command_run},
};

enum {
  OPT_STORE, OPT_RESUME, OPT_SHOW, OPT_FAILED, OPT_DRY_RUN, OPT_GOAL, OPT_REQUIRE, OPT_TOP,
  OPT_BOND, OPT_ANGLES, OPT_ENERGIES, OPT_TWIST_MAP, OPT_AVERAGE, OPT_TORSION, OPT_RULES,
  OPT_MODIFY, OPT_FROM, OPT_EVERY_SITE, OPT_SAMPLES, OPT_AT, OPT_POLES, OPT_WIDTHS, OPT_NODES,
  OPT_CURRENTS, OPT_ORBITALS, OPT_CHANNELS, OPT_PARTS, OPT_DRAW, OPT_WINDOW, OPT_SENSITIVITY,
  OPT_SEED, OPT_FERMI, OPT_TEMPERATURE, OPT_COUPLING, OPT_BETA, OPT_PARAMETERS, OPT_TWIST,
  OPT_ALTERNATION, OPT_ALKYL, OPT_HOPPING, OPT_CSV, OPT_JSON, OPT_EXACT, OPT_OUTPUT, OPT_FOLDER,
  OPT_PEAKS, OPT_COMB, OPT_LINEAR, OPT_MAP, OPT_PLATEAUS, OPT_CLUSTERS, OPT_CORRELATION, OPT_FLICKER,
  OPT_BINS, OPT_CONDUCTANCES, OPT_DISTANCES, OPT_SEARCH, OPT_CROSSING, OPT_SNAP_BACK, OPT_PLATEAU_LENGTH,
  OPT_ALL_TRACES, OPT_STEPS, OPT_DWELLS, OPT_LEVELS, OPT_BANDWIDTH, OPT_DEAD_TIME, OPT_NO_DRIFT,
  OPT_BIAS, OPT_SERIES, OPT_FLOOR, OPT_SATURATION, OPT_COLUMNS, OPT_QUANTITY, OPT_ROWS, OPT_SAMPLING,
  OPT_SPEED, OPT_KEEP_GOING, OPT_THREADS, OPT_FIGURE, OPT_QUIET, OPT_VERBOSE, OPT_HELP, OPTION_COUNT
};

static const option_row options[OPTION_COUNT] = {
    [OPT_STORE] = {SCREEN, "store", 0, "FILE.db", "where the results go; must not exist yet"},
    [OPT_RESUME] = {SCREEN, "resume", 0, NULL, "go on with a store that was interrupted"},
    [OPT_SHOW] = {SCREEN, "show", 0, NULL, "list the candidates of a store, best first"},
    [OPT_FAILED] = {SCREEN, "failed", 0, NULL, "list the bad rows of a store"},
    [OPT_DRY_RUN] = {SCREEN, "dry-run", 0, NULL, "count, and estimate time and size from a sample"},
    [OPT_GOAL] = {SCREEN, "goal", 0, "GOAL",
                  "'maximise QUANTITY' (default conductance), 'minimise QUANTITY' or "
                  "'match QUANTITY VALUE'"},
    [OPT_REQUIRE] = {SCREEN, "require", 0, "CONDITION",
                     "such as 'gap > 2 eV' or 'warnings != near-node'; may be repeated, all must "
                     "hold"},
    [OPT_TOP] = {SCREEN, "top", 0, "N",
                 "list the best N only, and say how sure it is that a candidate is one of them"},
    [OPT_BOND] = {TWIST, "bond", 0, "BOND",
                  "such as C5-C8 (default: the only one that can turn), or all; may be repeated, "
                  "they turn together"},
    [OPT_ANGLES] = {TWIST, "angles", 0, "'LOW, HIGH'", "range (default '0 deg, 90 deg')"},
    [OPT_ENERGIES] = {TRANSMISSION | TWIST, "energies", 0, "'LOW, HIGH'",
                      "range above the Fermi level (default '-3 eV, 3 eV')"},
    [OPT_TWIST_MAP] = {TWIST, "map", 0, NULL, "T against angle and energy, or against two angles"},
    [OPT_AVERAGE] = {TWIST, "average", 0, NULL,
                     "over the thermal motion, by the molecule file's torsion or the kind of bond"},
    [OPT_TORSION] = {TWIST, "torsion", 0, "POTENTIAL",
                     "the average over biphenyl, tolane ..., two barriers '6 kJ/mol, 6.5 kJ/mol' at "
                     "0 and 90 deg, terms 'v2 = 1 kJ/mol, v4 = 3 kJ/mol' of cos, or a CSV"},
    [OPT_RULES] = {INTERFERENCE, "rules", 0, NULL,
                   "rules of thumb beside the exact result, and where they fail"},
    [OPT_MODIFY] = {INTERFERENCE, "modify", 0, NULL,
                    "what to change instead: CH to N and substituents, largest effect first"},
    [OPT_FROM] = {INTERFERENCE, "from", 0, "SITE",
                  "only pairs with this site; --figure then draws them on the molecule"},
    [OPT_EVERY_SITE] = {INTERFERENCE, "every-site", 0, NULL,
                        "also sites with three bonds, which no linker can sit on"},
    [OPT_SAMPLES] = {TRANSMISSION | TWIST, "samples", 0, "N",
                     "that many even steps, both ends included"},
    [OPT_AT] = {TRANSMISSION | TWIST, "at", 0, "QUANTITY",
                "one row: an energy above the Fermi level, or an angle for twist"},
    [OPT_POLES] = {TRANSMISSION, "poles", 0, NULL, "list the resonances instead of T(E)"},
    [OPT_WIDTHS] = {TRANSMISSION, "widths", 0, NULL,
                    "with --poles: what each contact adds to the width of a resonance"},
    [OPT_NODES] = {TRANSMISSION, "nodes", 0, NULL,
                   "list where T vanishes or dips, from the zeros of the Green's function"},
    [OPT_CURRENTS] = {TRANSMISSION, "currents", 0, NULL,
                      "list the currents through bonds at one energy, as parts of T"},
    [OPT_ORBITALS] = {TRANSMISSION, "orbitals", 0, NULL,
                      "list what each molecular orbital adds to T at one energy"},
    [OPT_CHANNELS] = {TRANSMISSION, "channels", 0, NULL,
                      "list the eigenchannels of contacts with several sites at one energy"},
    [OPT_PARTS] = {TRANSMISSION, "parts", 0, NULL,
                   "with --channels: the part of each contact site in each of them"},
    [OPT_DRAW] = {CHECK, "draw", 0, "FILE.svg", "draw the molecules there; - draws to the screen"},
    [OPT_WINDOW] = {CONDUCTANCE | INTERFERENCE | SCREEN, "window", 0, "ENERGY",
                    "half width of the alignment window (default '0.5 eV')"},
    [OPT_SENSITIVITY] = {CONDUCTANCE, "sensitivity", 0, NULL,
                         "list the parameters that matter most, and the error they make"},
    [OPT_SEED] = {CONDUCTANCE | HISTOGRAM | SCREEN, "seed", 0, "N", "where random draws begin, 0 to 4294967295 (default 1)"},
    [OPT_FERMI] = {SETTINGS, "fermi", 0, "LEVEL",
                   "'0.2 eV', midgap, 'homo + 1.2 eV' or 'lumo - 0.3 eV'"},
    [OPT_TEMPERATURE] = {SETTINGS, "temperature", 0, "KELVIN", "such as '300 K'"},
    [OPT_COUPLING] = {SETTINGS, "coupling", 0, "ENERGY",
                      "Gamma of both contacts, such as '0.3 eV', also in place of chains"},
    [OPT_BETA] = {SETTINGS, "beta", 0, "ENERGY", "resonance integral, negative (default '-2.7 eV')"},
    [OPT_PARAMETERS] = {SETTINGS, "parameters", 0, "SET", "van-catledge (default), streitwieser, or a file"},
    [OPT_TWIST] = {ALL, "twist", 0, "'BOND = ANGLE'", "such as 'C5-C8 = 38 deg'; may be repeated"},
    [OPT_ALTERNATION] = {SETTINGS, "alternation", 0, "RULE",
                         "of bonds in a SMILES: formal (default) or none"},
    [OPT_ALKYL] = {SETTINGS, "alkyl", 0, "RULE",
                   "alkyl groups of a SMILES: ignored (default), inductive or heteroatom"},
    [OPT_HOPPING] = {SETTINGS, "hopping", 0, "RULE",
                     "of C-C bonds: table (default), or bond-length from coordinates"},
    [OPT_CSV] = {TABLES | MEASURED | SCREEN, "csv", 0, NULL, "write CSV"},
    [OPT_JSON] = {MOLECULES | MEASURED | SCREEN, "json", 0, NULL, "write JSON"},
    [OPT_EXACT] = {MOLECULES | MEASURED | SCREEN, "exact", 0, NULL, "17 digits instead of 6"},
    [OPT_OUTPUT] = {EVERY & ~RUN, "output", 'o', "PATH", "write there instead of to the screen"},
    [OPT_FOLDER] = {RUN, "output", 'o', "FOLDER", "the results folder (default STUDY-results beside the study)"},
    [OPT_PEAKS] = {HISTOGRAM, "peaks", 0, NULL, "list the peaks of the log histogram"},
    [OPT_COMB] = {HISTOGRAM, "comb", 0, NULL, "list whole multiples of one conductance"},
    [OPT_LINEAR] = {HISTOGRAM, "linear", 0, NULL, "the linear histogram"},
    [OPT_MAP] = {HISTOGRAM, "map", 0, NULL, "the 2D histogram, conductance against distance"},
    [OPT_PLATEAUS] = {HISTOGRAM, "plateaus", 0, NULL, "list the plateaus of every trace"},
    [OPT_CLUSTERS] = {HISTOGRAM, "clusters", 0, NULL, "list clusters of traces of one shape"},
    [OPT_CORRELATION] = {HISTOGRAM, "correlation", 0, NULL,
                         "which conductances come together in a trace (1) or exclude each other (-1)"},
    [OPT_FLICKER] = {HISTOGRAM, "flicker", 0, NULL, "noise of held junctions against conductance"},
    [OPT_BINS] = {HISTOGRAM, "bins", 0, "N", "bins a decade, 1 to 1000 (default 100)"},
    [OPT_CONDUCTANCES] = {HISTOGRAM, "conductances", 0, "'LOW, HIGH'",
                          "range of the histogram (default '1e-7 G0, 10 G0')"},
    [OPT_DISTANCES] = {HISTOGRAM, "distances", 0, "'LOW, HIGH'",
                       "range of the map (default '-0.5 nm, 2.5 nm')"},
    [OPT_SEARCH] = {HISTOGRAM, "search", 0, "'LOW, HIGH'",
                    "where peaks may be (default from the floor to 0.35 G0)"},
    [OPT_CROSSING] = {HISTOGRAM, "crossing", 0, "CONDUCTANCE",
                      "whose last crossing is distance zero (default '0.5 G0')"},
    [OPT_SNAP_BACK] = {HISTOGRAM, "snap-back", 0, "LENGTH",
                       "that the electrodes spring apart on rupture (default '0 nm')"},
    [OPT_PLATEAU_LENGTH] = {HISTOGRAM, "plateau-length", 0, "LENGTH",
                            "a trace without such a plateau is rejected (default '0.15 nm')"},
    [OPT_ALL_TRACES] = {HISTOGRAM, "all", 0, NULL, "reject no trace"},
    [OPT_STEPS] = {BLINK, "steps", 0, NULL, "list the steps between levels"},
    [OPT_DWELLS] = {BLINK, "dwells", 0, NULL, "list every stay on a level"},
    [OPT_LEVELS] = {BLINK, "levels", 0, "N", "that many, 1 to 3, instead of a test"},
    [OPT_BANDWIDTH] = {BLINK, "bandwidth", 0, "FREQUENCY", "of the instrument (-3 dB)"},
    [OPT_DEAD_TIME] = {BLINK, "dead-time", 0, "TIME",
                       "shortest dwell that is seen (default 0.179/bandwidth)"},
    [OPT_NO_DRIFT] = {BLINK, "no-drift", 0, NULL, "do not take off a straight drift"},
    [OPT_BIAS] = {MEASURED, "bias", 0, "VOLTAGE", "of a measured current, such as '0.1 V'"},
    [OPT_SERIES] = {MEASURED, "series-resistance", 0, "R", "to take off (default '0 ohm')"},
    [OPT_FLOOR] = {MEASURED, "floor", 0, "G-OR-I", "of the preamplifier, such as '1e-6 G0' or '10 pA'"},
    [OPT_SATURATION] = {MEASURED, "saturation", 0, "G-OR-I", "of the preamplifier"},
    [OPT_COLUMNS] = {MEASURED, "columns", 0, "NAMES", "such as distance_nm,current_nA"},
    [OPT_QUANTITY] = {MEASURED, "quantity", 0, "NAME",
                      "of nameless columns: conductance_G0, conductance_S, log10_G0 or current_A"},
    [OPT_ROWS] = {MEASURED, "rows", 0, NULL, "each row of a .npy is a trace"},
    [OPT_SAMPLING] = {MEASURED, "sampling", 0, "FREQUENCY", "makes a time where there is none"},
    [OPT_SPEED] = {MEASURED, "speed", 0, "SPEED", "makes a distance of a time, such as '20 nm/s'"},
    [OPT_KEEP_GOING] = {MEASURED, "keep-going", 0, NULL,
                        "use the other files where one is bad; still exit with 2"},
    [OPT_THREADS] = {HISTOGRAM | SCREEN, "threads", 0, "N", "1 to 1024; results do not depend on it"},
    [OPT_FIGURE] = {MEASURED | TABLES, "figure", 0, "FILE.svg",
                    "draw the table; curves and maps need gnuplot"},
    [OPT_QUIET] = {EVERY, "quiet", 0, NULL, "no progress and no remarks"},
    [OPT_VERBOSE] = {TABLES, "verbose", 0, NULL, "say which methods were used, and why"},
    [OPT_HELP] = {EVERY, "help", 'h', NULL, "this help"},
};

enum { VERB_COUNT = sizeof verbs / sizeof *verbs };

int exit_of(mho_status status)
{
  if (status == MHO_OK) return EXIT_DONE;
  return mho_status_is_input(status) ? EXIT_INPUT : EXIT_RUNTIME;
}

int usage_error(const char *verb_name, const char *format, ...)
{
  fprintf(stderr, "mho%s%s: ", verb_name ? " " : "", verb_name ? verb_name : "");
  va_list arguments;
  va_start(arguments, format);
  vfprintf(stderr, format, arguments);
  va_end(arguments);
  fprintf(stderr, "\n");
  return EXIT_INPUT;
}

/* The mistakes of one file in the order of its lines. */
static void sort_causes(mho_error *error)
{
  for (int i = 1; i < error->count; i++)
    for (int k = i; k > 0; k--) {
      mho_cause *a = &error->cause[k - 1], *b = &error->cause[k], swap = *a;
      bool later = a->line > b->line || (a->line == b->line && a->column > b->column);
      if (strcmp(a->file, b->file) || !later) break;
      *a = *b;
      *b = swap;
    }
}

void print_causes(const command *cmd, mho_error *error)
{
  sort_causes(error);
  for (int i = 0; i < error->count; i++) {
    char line[1400];
    mho_cause_format(&error->cause[i], line, sizeof line);
    if (error->cause[i].file[0]) fprintf(stderr, "%s\n", line);
    else fprintf(stderr, "mho %s: %s\n", cmd->verb, line);
  }
  if (error->suppressed)
    fprintf(stderr, "mho %s: %d further mistakes are not shown\n", cmd->verb, error->suppressed);
}

int read_quantity(const char *verb_name, const char *option, const char *text,
                  mho_dimension dimension, double low, double high, double *value)
{
  char reason[320];
  if (mho_quantity_read(text, dimension, value, reason, sizeof reason) != MHO_OK)
    return usage_error(verb_name, "--%s: %s", option, reason);
  const char *unit = mho_dimension_base_unit(dimension);
  if (!(*value >= low && *value <= high))
    return usage_error(verb_name, "--%s: '%s' is out of range; allowed are %g %s to %g %s",
                       option, text, low, unit, high, unit);
  return EXIT_DONE;
}

int read_range(const command *cmd, const char *option, const char *text,
               mho_dimension dimension, const char *example, double least, double most,
               double *low, double *high)
{
  const char *comma = strchr(text, ',');
  if (!comma || strchr(comma + 1, ','))
    return usage_error(cmd->verb, "--%s: '%s' is not a range; write '%s'", option, text, example);
  char *first = mho_print_text("%.*s", (int)(comma - text), text);
  if (!first) return usage_error(cmd->verb, "out of memory");
  int code = read_quantity(cmd->verb, option, first, dimension, least, most, low);
  free(first);
  if (code == EXIT_DONE)
    code = read_quantity(cmd->verb, option, comma + 1, dimension, least, most, high);
  if (code == EXIT_DONE && !(*low < *high))
    return usage_error(cmd->verb, "--%s: '%s' runs downwards; the lower end comes first", option,
                       text);
  return code;
}

int read_count(const char *verb_name, const char *option, const char *text, long low, long high,
               long *value)
{
  char *end;
  errno = 0;
  *value = strtol(text, &end, 10);
  if (errno || *end || end == text || *value < low || *value > high)
    return usage_error(verb_name, "--%s: '%s' is not allowed; a whole number from %ld to %ld is",
                       option, text, low, high);
  return EXIT_DONE;
}

int read_svg_name(const command *cmd, const char *option, const char *text, const char **name)
{
  size_t length = strlen(text);
  if (length < 5 || strcmp(text + length - 4, ".svg"))
    return usage_error(cmd->verb, "--%s: '%s' is not allowed; the name ends in .svg", option, text);
  *name = text;
  return EXIT_DONE;
}

static int read_seed(command *cmd, const char *text)
{
  const unsigned long most = 4294967295ul;
  char *end;
  errno = 0;
  cmd->seed = strtoul(text, &end, 10);
  if (errno || *end || end == text || *text == '-' || cmd->seed > most)
    return usage_error(cmd->verb, "--seed: '%s' is not allowed; a whole number from 0 to %lu is",
                       text, most);
  cmd->screen.question.has_seed = true;
  cmd->screen.question.seed = cmd->seed;
  return EXIT_DONE;
}

/* A setting that files have as well; a parameter file may have its own causes. */
static int read_setting(command *cmd, const char *name, const char *text)
{
  char reason[320];
  mho_error error;
  mho_error_init(&error);
  mho_status status =
      mho_settings_read(&cmd->overrides, name, text, NULL, reason, sizeof reason, &error);
  print_causes(cmd, &error);
  return status == MHO_OK ? EXIT_DONE : usage_error(cmd->verb, "--%s: %s", name, reason);
}

/* `C5-C8 = 38 deg` */
static int read_twist(command *cmd, const char *text)
{
  char reason[320], bond[2 * MHO_ID_SIZE + 2];
  const char *equals = strchr(text, '=');
  if (!equals || (size_t)(equals - text) >= sizeof bond)
    return usage_error(cmd->verb, "--twist: '%s' is not understood; write 'C5-C8 = 38 deg'", text);
  snprintf(bond, sizeof bond, "%.*s", (int)(equals - text), text);
  bond[strcspn(bond, " \t")] = '\0';
  if (mho_settings_read_twist(&cmd->overrides, bond, equals + 1, reason, sizeof reason) != MHO_OK)
    return usage_error(cmd->verb, "--twist: %s", reason);
  return EXIT_DONE;
}

/* An option of a question that a study may ask too; EXIT_RUNTIME: none. */
static int read_question(command *cmd, const char *name, const char *text)
{
  bool twist = !strcmp(cmd->verb, "twist");
  if (!twist && strcmp(cmd->verb, "interference")) return EXIT_RUNTIME;
  size_t count;
  const mho_option *table = twist ? mho_twist_options(&count)
                                  : mho_interference_question_options(&count);
  const mho_option *option = mho_option_find(table, count, name);
  void *question = twist ? (void *)&cmd->twist : (void *)&cmd->interference;
  char reason[320];
  if (!option) return EXIT_RUNTIME;
  if (mho_option_read(option, text, question, reason, sizeof reason) == MHO_OK) return EXIT_DONE;
  return usage_error(cmd->verb, "--%s: %s", name, reason);
}

static int read_option(command *cmd, int which, const char *text)
{
  int code = read_question(cmd, options[which].name, text);
  if (code != EXIT_RUNTIME) return code;
  switch (which) {
  case OPT_ENERGIES:
    cmd->has_energies = true;
    return read_range(cmd, "energies", text, MHO_ENERGY, "-3 eV, 3 eV", -1000, 1000,
                      &cmd->energy_low_ev, &cmd->energy_high_ev);
  case OPT_STORE: cmd->screen.store = text; return EXIT_DONE;
  case OPT_RESUME: cmd->screen.resume = true; return EXIT_DONE;
  case OPT_SHOW: cmd->screen.show = true; return EXIT_DONE;
  case OPT_FAILED: cmd->screen.failed = true; return EXIT_DONE;
  case OPT_DRY_RUN: cmd->screen.dry_run = true; return EXIT_DONE;
  case OPT_GOAL: return read_goal(cmd, text);
  case OPT_REQUIRE: return read_require(cmd, text);
  case OPT_TOP:
    cmd->screen.question.has_top = true;
    return read_count(cmd->verb, "top", text, 1, 1000000000, &cmd->screen.question.top);
  case OPT_SAMPLES:
    cmd->has_samples = true;
    return read_count(cmd->verb, "samples", text, 2, 1000000, &cmd->samples);
  case OPT_AT:
    cmd->has_at = true;
    return read_quantity(cmd->verb, "at", text, MHO_ENERGY, -1000, 1000, &cmd->at_ev);
  case OPT_SEED: return read_seed(cmd, text);
  case OPT_SENSITIVITY: cmd->sensitivity = true; return EXIT_DONE;
  case OPT_WINDOW:
    cmd->has_window = true;
    return read_quantity(cmd->verb, "window", text, MHO_ENERGY, 0, 10, &cmd->window_ev);
  case OPT_POLES: cmd->poles = true; return EXIT_DONE;
  case OPT_NODES: cmd->nodes = true; return EXIT_DONE;
  case OPT_CURRENTS: cmd->currents = true; return EXIT_DONE;
  case OPT_ORBITALS: cmd->orbitals = true; return EXIT_DONE;
  case OPT_CHANNELS: cmd->channels = true; return EXIT_DONE;
  case OPT_WIDTHS: cmd->widths = true; return EXIT_DONE;
  case OPT_PARTS: cmd->parts = true; return EXIT_DONE;
  case OPT_EXACT: cmd->exact = true; return EXIT_DONE;
  case OPT_DRAW:
    cmd->drawing = text;
    return strcmp(text, "-") ? read_svg_name(cmd, "draw", text, &cmd->drawing) : EXIT_DONE;
  case OPT_QUIET: cmd->quiet = true; return EXIT_DONE;
  case OPT_VERBOSE: cmd->verbose = true; return EXIT_DONE;
  case OPT_OUTPUT:
  case OPT_FOLDER:
    if (!*text) return usage_error(cmd->verb, "--output: a path is missing");
    cmd->output = text;
    return EXIT_DONE;
  case OPT_CSV:
  case OPT_JSON:
    if (cmd->format != FORMAT_SCREEN && cmd->format != (which == OPT_CSV ? FORMAT_CSV : FORMAT_JSON))
      return usage_error(cmd->verb, "--csv and --json exclude each other");
    cmd->format = which == OPT_CSV ? FORMAT_CSV : FORMAT_JSON;
    return EXIT_DONE;
  case OPT_TWIST: return read_twist(cmd, text);
  default:
    return options[which].verbs & MEASURED ? read_measured_option(cmd, options[which].name, text)
                                           : read_setting(cmd, options[which].name, text);
  }
}

/* What getopt could not place: an unknown option or a missing argument. */
static int refuse_option(const verb *v, char *const *argv, int code)
{
  const char *text = argv[optind - 1];
  if (code == ':')
    return usage_error(v->name, "option '%s' needs a value; see mho %s --help", text, v->name);
  const char *known[OPTION_COUNT];
  size_t count = 0;
  for (int i = 0; i < OPTION_COUNT; i++)
    if (options[i].verbs & v->bit) known[count++] = options[i].name;
  char word[64];
  snprintf(word, sizeof word, "%.*s", (int)strcspn(text + strspn(text, "-"), "="),
           text + strspn(text, "-"));
  const char *nearest = mho_nearest_word(word, known, count);
  if (nearest && !strcmp(nearest, word))
    return usage_error(v->name, "option '--%s' takes no value", word);
  if (nearest)
    return usage_error(v->name, "option '%s' is not known; did you mean '--%s'?", text, nearest);
  return usage_error(v->name, "option '%s' is not known; see mho %s --help", text, v->name);
}

static int parse(const verb *v, int argc, char **argv, command *cmd, bool *help)
{
  struct option table[OPTION_COUNT + 1];
  int count = 0;
  for (int i = 0; i < OPTION_COUNT; i++)
    if (options[i].verbs & v->bit)
      table[count++] = (struct option){
          options[i].name, options[i].argument ? required_argument : no_argument, NULL, 256 + i};
  table[count] = (struct option){0};
  *cmd = (command){.verb = v->name, .window_ev = MHO_DEFAULT_WINDOW_EV, .seed = 1};
  measured_options_init(&cmd->measured);
  opterr = 0;
  int code;
  while ((code = getopt_long(argc, argv, ":ho:", table, NULL)) != -1) {
    if (code == 'h') code = 256 + OPT_HELP;
    if (code == 'o') code = 256 + OPT_OUTPUT;
    if (code < 256) return refuse_option(v, argv, code);
    if (code == 256 + OPT_HELP) {
      *help = true;
      return EXIT_DONE;
    }
    int status = read_option(cmd, code - 256, optarg);
    if (status != EXIT_DONE) return status;
  }
  cmd->files = argc - optind;
  cmd->file = argv + optind;
  if (cmd->files == 0)
    return usage_error(v->name, "%s is missing; see mho %s --help", v->arguments, v->name);
  return EXIT_DONE;
}

/* The command line as one text, arguments with blanks in quotes. */
static void join_arguments(int argc, char **argv, mho_buffer *line)
{
  mho_buffer_add(line, "mho");
  for (int i = 0; i < argc; i++) {
    const char *quote = argv[i][0] == '\0' || strpbrk(argv[i], " \t'\"$*?[](){}<>|&;") ? "'" : "";
    mho_buffer_print(line, " %s%s%s", quote, argv[i], quote);
  }
}

static int run_verb(const verb *v, int argc, char **argv)
{
  command cmd;
  bool help = false;
  mho_buffer line = {0};
  join_arguments(argc, argv, &line); /* before getopt reorders them */
  int code = parse(v, argc, argv, &cmd, &help);
  if (help) print_verb_help(v, options, OPTION_COUNT);
  else if (code == EXIT_DONE) {
    mho_error error;
    mho_error_init(&error);
    cmd.line = line.data;
    code = v->run(&cmd, &error);
    print_causes(&cmd, &error);
  }
  mho_settings_clear(&cmd.overrides);
  mho_buffer_clear(&line);
  return code;
}

/* stdout may be a full disk: closing it is the last chance to notice. */
static int close_stdout(int code)
{
  if (fflush(stdout) == 0 && !ferror(stdout)) return code;
  if (errno == EPIPE || code != EXIT_DONE) return code;
  fprintf(stderr, "mho: the output cannot be written: %s\n", strerror(errno));
  return EXIT_RUNTIME;
}

static int dispatch(int argc, char **argv)
{
  const char *word = argc > 1 ? argv[1] : NULL;
  if (!word) {
    print_help(verbs, VERB_COUNT);
    return EXIT_INPUT;
  }
  bool help = !strcmp(word, "--help") || !strcmp(word, "-h") || !strcmp(word, "help");
  if (help && argc == 2) {
    print_help(verbs, VERB_COUNT);
    return EXIT_DONE;
  }
  if (!strcmp(word, "--manual")) {
    print_manual(verbs, VERB_COUNT, options, OPTION_COUNT);
    return EXIT_DONE;
  }
  if (!strcmp(word, "--version")) {
    print_version();
    return EXIT_DONE;
  }
  if (help) word = argv[2];
  const char *names[VERB_COUNT];
  for (int i = 0; i < VERB_COUNT; i++) {
    names[i] = verbs[i].name;
    if (strcmp(verbs[i].name, word)) continue;
    if (!help) return run_verb(&verbs[i], argc - 1, argv + 1);
    print_verb_help(&verbs[i], options, OPTION_COUNT);
    return EXIT_DONE;
  }
  const char *nearest = mho_nearest_word(word, names, VERB_COUNT);
  char list[200];
  if (nearest) return usage_error(NULL, "verb '%s' is not known; did you mean '%s'?", word, nearest);
  return usage_error(NULL, "verb '%s' is not known; allowed are %s", word,
                     mho_join_words(names, VERB_COUNT, list, sizeof list));
}

int main(int argc, char **argv)
{
  signal(SIGXFSZ, SIG_IGN); /* a limit of file size is a failed write, and told */
  return close_stdout(dispatch(argc, argv));
}
