/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Junctions of tests/physics as plans.
 */
#ifndef MHOLECULE_TESTS_JUNCTIONS_H
#define MHOLECULE_TESTS_JUNCTIONS_H

#include "check.h"

#include <mho/transmission.h>

#include <jansson.h>
#include <stdlib.h>

#include "solver/plan.h"

#ifndef MHO_TEST_PHYSICS
#error "path of tests/physics is needed"
#endif

static inline json_t *load_json(const char *name)
{
  char path[1024];
  json_error_t problem;
  snprintf(path, sizeof path, "%s/%s", MHO_TEST_PHYSICS, name);
  json_t *root = json_load_file(path, 0, &problem);
  if (!root) fail_msg("%s: %s", path, problem.text);
  return root;
}

typedef struct {
  int sites;
  double *h;
  mho_lead lead[2];
} raw;

static inline double *read_numbers(const json_t *array)
{
  size_t n = json_array_size(array);
  double *value = malloc((n ? n : 1) * sizeof(double));
  for (size_t i = 0; i < n; i++) value[i] = json_number_value(json_array_get(array, i));
  return value;
}

static inline void read_lead(const json_t *channels, int sites, mho_lead *lead)
{
  size_t m = json_array_size(channels);
  lead->channels = (int)m;
  lead->coupling_ev = calloc(m, sizeof(double));
  lead->shift_ev = calloc(m, sizeof(double));
  lead->vector = calloc(m * (size_t)sites, sizeof(double));
  for (size_t c = 0; c < m; c++) {
    const json_t *channel = json_array_get(channels, c);
    lead->coupling_ev[c] = json_number_value(json_object_get(channel, "coupling"));
    double *vector = read_numbers(json_object_get(channel, "vector"));
    memcpy(lead->vector + c * (size_t)sites, vector, (size_t)sites * sizeof(double));
    free(vector);
  }
}

static inline void raw_read(const json_t *entry, raw *r)
{
  *r = (raw){0};
  r->sites = (int)json_integer_value(json_object_get(entry, "n"));
  size_t n = (size_t)r->sites;
  r->h = malloc(n * n * sizeof(double));
  for (size_t i = 0; i < n; i++) {
    double *row = read_numbers(json_array_get(json_object_get(entry, "H"), i));
    memcpy(r->h + i * n, row, n * sizeof(double));
    free(row);
  }
  read_lead(json_object_get(entry, "left"), r->sites, &r->lead[0]);
  read_lead(json_object_get(entry, "right"), r->sites, &r->lead[1]);
}

static inline void raw_clear(raw *r)
{
  free(r->h);
  for (int side = 0; side < 2; side++) {
    free(r->lead[side].coupling_ev);
    free(r->lead[side].shift_ev);
    free(r->lead[side].vector);
  }
}

/* With banded, elimination stays within the band however small the junction. */
static inline mho_plan *plan_of(const raw *r, bool exchanged, bool banded)
{
  mho_junction junction;
  mho_plan *plan = NULL;
  mho_error error;
  mho_error_init(&error);
  mho_status status = mho_junction_from_hamiltonian(
      r->sites, r->h, 0, 0.0, &r->lead[exchanged], &r->lead[!exchanged], &junction, &error);
  if (status == MHO_OK) status = mho_plan_create(&junction, &plan, &error);
  mho_junction_clear(&junction);
  if (status != MHO_OK) fail_msg("%s", error.cause[0].message);
  if (banded) plan->band = plan->bandwidth;
  return plan;
}

static inline mho_point at(const mho_plan *plan, double energy)
{
  mho_point point;
  assert_int_equal(mho_transmission_sweep(plan, 1, &energy, &point, NULL), MHO_OK);
  return point;
}

#endif
