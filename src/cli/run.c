/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "cli/command.h"

int command_run(const command *cmd, mho_error *error)
{
  (void)error;
  return usage_error(cmd->verb, "no");
}
