/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Structures when memory runs out: the n-th allocation fails, for every n.
 * The linker sends the library's allocations here; leaks show under the
 * address sanitizer.
 */
#include "check.h"

#include <mho/structure.h>

#include <stdlib.h>
#include <unistd.h>

#include "molecule/list.h"

void *__real_malloc(size_t size);
void *__real_calloc(size_t count, size_t size);
void *__real_realloc(void *memory, size_t size);
void *__wrap_malloc(size_t size);
void *__wrap_calloc(size_t count, size_t size);
void *__wrap_realloc(void *memory, size_t size);

static long remaining = -1; /* allocations until one fails; -1 never */

static bool fails(void) { return remaining >= 0 && remaining-- == 0; }

void *__wrap_malloc(size_t size) { return fails() ? NULL : __real_malloc(size); }

void *__wrap_calloc(size_t count, size_t size)
{
  return fails() ? NULL : __real_calloc(count, size);
}

void *__wrap_realloc(void *memory, size_t size)
{
  return fails() ? NULL : __real_realloc(memory, size);
}

static mho_status convert(const char *smiles, mho_alkyl alkyl)
{
  mho_molecule molecule;
  mho_structure structure;
  mho_structure_options options;
  mho_error error;
  mho_molecule_init(&molecule);
  mho_structure_init(&structure);
  mho_error_init(&error);
  mho_structure_options_init(&options);
  options.parameters = mho_parameters_builtin("streitwieser");
  options.alkyl = alkyl;
  mho_status status =
      mho_structure_read_smiles(smiles, &options, &molecule, &structure, &error);
  if (status != MHO_OK) assert_int_equal(error.cause[0].status, status);
  mho_structure_clear(&structure);
  mho_molecule_clear(&molecule);
  return status;
}

static void every_allocation_may_fail(void **state)
{
  (void)state;
  static const char *const smiles[] = {
      "[NH2:1]c1ccc(cc1)-c1c(C)cc(C#CC=N[NH2:2])cc1", "[NH2:1]c1c(C)cc([N+](=O)[O-])cc1C=C=C[NH2:2]",
      "[O-]C(=O)c1ccc(N)cc1"};
  for (size_t i = 0; i < sizeof smiles / sizeof *smiles; i++)
    for (int alkyl = 0; alkyl < 3; alkyl++) {
      mho_status status = MHO_ERR_MEMORY;
      long n = 0;
      for (; status != MHO_OK && n < 1000; n++) {
        remaining = n;
        status = convert(smiles[i], (mho_alkyl)alkyl);
        remaining = -1;
        assert_true(status == MHO_OK || status == MHO_ERR_MEMORY);
      }
      assert_in_range(n, 15, 999);
    }
}

static void lists_too(void **state)
{
  (void)state;
  char path[64];
  snprintf(path, sizeof path, "/tmp/mho-fault-%ld.csv", (long)getpid());
  FILE *file = fopen(path, "w");
  assert_non_null(file);
  fputs("smiles,name\nC=C,ethene\n", file);
  fclose(file);
  mho_status status = MHO_ERR_MEMORY;
  for (long n = 0; status != MHO_OK && n < 20; n++) {
    mho_list *list;
    remaining = n;
    status = mho_list_open(path, &list, NULL);
    remaining = -1;
    assert_true(status == MHO_OK || status == MHO_ERR_MEMORY);
    mho_list_close(list);
  }
  assert_int_equal(status, MHO_OK);
  unlink(path);
}

int main(void)
{
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(every_allocation_may_fail),
      cmocka_unit_test(lists_too),
  };
  return cmocka_run_group_tests(tests, NULL, NULL);
}
