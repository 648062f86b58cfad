/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Code for vectors gives the same bits whatever their width, on every processor.
 */
#include "random_junction.h"

#include "solver/lanes.h"
#include "solver/program.h"
#include "solver/reduction.h"
#include "solver/spectrum.h"

enum { WIDTHS = 3, SITES = 30, NUMBERS = 40000 };

typedef void forward(const mho_program *, const double *, size_t, double, mho_program_trace *);
typedef void backward(const mho_program *, const double *, mho_program_trace *);
typedef void sum(const mho_plan *, const double *, mho_spectrum_sums *);
typedef void run(const mho_reduction *, int, double *, double *);

static const struct {
  forward *forward;
  backward *backward;
  sum *sum;
  run *run;
} of_width[WIDTHS] = {
    {mho_program_forward_2, mho_program_backward_2, mho_spectrum_sum_2, mho_reduction_run_2},
#ifdef SEVERAL_PROCESSORS
    {mho_program_forward_4, mho_program_backward_4, mho_spectrum_sum_4, mho_reduction_run_4},
    {mho_program_forward_8, mho_program_backward_8, mho_spectrum_sum_8, mho_reduction_run_8},
#endif
};

/* Widths that this processor has. */
static int widths(void)
{
#ifdef SEVERAL_PROCESSORS
  return __builtin_cpu_supports("x86-64-v4") ? 3 : __builtin_cpu_supports("x86-64-v3") ? 2 : 1;
#else
  return 1;
#endif
}

/* What a width makes of a junction: numbers to compare bit by bit. */
static size_t numbers_of(int width, const mho_plan *plan, const double *energy, size_t count,
                         double *number)
{
  size_t filled = 0;
  mho_program_trace trace = {0};
  assert_int_equal(mho_program_trace_create(plan->program, &trace), MHO_OK);
  of_width[width].forward(plan->program, energy, count, plan->norm_ev, &trace);
  double transmission[PROGRAM_LANES], error[PROGRAM_LANES];
  mho_program_finish_pair(plan, &trace, transmission, error);
  of_width[width].backward(plan->program, energy, &trace);
  for (size_t l = 0; l < count; l++) {
    number[filled++] = transmission[l];
    number[filled++] = trace.error[l];
    number[filled++] = trace.broken[l];
  }
  mho_program_trace_clear(&trace);

  mho_spectrum_sums sums;
  of_width[width].sum(plan, energy, &sums);
  memcpy(number + filled, &sums, sizeof sums);
  filled += sizeof sums / sizeof *number;

  mho_reduction *reduction;
  assert_int_equal(mho_reduction_create(plan, &reduction), MHO_OK);
  assert_non_null(reduction);
  double *reduced = number + filled, inverse[REDUCTION_LANES];
  size_t slots = (size_t)reduction->slots;
  assert_true(filled + (slots + 1) * REDUCTION_LANES <= NUMBERS);
  for (size_t s = 0; s < slots; s++)
    for (size_t l = 0; l < REDUCTION_LANES; l++)
      reduced[s * REDUCTION_LANES + l] =
          (s < (size_t)reduction->sites ? energy[l] : 0) - reduction->value_ev[s];
  of_width[width].run(reduction, (int)(count < REDUCTION_FEW ? count : REDUCTION_LANES / 2), reduced,
                      inverse);
  filled += slots * REDUCTION_LANES;
  memcpy(number + filled, inverse, sizeof inverse);
  mho_reduction_free(reduction);
  return filled + REDUCTION_LANES;
}

static void every_width_gives_the_same_bits(void **state)
{
  (void)state;
  double *first = malloc(NUMBERS * sizeof(double)), *other = malloc(NUMBERS * sizeof(double));
  int compared = 0;
  for (int trial = 0; trial < 40; trial++) {
    double gamma[2], zero = 0, vectors[2 * SITES], energy[PROGRAM_LANES];
    raw r = random_junction(SITES, gamma, &zero, vectors);
    mho_plan *plan = plan_of(&r, false, false);
    for (int l = 0; l < PROGRAM_LANES; l++) energy[l] = 8 * uniform() - 4;
    bool single = plan->support[0] != plan->support[1];
    for (size_t count = 5; single && plan->program && count <= PROGRAM_LANES; count += 27) {
      size_t numbers = numbers_of(0, plan, energy, count, first);
      for (int width = 1; width < widths(); width++) {
        assert_int_equal(numbers_of(width, plan, energy, count, other), numbers);
        assert_memory_equal(first, other, numbers * sizeof *first);
        compared++;
      }
    }
    mho_plan_free(plan);
    free(r.h);
  }
  print_message("%d comparisons of %d widths\n", compared, widths());
  assert_true(widths() == 1 || compared > 20);
  free(first);
  free(other);
}

int main(void)
{
  const struct CMUnitTest tests[] = {cmocka_unit_test(every_width_gives_the_same_bits)};
  return cmocka_run_group_tests(tests, NULL, NULL);
}
