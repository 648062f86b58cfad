/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Preloaded: the allocation number FAIL_AT (from 1) returns NULL, and so does
 * every later one if FAIL_ON is set.  With FAIL_COUNT the number of
 * allocations goes to that file at exit.
 */
#include <dlfcn.h>
#include <errno.h>
#include <stdio.h>
#include <stdlib.h>

static long calls, fail_at = -1;
static int fail_on;

__attribute__((constructor)) static void begin(void)
{
  const char *text = getenv("FAIL_AT");
  fail_on = getenv("FAIL_ON") != NULL;
  calls = 0;
  fail_at = text ? atol(text) : 0;
}

__attribute__((destructor)) static void end(void)
{
  const char *path = getenv("FAIL_COUNT");
  long total = calls;
  fail_at = 0;
  FILE *file = path ? fopen(path, "w") : NULL;
  if (!file) return;
  fprintf(file, "%ld\n", total);
  fclose(file);
}

static int fails(void)
{
  if (fail_at < 0) return 0; /* before main */
  long call = ++calls;
  int failing = fail_at > 0 && (call == fail_at || (fail_on && call > fail_at));
  if (failing) errno = ENOMEM; /* glibc asserts it when a thread is made */
  return failing;
}

void *malloc(size_t size)
{
  static void *(*real)(size_t);
  if (!real) *(void **)&real = dlsym(RTLD_NEXT, "malloc");
  return fails() ? NULL : real(size);
}

void *realloc(void *old, size_t size)
{
  static void *(*real)(void *, size_t);
  if (!real) *(void **)&real = dlsym(RTLD_NEXT, "realloc");
  return fails() ? NULL : real(old, size);
}

void *aligned_alloc(size_t alignment, size_t size)
{
  static void *(*real)(size_t, size_t);
  if (!real) *(void **)&real = dlsym(RTLD_NEXT, "aligned_alloc");
  return fails() ? NULL : real(alignment, size);
}

void *calloc(size_t count, size_t size)
{
  /* dlsym itself calls calloc: give it static memory until it has answered. */
  static void *(*real)(size_t, size_t);
  static char early[4096];
  static size_t used;
  static int asking;
  if (!real && !asking) {
    asking = 1;
    *(void **)&real = dlsym(RTLD_NEXT, "calloc");
    asking = 0;
  }
  if (!real) {
    size_t bytes = (count * size + 15) & ~(size_t)15;
    void *memory = used + bytes <= sizeof early ? early + used : NULL;
    used += bytes;
    return memory;
  }
  return fails() ? NULL : real(count, size);
}
