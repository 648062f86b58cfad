/* SPDX-License-Identifier: GPL-3.0-or-later */
#include <mho/status.h>

#include <stdarg.h>
#include <stdio.h>
#include <string.h>

static const struct {
  const char *text;
  bool input;
} status_table[] = {
#define MHO_STATUS_ROW(code, text, input) {text, input},
    MHO_STATUS_LIST(MHO_STATUS_ROW)
#undef MHO_STATUS_ROW
};

enum { STATUS_COUNT = sizeof status_table / sizeof *status_table };

const char *mho_version(void) { return MHO_VERSION; }

const char *mho_status_text(mho_status status)
{
  return (unsigned)status < STATUS_COUNT ? status_table[status].text
                                         : "an unknown status";
}

bool mho_status_is_input(mho_status status)
{
  return (unsigned)status < STATUS_COUNT && status_table[status].input;
}

void mho_error_init(mho_error *error)
{
  if (error) memset(error, 0, sizeof *error);
}

static void copy_text(char *target, size_t size, const char *source)
{
  snprintf(target, size, "%s", source ? source : "");
}

static mho_status add_cause(mho_error *error, mho_status status,
                            const char *stage, const char *file, long line,
                            long column, const char *field, const char *format,
                            va_list arguments)
{
  if (!error) return status;
  if (error->count >= MHO_ERROR_CAPACITY) {
    error->suppressed++;
    return status;
  }
  mho_cause *cause = &error->cause[error->count++];
  cause->status = status;
  copy_text(cause->stage, sizeof cause->stage, stage);
  copy_text(cause->file, sizeof cause->file, file);
  copy_text(cause->field, sizeof cause->field, field);
  cause->line = line;
  cause->column = column;
  vsnprintf(cause->message, sizeof cause->message, format, arguments);
  return status;
}

mho_status mho_fail(mho_error *error, mho_status status, const char *stage,
                    const char *field, const char *format, ...)
{
  va_list arguments;
  va_start(arguments, format);
  add_cause(error, status, stage, NULL, 0, 0, field, format, arguments);
  va_end(arguments);
  return status;
}

mho_status mho_fail_at(mho_error *error, mho_status status, const char *stage,
                       const char *file, long line, long column,
                       const char *field, const char *format, ...)
{
  va_list arguments;
  va_start(arguments, format);
  add_cause(error, status, stage, file, line, column, field, format, arguments);
  va_end(arguments);
  return status;
}

int mho_cause_format(const mho_cause *cause, char *buffer, size_t size)
{
  if (!cause->file[0]) return snprintf(buffer, size, "%s", cause->message);
  if (!cause->line)
    return snprintf(buffer, size, "%s: %s", cause->file, cause->message);
  return snprintf(buffer, size, "%s:%ld:%ld: %s", cause->file, cause->line,
                  cause->column, cause->message);
}
