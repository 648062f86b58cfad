/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Mutated molecule and study files: read without crash, hang or leak; what is
 * accepted gives finite transmissions.  Seeded and bounded: usage
 * `fuzz_input COUNT FILE...`.
 */
#include <mho/mho.h>

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

static unsigned long long state = 88172645463325252ULL;

static unsigned random_below(unsigned n)
{
  state ^= state << 13; /* xorshift64: G. Marsaglia, J. Stat. Softw. 8, 14 (2003) */
  state ^= state >> 7;
  state ^= state << 17;
  return (unsigned)((state >> 16) % n);
}

static size_t mutate(char *text, size_t size, size_t capacity)
{
  static const char *const pieces[] = {"eV", "- {", "}", "]", "[", "&a ", "*a", ": ", "\n", "  ",
                                       "1e308", "-0", "nan", "'", "\"", "!!x ", "---\n", "\xff",
                                       "\t", "0", "90 deg", "1e-9 eV", "homo + ", "a1", "|", "%"};
  for (unsigned k = 1 + random_below(4); k > 0; k--) {
    size_t at = random_below((unsigned)size + 1);
    const char *piece = pieces[random_below(sizeof pieces / sizeof *pieces)];
    size_t length = strlen(piece), cut = random_below(8);
    switch (random_below(4)) {
    case 0: /* insert */
      if (size + length >= capacity) break;
      memmove(text + at + length, text + at, size - at);
      memcpy(text + at, piece, length);
      size += length;
      break;
    case 1: /* delete */
      if (at + cut > size) break;
      memmove(text + at, text + at + cut, size - at - cut);
      size -= cut;
      break;
    case 2: /* overwrite a byte */
      if (at < size) text[at] = (char)random_below(256);
      break;
    default: /* repeat a part */
      cut *= 16;
      if (at + cut > size || size + cut >= capacity) break;
      memmove(text + at + cut, text + at, size - at);
      size += cut;
    }
  }
  return size;
}

static int try_molecule(const char *path)
{
  mho_molecule molecule;
  mho_junction junction;
  mho_error error;
  mho_error_init(&error);
  int accepted = 0;
  if (mho_molecule_read(path, NULL, NULL, &molecule, &error) == MHO_OK) {
    mho_plan *plan = NULL;
    mho_status status = mho_junction_build(&molecule, &junction, &error);
    if (status == MHO_OK) status = mho_plan_create(&junction, &plan, &error);
    double energy[] = {0.0, -2.7, 1.3};
    mho_point point[3];
    if (status == MHO_OK) {
      status = mho_transmission_sweep(plan, 3, energy, point, &error);
      for (int k = 0; k < 3; k++)
        if (status != MHO_OK || !isfinite(point[k].transmission) ||
            point[k].transmission < 0 || point[k].transmission > mho_plan_channels(plan))
          abort();
      accepted = 1;
    }
    mho_plan_free(plan);
    mho_junction_clear(&junction);
  } else if (error.count == 0) {
    abort(); /* refused without a word */
  }
  mho_molecule_clear(&molecule);
  return accepted;
}

int main(int argc, char **argv)
{
  enum { CAPACITY = 1 << 16 };
  if (argc < 3) return 2;
  long count = atol(argv[1]), accepted = 0;
  char *original = malloc(CAPACITY), *text = malloc(CAPACITY);
  char path[] = "/tmp/mho-fuzz-XXXXXX";
  int handle = mkstemp(path);
  if (!original || !text || handle < 0) return 2;
  for (long i = 0; i < count; i++) {
    FILE *file = fopen(argv[2 + i % (argc - 2)], "rb");
    if (!file) return 2;
    size_t size = fread(original, 1, CAPACITY / 2, file);
    fclose(file);
    memcpy(text, original, size);
    size = mutate(text, size, CAPACITY);
    if (ftruncate(handle, 0) || pwrite(handle, text, size, 0) != (ssize_t)size) return 2;
    accepted += try_molecule(path);
    mho_study *study = NULL;
    mho_error error;
    mho_error_init(&error);
    if (mho_study_read(path, NULL, &study, &error) == MHO_OK) mho_study_free(study);
    else if (error.count == 0) abort();
  }
  close(handle);
  unlink(path);
  free(original);
  free(text);
  printf("%ld files, %ld still accepted\n", count, accepted);
  return accepted > 0 && accepted < count ? 0 : 1;
}
