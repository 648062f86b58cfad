/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Work that takes longer: a bar on the terminal, and what ends it early.
 */
#include <signal.h>
#include <stdarg.h>
#include <stdio.h>
#include <time.h>

#include "cli/command.h"

static volatile int interrupted;

static void on_signal(int number)
{
  (void)number;
  interrupted = 1;
}

const volatile int *catch_signals(void)
{
  struct sigaction action = {.sa_handler = on_signal};
  sigemptyset(&action.sa_mask);
  sigaction(SIGINT, &action, NULL);
  sigaction(SIGTERM, &action, NULL);
  sigaction(SIGHUP, &action, NULL);
  return &interrupted;
}

double seconds_now(void)
{
  struct timespec now;
  clock_gettime(CLOCK_MONOTONIC, &now);
  return (double)now.tv_sec + 1e-9 * (double)now.tv_nsec;
}

void draw_bar(double fraction, const char *format, ...)
{
  enum { BAR = 24 };
  int filled = fraction > 1 ? BAR : (int)(BAR * fraction);
  fprintf(stderr, "\r\033[K[%.*s%.*s] ", filled, "########################", BAR - filled,
          "........................");
  va_list arguments;
  va_start(arguments, format);
  vfprintf(stderr, format, arguments);
  va_end(arguments);
}

void clear_bar(void) { fprintf(stderr, "\r\033[K"); }
