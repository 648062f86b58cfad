/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "check.h"

#include <mho/constants.h>
#include <mho/histogram.h>
#include <mho/traces.h>

#include "measure/number_shape.h"
#include "measure/reader.h"
#include "base/random.h"

#include <stdlib.h>
#include <sys/stat.h>
#include <unistd.h>
#include <zlib.h>

static char folder[] = "/tmp/mho-traces-XXXXXX";
static char path[64];

static int make_folder(void **state)
{
  (void)state;
  if (!mkdtemp(folder)) return -1;
  snprintf(path, sizeof path, "%s/trace", folder);
  return 0;
}

static int remove_folder(void **state)
{
  (void)state;
  unlink(path);
  return rmdir(folder);
}

static void write_bytes(const char *bytes, size_t size)
{
  FILE *file = fopen(path, "wb");
  assert_non_null(file);
  assert_int_equal(fwrite(bytes, 1, size, file), size);
  assert_int_equal(fclose(file), 0);
}

/* All points of the file, one trace behind the other. */
typedef struct {
  mho_status status;
  size_t count, traces;
  double g0[4096], x[4096];
  size_t end[64]; /* behind each trace */
  bool has_x;
  mho_trace_report report;
  char message[1200];
} reading;

static reading *read_with(const mho_trace_options *options, mho_abscissa wanted)
{
  static reading r;
  memset(&r, 0, sizeof r);
  mho_error error;
  mho_error_init(&error);
  const char *const paths[] = {path};
  mho_trace_reader *reader;
  r.status = mho_trace_reader_create(paths, 1, options, wanted, &reader, &error);
  bool more = r.status == MHO_OK;
  while (more) {
    mho_trace_chunk chunk;
    r.status = mho_trace_reader_next(reader, &chunk, &more, &error);
    if (!more) break;
    for (size_t i = 0; i < chunk.count && r.count < 4096; i++, r.count++) {
      r.g0[r.count] = chunk.g0[i];
      if (chunk.x) r.x[r.count] = chunk.x[i], r.has_x = true;
    }
    if (chunk.last && r.traces < 64) r.end[r.traces++] = r.count;
  }
  if (reader) r.report = *mho_trace_reader_report(reader);
  if (error.count) mho_cause_format(&error.cause[0], r.message, sizeof r.message);
  mho_trace_reader_free(reader);
  return &r;
}

static reading *read_text(const char *text, const mho_trace_options *options)
{
  write_bytes(text, strlen(text));
  return read_with(options, MHO_ABSCISSA_DISTANCE);
}

static mho_trace_options plain(void)
{
  mho_trace_options options;
  mho_trace_options_init(&options);
  return options;
}

/* The fast reader against strtod (C library), bit for bit. */
static void decimals_are_correctly_rounded(void **state)
{
  (void)state;
  static const char *const formats[] = {"%.17g", "%.18e", "%.6e", "%.3f", "%.12g", "%.16e", "%+.20f"};
  mho_random random = mho_random_stream(7, 1);
  for (int i = 0; i < 200000; i++) {
    char text[128] = {0};
    double value = ((double)(mho_random_bits(&random) >> 11) * 0x1p-53 - 0.5) *
                   pow(10.0, (double)mho_random_below(&random, 60) - 40.0);
    snprintf(text, 64, formats[i % 7], value);
    const char *end;
    double got, expected = strtod(text, NULL);
    assert_true(mho_decimal_read(text, &end, &got));
    if (memcmp(&got, &expected, sizeof got) != 0) fail_msg("%s read as %.17g", text, got);
    assert_int_equal(*end, '\0');
  }
}

static void odd_numbers(void **state)
{
  (void)state;
  static const struct { const char *text; double value; size_t length; } good[] = {
      {"1", 1, 1}, {"-0", 0, 2}, {"+.5,", 0.5, 3}, {"5. ", 5, 2}, {"1e5x", 1e5, 3},
      {"1e", 1, 1}, {"1e+", 1, 1}, {"00012.50", 12.5, 8}, {"0x10", 0, 1},
      {"9007199254740993", 9007199254740992.0, 16}, /* a tie goes to even */
      {"9007199254740993.00000000000000001", 9007199254740994.0, 34},
      {"17976931348623157e292", 1.7976931348623157e308, 21},
      {"4.9e-324", 4.9406564584124654e-324, 8}, {"1e-400", 0, 6}};
  for (size_t i = 0; i < sizeof good / sizeof *good; i++) {
    char text[128] = {0};
    snprintf(text, sizeof text, "%s", good[i].text);
    const char *end;
    double value;
    assert_true(mho_decimal_read(text, &end, &value));
    assert_close(value, good[i].value, 0.0);
    assert_int_equal(end - text, good[i].length);
  }
  static const char *const bad[] = {"", ".", "-", "e5", "nan", "inf", "1e999", "x", "-.e1"};
  for (size_t i = 0; i < sizeof bad / sizeof *bad; i++) {
    char text[64] = {0};
    snprintf(text, sizeof text, "%s", bad[i]);
    const char *end;
    double value;
    assert_false(mho_decimal_read(text, &end, &value));
  }
}

static void separators_headers_and_comments(void **state)
{
  (void)state;
  static const char *const same[] = {
      "0.1 1e-3\n0.2 2e-3\n0.3 3e-3\n",
      "0.1,1e-3\n0.2,2e-3\n0.3,3e-3",
      "0.1\t1e-3\r\n0.2\t2e-3\r\n0.3\t3e-3\r\n",
      "0.1; 1e-3\n 0.2 ;2e-3 \n0.3;3e-3\n",
      "# made by hand\n% and more\ndistance_nm,conductance_G0\n0.1,1e-3\n# between\n0.2,2e-3\n0.3,3e-3\n",
      "\xef\xbb\xbf" "conductance_G0 distance_nm\n1e-3 0.1\n2e-3 0.2\n3e-3 0.3\n",
      "# distance_nm log10_G0\n0.1 -3\n0.2 -2.69897000433601880\n0.3 -2.52287874528033756\n",
      "Displacement (angstrom);note;Conductance [G0]\n1;a;1e-3\n2;b c;2e-3\n3;;3e-3\n",
      "\n\n0.1 1e-3\n0.2 2e-3\n0.3 3e-3\n\n\n"};
  mho_trace_options options = plain();
  for (size_t i = 0; i < sizeof same / sizeof *same; i++) {
    reading *r = read_text(same[i], &options);
    if (r->status != MHO_OK) fail_msg("%zu: %s", i, r->message);
    assert_int_equal(r->count, 3);
    assert_int_equal(r->traces, 1);
    for (int k = 0; k < 3; k++) {
      assert_close(r->g0[k], 1e-3 * (k + 1), 1e-14);
      assert_close(r->x[k], 0.1 * (k + 1), 1e-14);
    }
  }
}

static void quantities_become_g0(void **state)
{
  (void)state;
  mho_trace_options options = plain();
  reading *r = read_text("conductance_nS\n77480.91729863649\n", &options); /* G0, SI of 2019 */
  assert_close(r->g0[0], 1.0, 1e-14);
  options.bias_v = -0.1;
  r = read_text("time_ms,current_nA\n1,-7748.091729863649\n2,774.8091729863649\n", &options);
  assert_close(r->g0[0], 1.0, 1e-14);
  assert_close(r->g0[1], -0.1, 1e-14);
  assert_false(r->has_x); /* a time is no distance without a speed */
  assert_int_equal(r->report.not_positive, 1);
  options.speed_nm_per_s = 20.0;
  r = read_text("time_ms,current_nA\n1,-7748.091729863649\n2,774.8091729863649\n", &options);
  assert_close(r->x[1], 0.04, 1e-14);
  /* 1 kohm in series with a junction of 1 G0: I = V/(R + 1/G0). */
  options = plain();
  options.bias_v = 0.1;
  options.series_ohm = 1000.0;
  char text[64];
  snprintf(text, sizeof text, "%.17g\n", 0.1 / (1000.0 + 1.0 / MHO_CONDUCTANCE_QUANTUM_S));
  r = read_text(text, &options);
  assert_close(r->g0[0], 1.0, 1e-13);
}

static void every_kind_of_point_is_counted(void **state)
{
  (void)state;
  mho_trace_options options = plain();
  options.floor_g0 = 1e-6;
  options.saturation_g0 = 5.0;
  reading *r = read_text("1,1e-3\n2,nan\n3,\n4,-1e-7\n5,0\n6,1e-7\n7,5\n8,-inf\n9,1e-6\n", &options);
  assert_int_equal(r->status, MHO_OK);
  assert_int_equal(r->report.points, 9);
  assert_int_equal(r->report.not_finite, 3);
  assert_int_equal(r->report.not_positive, 2);
  assert_int_equal(r->report.below_floor, 1);
  assert_int_equal(r->report.saturated, 1);
  for (size_t i = 0; i < r->count; i++) assert_false(isinf(r->g0[i]));
}

static void traces_are_told_apart(void **state)
{
  (void)state;
  mho_trace_options options = plain();
  reading *r = read_text("1\n2\n\n3\n  \n\n4\n5\n6\n", &options);
  assert_int_equal(r->traces, 3);
  assert_int_equal(r->end[0], 2);
  assert_int_equal(r->end[1], 3);
  r = read_text("trace,distance_nm,conductance_G0\n1,0,1\n1,1,1\n2,2,1\n5,0,1\n5,1,1\n", &options);
  assert_int_equal(r->traces, 3);
  assert_int_equal(r->end[1], 3);
  r = read_text("distance_nm conductance_G0\n0 1\n1 1\ndistance_nm conductance_G0\n2 1\n", &options);
  assert_int_equal(r->traces, 2);
  /* A spring back by more than half: 20 points up, and again. */
  char text[4000];
  size_t used = 0;
  for (int i = 0; i < 60; i++)
    used += (size_t)sprintf(text + used, "%d.5 1e-3\n", i % 20);
  r = read_text(text, &options);
  assert_int_equal(r->traces, 3);
  assert_int_equal(r->end[0], 20);
  /* A jitter of the abscissa is none. */
  used = 0;
  for (int i = 0; i < 60; i++)
    used += (size_t)sprintf(text + used, "%d 1e-3\n", i % 2 ? i - 2 : i);
  assert_int_equal(read_text(text, &options)->traces, 1);
}

static void bad_files_are_refused_at_their_place(void **state)
{
  (void)state;
  static const struct { const char *text; const char *message; } bad[] = {
      {"1 2\n3 4\n5 x6\n", ":3:3: 'x6' is not a finite decimal number"},
      {"1,2\n3,4,5\n", ":2:1: 3 columns; 2 are needed"},
      {"1,2\n3\n", ":2:1: 1 columns; 2 are needed"},
      {"1;2\n3;4,5\n", ":2:3: '4,5' is not a finite decimal number (write a decimal point"},
      {"1 2 3\n", ":1:1: 3 columns without a header"},
      {"hello world\n", ":1:1: no column of conductance or current is named"},
      {"distance_nm,conductance_parsec\n", "has the unit 'parsec'; G0, S"},
      {"distance_nm,current_nA\n1,2\n", "the bias is needed"},
      {"1.5\n2.5e\n", ":2:1: '2.5e' is not"},
      {"1.5\n1e999\n", ":2:1: '1e999' is not"},
      {"1.5\n0x10\n", ":2:1: '0x10' is not"},
      {"# only a comment\n", "holds no numbers"},
      {"", ":1:1: the file is empty"},
      {"%PDF-1.5\n\x01\x02", "is a file of another kind (byte 0x01"},
      {"conductance_G0,current_A\n1,2\n", ":1:16: a second column"}};
  mho_trace_options options = plain();
  for (size_t i = 0; i < sizeof bad / sizeof *bad; i++) {
    reading *r = read_text(bad[i].text, &options);
    assert_true(mho_status_is_input(r->status));
    if (!strstr(r->message, bad[i].message)) fail_msg("%zu: %s", i, r->message);
    assert_non_null(strstr(r->message, path));
  }
  write_bytes("1\n2\n\0\n", 6);
  assert_true(mho_status_is_input(read_with(&options, MHO_ABSCISSA_NONE)->status));
  options.columns = "distance_nm,conductance_G0";
  assert_non_null(strstr(read_text("1 2 3\n", &options)->message, "3 columns, but --columns names 2"));
}

static void one_endless_line_and_a_million_columns(void **state)
{
  (void)state;
  size_t size = 4 << 20;
  char *text = malloc(size);
  assert_non_null(text);
  memset(text, '1', size);
  mho_trace_options options = plain();
  write_bytes(text, size);
  reading *r = read_with(&options, MHO_ABSCISSA_NONE);
  assert_int_equal(r->status, MHO_ERR_LIMIT);
  for (size_t i = 1; i < 1000000; i += 2) text[i] = ',';
  text[999999] = '\n';
  write_bytes(text, 1000000);
  r = read_with(&options, MHO_ABSCISSA_NONE);
  assert_int_equal(r->status, MHO_ERR_LIMIT);
  assert_non_null(strstr(r->message, "more than 64 columns"));
  free(text);
}

static void gzip_is_read_and_its_end_checked(void **state)
{
  (void)state;
  gzFile zip = gzopen(path, "wb");
  for (int trace = 0; trace < 3; trace++) {
    for (int i = 0; i < 1000; i++) gzprintf(zip, "%.9g\n", 1e-3 / (i * 7919 % 1000 + 1.0 + trace));
    gzprintf(zip, "\n");
  }
  assert_int_equal(gzclose(zip), Z_OK);
  mho_trace_options options = plain();
  reading *r = read_with(&options, MHO_ABSCISSA_NONE);
  assert_int_equal(r->status, MHO_OK);
  assert_int_equal(r->traces, 3);
  assert_int_equal(r->report.points, 3000);
  struct stat state_of_file;
  assert_int_equal(stat(path, &state_of_file), 0);
  for (off_t cut = 1; cut <= 9; cut += 4) { /* also within the check sum */
    assert_int_equal(truncate(path, state_of_file.st_size - cut), 0);
    r = read_with(&options, MHO_ABSCISSA_NONE);
    assert_int_equal(r->status, MHO_ERR_FILE);
    assert_int_equal(r->report.truncated_files, 1);
    assert_non_null(strstr(r->message, "truncated"));
  }
}

static void other_files_go_on(void **state)
{
  (void)state;
  write_bytes("1\n2\n\n3\nx\n", 9);
  const char *const paths[] = {path, "/nonexistent/trace", path};
  mho_trace_options options = plain();
  options.keep_going = true;
  mho_error error;
  mho_error_init(&error);
  mho_histogram_options h;
  mho_histogram_options_init(&h);
  h.high_log10_g0 = 2.0;
  mho_histogram *histogram;
  assert_int_equal(mho_histogram_read(paths, 3, &options, &h, &histogram, &error), MHO_OK);
  assert_int_equal(error.count, 3);
  assert_int_equal(histogram->report.failed_files, 3);
  assert_int_equal(histogram->report.traces, 2);
  assert_int_equal(histogram->report.abandoned_traces, 2);
  assert_int_equal(histogram->report.abandoned_points, 2);
  uint64_t binned = 0;
  for (int i = 0; i < histogram->all.bins; i++) binned += histogram->all.count[i];
  assert_int_equal(binned, 4); /* what a failed file left unfinished is out */
  mho_histogram_free(histogram);
}

static const char *const forms[] = {"%.6e", "%.4f", "%.3E", "%.0f", "%.9g", "%.17g", "%+.2f", "%.11f"};

#ifdef MHO_HAS_NUMBER_SHAPES
MHO_SHAPE_PROCESSOR static bool read_shape(const mho_number_shape *shape, const char *s,
                                           const char **end, double *value)
{
  return mho_shape_read(shape, s, end, value);
}
#endif

/* A number read by the form of another one is that of the general reader, bit
 * for bit, also where a byte of it is wrong. */
static void numbers_are_read_by_their_form(void **state)
{
  (void)state;
#ifdef MHO_HAS_NUMBER_SHAPES
  if (!__builtin_cpu_supports("x86-64-v3")) skip();
  mho_random random = mho_random_stream(7, 2);
  size_t by_form = 0, odd = 0;
  for (int i = 0; i < 200000; i++) {
    char text[2][128] = {{0}, {0}};
    for (int j = 0; j < 2; j++)
      snprintf(text[j], 64, forms[i % 8],
               ((double)(mho_random_bits(&random) >> 11) * 0x1p-53 - 0.5) *
                   pow(10.0, (double)mho_random_below(&random, 8) - 4.0));
    mho_number_shape shape;
    const char *end, *end_by_form;
    double expected, got;
    assert_true(mho_decimal_read(text[0], &end, &expected));
    mho_shape_learn(&shape, text[0], end);
    if (i % 3 == 0) /* a byte of the table, or the end of the number */
      text[1][mho_random_below(&random, strlen(text[1]))] = "09.eE+-x, \n\0"[mho_random_below(&random, 12)];
    if (!read_shape(&shape, text[1], &end_by_form, &got)) continue;
    by_form++;
    if (!mho_decimal_read(text[1], &end, &expected) || end != end_by_form) {
      if (!strchr(".eE", *end_by_form)) fail_msg("%s read up to %s", text[1], end_by_form);
      odd++; /* a longer number, which is no line end: the general reader takes it */
    } else if (memcmp(&got, &expected, sizeof got) != 0) {
      fail_msg("%s read as %.17g", text[1], got);
    }
  }
  assert_true(by_form > 50000 && odd < 1000);
#endif
}

/* Both ways of the text reader, over traces whose numbers change their form. */
static void both_ways_of_reading_agree(void **state)
{
  (void)state;
  enum { LINES = 20000 };
  static double value[2][2 * LINES];
  FILE *file = fopen(path, "wb");
  assert_non_null(file);
  mho_random random = mho_random_stream(7, 3);
  for (int i = 0; i < LINES; i++) {
    const char *form = forms[i / 700 % 9 < 8 ? i / 700 % 9 : (int)mho_random_below(&random, 8)];
    double u = (double)(mho_random_bits(&random) >> 11) * 0x1p-53;
    fprintf(file, i % 1000 == 999 ? "# a comment\n%.4f " : "%.4f ", -0.5 + i * 1e-4);
    fprintf(file, form, pow(10.0, 2.0 - 6.0 * u));
    fputs(i % 17 ? "\n" : " \r\n", file);
  }
  assert_int_equal(fclose(file), 0);
  const char *const paths[] = {path};
  mho_trace_options options = plain();
  for (int way = 0; way < 2; way++) {
    mho_trace_reader *reader;
    mho_trace_chunk chunk;
    bool more = true;
    size_t count = 0;
    assert_int_equal(mho_trace_reader_create(paths, 1, &options, MHO_ABSCISSA_DISTANCE, &reader, NULL), MHO_OK);
    reader->shapes = reader->shapes && way == 0;
    for (;;) {
      assert_int_equal(mho_trace_reader_next(reader, &chunk, &more, NULL), MHO_OK);
      if (!more) break;
      memcpy(value[way] + count, chunk.g0, chunk.count * sizeof(double));
      memcpy(value[way] + LINES + count, chunk.x, chunk.count * sizeof(double));
      count += chunk.count;
    }
    assert_int_equal(count, LINES);
    mho_trace_reader_free(reader);
  }
  assert_memory_equal(value[0], value[1], sizeof value[0]);
}

static bool stop_at_once(void *context, uint64_t bytes, uint64_t total)
{
  (void)context;
  assert_true(bytes <= total);
  return false;
}

static void reading_can_be_cancelled(void **state)
{
  (void)state;
  mho_trace_options options = plain();
  options.progress = stop_at_once;
  assert_int_equal(read_text("1\n2\n", &options)->status, MHO_ERR_CANCELLED);
}

int main(void)
{
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(decimals_are_correctly_rounded),
      cmocka_unit_test(odd_numbers),
      cmocka_unit_test(separators_headers_and_comments),
      cmocka_unit_test(quantities_become_g0),
      cmocka_unit_test(every_kind_of_point_is_counted),
      cmocka_unit_test(traces_are_told_apart),
      cmocka_unit_test(bad_files_are_refused_at_their_place),
      cmocka_unit_test(one_endless_line_and_a_million_columns),
      cmocka_unit_test(gzip_is_read_and_its_end_checked),
      cmocka_unit_test(other_files_go_on),
      cmocka_unit_test(numbers_are_read_by_their_form),
      cmocka_unit_test(both_ways_of_reading_agree),
      cmocka_unit_test(reading_can_be_cancelled),
  };
  return cmocka_run_group_tests(tests, make_folder, remove_folder);
}
