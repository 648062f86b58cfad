/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "cli/command.h"
#include "report/figure.h"
#include "report/stages.h"

static mho_status draw(const command *cmd, const mho_telegraph *telegraph, mho_error *error)
{
  mho_buffer script = {0};
  mho_figure_dwells(&script, telegraph);
  mho_status status = mho_buffer_check(&script, "cli", error);
  if (status == MHO_OK) status = figure_write(cmd, &script, error);
  mho_buffer_clear(&script);
  return status;
}

static mho_status write_tables(const command *cmd, const mho_telegraph *telegraph, double floor_g0,
                               mho_error *error)
{
  mho_output output = {0};
  if (cmd->measured.table == MEASURED_STEPS) mho_step_rows(&output, telegraph);
  else if (cmd->measured.table == MEASURED_DWELLS) mho_dwell_rows(&output, telegraph);
  else mho_blink_rows(&output, telegraph);
  if (!cmd->quiet) {
    mho_blink_note(&output, telegraph);
    mho_reading_note(&output, &telegraph->report, floor_g0);
  }
  mho_status status = output_write(cmd, &output, error);
  mho_output_clear(&output);
  return status;
}

int command_blink(const command *cmd, mho_error *error)
{
  mho_trace_options traces = cmd->measured.traces;
  mho_telegraph telegraph;
  byte_progress progress;
  traces.first_column = MHO_ABSCISSA_TIME;
  begin_byte_progress(cmd, &progress, &traces);
  mho_status status =
      mho_telegraph_read((const char *const *)cmd->file, (size_t)cmd->files, &traces,
                         &cmd->measured.blink, &telegraph, error);
  end_byte_progress(&progress);
  if (status == MHO_OK) status = check_any_file(&telegraph.report);
  if (status == MHO_OK && cmd->measured.figure) status = draw(cmd, &telegraph, error);
  if (status == MHO_OK)
    status = write_tables(cmd, &telegraph, mho_trace_floor_g0(&traces), error);
  if (status == MHO_OK && telegraph.report.failed_files > 0) status = MHO_ERR_FILE;
  mho_telegraph_clear(&telegraph);
  return exit_of(status);
}
