/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * What `histogram` and `blink` share: options of measured traces, a bar over
 * bytes, and figures.
 */
#include <errno.h>
#include <math.h>
#include <omp.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

#include "base/text.h"
#include "cli/command.h"
#include "measure/settings.h"
#include "report/figure.h"

#define G0_LOW 1e-15
#define G0_HIGH 1e3

void measured_options_init(measured_options *options)
{
  *options = (measured_options){0};
  mho_trace_options_init(&options->traces);
  mho_histogram_options_init(&options->histogram);
  mho_telegraph_options_init(&options->blink);
}

static const struct {
  const char *name;
  measured_table table;
} selectors[] = {
    {"map", MEASURED_MAP},           {"peaks", MEASURED_PEAKS},
    {"comb", MEASURED_COMB},         {"plateaus", MEASURED_PLATEAUS},
    {"linear", MEASURED_LINEAR},     {"clusters", MEASURED_CLUSTERS},
    {"flicker", MEASURED_FLICKER},   {"correlation", MEASURED_CORRELATION},
    {"steps", MEASURED_STEPS},       {"dwells", MEASURED_DWELLS},
};

/* EXIT_RUNTIME where the option is no selector. */
static int read_selector(command *cmd, const char *name)
{
  const char *before = NULL;
  for (size_t i = 0; i < sizeof selectors / sizeof *selectors; i++)
    if (selectors[i].table == cmd->measured.table) before = selectors[i].name;
  for (size_t i = 0; i < sizeof selectors / sizeof *selectors; i++) {
    if (strcmp(selectors[i].name, name)) continue;
    if (before && selectors[i].table != cmd->measured.table)
      return usage_error(cmd->verb, "--%s and --%s exclude each other; one table a call", before,
                         name);
    cmd->measured.table = selectors[i].table;
    return EXIT_DONE;
  }
  return EXIT_RUNTIME;
}

static int read_flag(command *cmd, const char *name)
{
  measured_options *m = &cmd->measured;
  const struct { const char *name; bool *flag, value; } flags[] = {
      {"all", &m->all, true},
      {"rows", &m->traces.rows_are_traces, true},
      {"keep-going", &m->traces.keep_going, true},
      {"no-drift", &m->blink.drift, false}};
  for (size_t i = 0; i < sizeof flags / sizeof *flags; i++)
    if (!strcmp(flags[i].name, name)) *flags[i].flag = flags[i].value;
  return EXIT_DONE;
}

static int read_conductances(command *cmd, const char *text)
{
  mho_histogram_options *h = &cmd->measured.histogram;
  double low, high;
  int code = read_range(cmd, "conductances", text, MHO_CONDUCTANCE, "1e-7 G0, 10 G0", G0_LOW, G0_HIGH,
                        &low, &high);
  if (code != EXIT_DONE) return code;
  /* Whole bins: outwards to a tenth of a decade. */
  h->low_log10_g0 = floor(log10(low) * 10 + 1e-9) / 10;
  h->high_log10_g0 = ceil(log10(high) * 10 - 1e-9) / 10;
  h->linear_high_g0 = high;
  return EXIT_DONE;
}

static int read_trace_quantity(command *cmd, const char *text)
{
  static const struct { const char *name; mho_trace_quantity quantity; } known[] = {
      {"conductance_G0", MHO_TRACE_G0}, {"conductance_S", MHO_TRACE_SIEMENS},
      {"log10_G0", MHO_TRACE_LOG10_G0}, {"current_A", MHO_TRACE_AMPERE}};
  for (size_t i = 0; i < sizeof known / sizeof *known; i++) {
    if (strcmp(known[i].name, text)) continue;
    cmd->measured.traces.quantity = known[i].quantity;
    return EXIT_DONE;
  }
  return usage_error(cmd->verb, "--quantity: '%s' is not known; allowed are conductance_G0, "
                                "conductance_S, log10_G0 and current_A", text);
}

/* EXIT_RUNTIME where the option is no single quantity. */
static int read_single(command *cmd, const char *name, const char *text)
{
  measured_options *m = &cmd->measured;
  const struct {
    const char *name;
    mho_dimension dimension;
    double low, high, *value;
  } quantities[] = {
      {"crossing", MHO_CONDUCTANCE, G0_LOW, G0_HIGH, &m->histogram.crossing_g0},
      {"snap-back", MHO_LENGTH, 0, 100, &m->histogram.snap_back_nm},
      {"plateau-length", MHO_LENGTH, 0, 100, &m->histogram.plateau_nm},
      {"bandwidth", MHO_FREQUENCY, 1e-3, 1e10, &m->blink.bandwidth_hz},
      {"dead-time", MHO_TIME, 0, 1e6, &m->blink.dead_time_s}};
  for (size_t i = 0; i < sizeof quantities / sizeof *quantities; i++)
    if (!strcmp(quantities[i].name, name))
      return read_quantity(cmd->verb, name, text, quantities[i].dimension, quantities[i].low,
                           quantities[i].high, quantities[i].value);
  char reason[320];
  mho_status status = mho_trace_setting_read(&m->traces, name, text, reason, sizeof reason);
  if (status == MHO_ERR_KEY) return EXIT_RUNTIME;
  return status == MHO_OK ? EXIT_DONE : usage_error(cmd->verb, "--%s: %s", name, reason);
}

static int read_number(command *cmd, const char *name, const char *text)
{
  long value;
  int code;
  if (!strcmp(name, "bins")) {
    code = read_count(cmd->verb, name, text, 1, 1000, &value);
    if (code == EXIT_DONE) cmd->measured.histogram.bins_per_decade = (int)value;
  } else if (!strcmp(name, "levels")) {
    code = read_count(cmd->verb, name, text, 1, MHO_LEVEL_LIMIT, &value);
    if (code == EXIT_DONE) cmd->measured.blink.levels = (int)value;
  } else {
    code = read_count(cmd->verb, name, text, 1, 1024, &value);
    if (code == EXIT_DONE) omp_set_num_threads((int)value);
  }
  return code;
}

int read_measured_option(command *cmd, const char *name, const char *text)
{
  measured_options *m = &cmd->measured;
  if (!text) {
    int code = read_selector(cmd, name);
    return code == EXIT_RUNTIME ? read_flag(cmd, name) : code;
  }
  int code = read_single(cmd, name, text);
  if (code != EXIT_RUNTIME) return code;
  if (!strcmp(name, "conductances")) return read_conductances(cmd, text);
  if (!strcmp(name, "distances"))
    return read_range(cmd, name, text, MHO_LENGTH, "-0.5 nm, 2.5 nm", -1000, 1000,
                      &m->histogram.map_low_nm, &m->histogram.map_high_nm);
  if (!strcmp(name, "search")) {
    m->has_search = true;
    return read_range(cmd, name, text, MHO_CONDUCTANCE, "1e-5 G0, 0.1 G0", G0_LOW, G0_HIGH,
                      &m->search_low_g0, &m->search_high_g0);
  }
  if (!strcmp(name, "quantity")) return read_trace_quantity(cmd, text);
  if (!strcmp(name, "figure")) return read_svg_name(cmd, name, text, &cmd->measured.figure);
  if (strcmp(name, "columns")) return read_number(cmd, name, text);
  m->traces.columns = text;
  return EXIT_DONE;
}

static bool show_bytes(void *context, uint64_t bytes, uint64_t total)
{
  byte_progress *progress = context;
  double now = seconds_now();
  if (now < progress->start) return true;
  progress->start = now + 0.1; /* of the next drawing */
  progress->shown = true;
  draw_bar(total > 0 ? (double)bytes / (double)total : 1, "%.0f of %.0f MB", (double)bytes / 1e6,
           (double)total / 1e6);
  return true;
}

void begin_byte_progress(const command *cmd, byte_progress *progress, mho_trace_options *traces)
{
  *progress = (byte_progress){.start = seconds_now() + 1.0};
  if (cmd->quiet || !isatty(STDERR_FILENO)) return;
  traces->progress = show_bytes;
  traces->context = progress;
}

void end_byte_progress(const byte_progress *progress)
{
  if (progress->shown) clear_bar();
}

mho_status check_any_file(const mho_trace_report *report)
{
  return report->failed_files < report->files ? MHO_OK : MHO_ERR_FILE; /* told already */
}

static mho_status fail_write(const char *path, mho_error *error)
{
  return mho_fail_at(error, MHO_ERR_WRITE, "cli", path, 0, 0, "figure", "cannot be written: %s",
                     strerror(errno));
}

mho_status figure_write(const command *cmd, const mho_buffer *script, mho_error *error)
{
  const char *path = cmd->measured.figure, *folder = getenv("TMPDIR");
  FILE *file = fopen(path, "w"); /* gnuplot could not say why */
  if (!file || fclose(file) != 0) return fail_write(path, error);
  char *name = mho_print_text("%s/mho-figure-XXXXXX", folder && *folder ? folder : "/tmp");
  int handle = name ? mkstemp(name) : -1;
  bool available = true;
  mho_status status = MHO_OK;
  if (!name) status = mho_fail(error, MHO_ERR_MEMORY, "cli", NULL, "out of memory");
  else if (handle < 0) status = fail_write(name, error);
  else {
    close(handle);
    status = mho_buffer_save(script, name, "cli", error);
    if (status == MHO_OK) status = mho_figure_render(name, path, &available, error);
    remove(name);
  }
  if (status != MHO_OK || !available) remove(path);
  if (!available) fprintf(stderr, "mho %s: gnuplot was not found: no figure\n", cmd->verb);
  free(name);
  return status;
}
