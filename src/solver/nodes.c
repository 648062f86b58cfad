/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Nodes in double precision (zeros.c) where that tells them apart, else in 113
 * bits.  There: zeros of the pencil's polynomial, started from the double eigenvalues of its
 * matrix, polished together (O. Aberth, Math. Comp. 27, 339 (1973)), joined
 * where 113 bits cannot tell them apart, and counted on a circle around.
 */
#include <mho/nodes.h>

#include <stdlib.h>
#include <string.h>

#include "base/lapack.h"
#include "solver/factors.h"
#include "solver/minima.h"
#include "solver/pencil.h"
#include "solver/zeros.h"

enum { ITERATIONS_MAX = 80 };

/* Other zeros are three radii away or more: so many points count well, and
 * find the mean of a cluster to 16 digits. */
enum { CIRCLE_POINTS = 8, CLUSTER_POINTS = 48 };

/* Corrections below this (times the norm) are rounding. */
#define FINISHED ((mho_quad)1e-31)

/* Steps below this (times the norm) that do not shrink fourfold are rounding. */
#define STANDS ((mho_quad)1e-20)

/* Zeros so near (times the norm) are one. */
#define SAME_ENERGY ((mho_quad)1e-13)

/* Radius of the circle around a node that stands alone, times the norm. */
#define CIRCLE ((mho_quad)1e-7)

/* A cluster is counted on a circle so much wider, where P is far above rounding. */
#define WIDER 500

/* An energy so small (times the norm) is that of alpha. */
#define TINY ((mho_quad)1e-25)

typedef struct {
  mho_quad_complex z;
  mho_quad radius; /* a zero lies within */
  int cluster;
} zero;

typedef struct {
  const mho_pencil *pencil;
  zero *zero;
  mho_quad_complex *work;
} search;

static mho_status start_block(const search *s, int block, mho_error *error)
{
  const mho_pencil *p = s->pencil;
  size_t first = (size_t)p->block[block], n = (size_t)p->block[block + 1] - first;
  double complex *matrix = malloc(n * n * sizeof *matrix), *value = malloc(n * sizeof *value);
  mho_status status = MHO_OK;
  if (!matrix || !value)
    status = mho_fail(error, MHO_ERR_MEMORY, "solver", NULL, "out of memory");
  for (size_t i = 0; status == MHO_OK && i < n; i++) /* transposed: the same eigenvalues */
    for (size_t j = 0; j < n; j++)
      matrix[i * n + j] = (double)p->matrix[(first + i) * (size_t)p->size + first + j];
  if (status == MHO_OK) status = mho_eigenvalues_complex((int)n, matrix, value, error);
  for (size_t i = 0; status == MHO_OK && i < n; i++) {
    /* apart from each other, or the correction below would divide by zero */
    __real__ s->zero[first + i].z = creal(value[i]) + (double)(p->norm * (mho_quad)1e-17) * (double)i;
    __imag__ s->zero[first + i].z = cimag(value[i]);
  }
  free(matrix);
  free(value);
  return status;
}

/* Newton's step at zero k with the other zeros of the block divided out. */
static mho_quad_complex correction(const search *s, int block, size_t k)
{
  size_t first = (size_t)s->pencil->block[block], end = (size_t)s->pencil->block[block + 1];
  mho_quad_complex value, derivative, others = 0;
  mho_pencil_evaluate(s->pencil, block, s->zero[k].z, s->work, &value, &derivative);
  if (mho_quad_size(value) == 0) return 0;
  for (size_t j = first; j < end; j++) {
    mho_quad_complex distance = s->zero[k].z - s->zero[j].z;
    if (j != k && mho_quad_size(distance) > 0) others += 1 / distance;
  }
  mho_quad_complex together = derivative / value - others;
  return mho_quad_size(together) > 0 ? 1 / together : 0;
}

/* Some zero of a polynomial of degree n lies within n |p/p'| (Laguerre). */
static void set_radius(const search *s, int block, zero *found)
{
  int degree = s->pencil->block[block + 1] - s->pencil->block[block];
  mho_quad_complex value, derivative;
  mho_quad noise = mho_pencil_noise(s->pencil, block, found->z, s->work);
  mho_pencil_evaluate(s->pencil, block, found->z, s->work, &value, &derivative);
  mho_quad size = mho_quad_size(value) + noise, slope = mho_quad_size(derivative);
  mho_quad least = 64 * FINISHED * s->pencil->norm;
  found->radius = slope > 0 ? 2 * degree * size / slope : s->pencil->norm;
  if (found->radius < least) found->radius = least;
}

static void polish_block(const search *s, int block)
{
  size_t first = (size_t)s->pencil->block[block], end = (size_t)s->pencil->block[block + 1];
  mho_quad finished = FINISHED * s->pencil->norm, last = INFINITY;
  for (size_t k = first; k < end; k++) s->zero[k].radius = INFINITY; /* of the last step */
  for (int iteration = 0; iteration < ITERATIONS_MAX; iteration++) {
    mho_quad largest = 0;
    for (size_t k = first; k < end; k++) {
      if (s->zero[k].radius <= finished) continue;
      mho_quad_complex step = correction(s, block, k);
      mho_quad size = mho_quad_size(step);
      s->zero[k].z -= step;
      bool stands = size < STANDS * s->pencil->norm && size > s->zero[k].radius / 4;
      s->zero[k].radius = stands ? 0 : size;
      if (s->zero[k].radius > largest) largest = s->zero[k].radius;
    }
    bool stuck = largest < (mho_quad)1e-3 * s->pencil->norm && largest > last / 2;
    if (largest <= finished || (stuck && iteration > 8)) break;
    last = largest;
  }
  for (size_t k = first; k < end; k++) set_radius(s, block, &s->zero[k]);
}

/* Zeros whose discs meet, or as near as rounding makes them, get one cluster
 * number, that of the first. */
static void join(const search *s)
{
  int n = s->pencil->size;
  for (int k = 0; k < n; k++) s->zero[k].cluster = k;
  for (int i = 0; i < n; i++)
    for (int j = 0; j < i; j++) {
      mho_quad distance = mho_quad_size(s->zero[i].z - s->zero[j].z);
      int from = s->zero[i].cluster, to = s->zero[j].cluster;
      bool apart = distance > s->zero[i].radius + s->zero[j].radius &&
                   distance > SAME_ENERGY * s->pencil->norm;
      if (from == to || apart) continue;
      for (int k = 0; k < n; k++)
        if (s->zero[k].cluster == from) s->zero[k].cluster = to;
    }
}

/* P'/P. */
static mho_quad_complex logarithmic_slope(const search *s, mho_quad_complex z)
{
  mho_quad_complex sum = 0;
  for (int block = 0; block < s->pencil->blocks; block++) {
    mho_quad_complex value, derivative;
    mho_pencil_evaluate(s->pencil, block, z, s->work, &value, &derivative);
    if (mho_quad_size(value) == 0) __real__ value = QUAD_ROUNDOFF * mho_quad_size(derivative);
    sum += derivative / value;
  }
  return sum;
}

/* Zeros inside a circle, and their mean in place of its center:
 *   m = 1/(2 pi i) integral of P'/P dz,   m mean = 1/(2 pi i) integral of z P'/P dz,
 * by the trapezoidal rule, which converges geometrically.  A zero alone stays
 * where it was polished to.  -1: not a number of zeros, or P'/P beside the
 * center is not that of a zero there. */
static int count_inside(const search *s, mho_quad_complex *center, mho_quad radius, int points)
{
  mho_quad_complex count = 0, moment = 0;
  for (int k = 0; k < points; k++) {
    double angle = 2 * 3.14159265358979324 * (k + 0.5) / points;
    mho_quad_complex arm;
    __real__ arm = radius * cos(angle);
    __imag__ arm = radius * sin(angle);
    mho_quad_complex term = arm * logarithmic_slope(s, *center + arm) / points;
    count += term;
    moment += arm * term;
  }
  double zeros = (double)__real__ count;
  int whole = (int)lround(zeros);
  if (whole < 1 || fabs(zeros - whole) > 0.1 || fabs((double)__imag__ count) > 0.1) return -1;
  if (whole > 1) *center += moment / whole;
  mho_quad_complex beside = *center + radius / 8; /* P'/P is 8 whole / radius there */
  return mho_quad_size(logarithmic_slope(s, beside)) * radius > 4 * whole ? whole : -1;
}

/* The node that cluster number `cluster` is; false where it has none or lies
 * below the real axis. */
static mho_status make_node(const search *s, int cluster, mho_node *node, bool *exists,
                            mho_error *error)
{
  int members = 0, n = s->pencil->size;
  mho_quad_complex center = 0;
  mho_quad size = 0, gap = INFINITY;
  for (int k = 0; k < n; k++)
    if (s->zero[k].cluster == cluster) {
      center += s->zero[k].z;
      members++;
    }
  *exists = members > 0;
  if (!*exists) return MHO_OK;
  center /= members;
  for (int k = 0; k < n; k++) {
    mho_quad distance = mho_quad_size(center - s->zero[k].z);
    bool own = s->zero[k].cluster == cluster;
    if (own && distance + s->zero[k].radius > size) size = distance + s->zero[k].radius;
    if (!own && distance < gap) gap = distance;
  }
  bool real = mho_quad_abs(__imag__ center) <= size;
  if (real) __imag__ center = 0;
  *exists = __imag__ center >= 0;
  if (!*exists) return MHO_OK;
  mho_quad radius = CIRCLE * s->pencil->norm > WIDER * size ? CIRCLE * s->pencil->norm : WIDER * size;
  if (radius > gap / 3) radius = gap / 3;
  int order = count_inside(s, &center, radius, members > 1 ? CLUSTER_POINTS : CIRCLE_POINTS);
  if (order != members)
    return mho_fail(error, MHO_ERR_NOT_CONVERGED, "solver", "nodes",
                    "near %g eV %d zeros were found and %d counted", (double)__real__ center,
                    members, order);
  mho_quad tiny = members > 1 ? (mho_quad)1e-15 * radius : TINY * s->pencil->norm;
  if (mho_quad_abs(__real__ center) <= tiny) __real__ center = 0;
  node->energy_ev = (double)__real__ center;
  node->imaginary_ev = real ? 0 : (double)__imag__ center;
  node->kind = node->imaginary_ev > 0 ? MHO_NODE_DIP : MHO_NODE_EXACT;
  node->order = order;
  return MHO_OK;
}

static int compare_nodes(const void *a, const void *b)
{
  const mho_node *p = a, *q = b;
  if (p->energy_ev != q->energy_ev) return p->energy_ev < q->energy_ev ? -1 : 1;
  return (p->imaginary_ev > q->imaginary_ev) - (p->imaginary_ev < q->imaginary_ev);
}

static mho_status find_zeros(const mho_pencil *pencil, mho_nodes *result, mho_error *error)
{
  size_t n = (size_t)pencil->size;
  search s = {pencil, calloc(n + 1, sizeof(zero)), malloc((3 * n + 1) * sizeof(mho_quad_complex))};
  result->node = malloc((n + 1) * sizeof *result->node);
  mho_status status = MHO_OK;
  if (!s.zero || !s.work || !result->node)
    status = mho_fail(error, MHO_ERR_MEMORY, "solver", NULL, "out of memory");
  for (int block = 0; status == MHO_OK && block < pencil->blocks; block++) {
    status = start_block(&s, block, error);
    if (status == MHO_OK) polish_block(&s, block);
  }
  if (status == MHO_OK) join(&s);
  for (int k = 0; status == MHO_OK && k < pencil->size; k++) {
    bool exists;
    status = make_node(&s, k, &result->node[result->count], &exists, error);
    if (status == MHO_OK && exists) result->count++;
  }
  if (status == MHO_OK) qsort(result->node, result->count, sizeof(mho_node), compare_nodes);
  free(s.zero);
  free(s.work);
  return status;
}

/* In 113 bits, where doubles do not tell zeros apart. */
static mho_status find_extended(const mho_plan *plan, mho_nodes *result, mho_error *error)
{
  mho_pencil pencil;
  mho_status status = mho_pencil_create(plan, &pencil);
  if (status != MHO_OK) mho_fail(error, status, "solver", NULL, "out of memory");
  result->everywhere = pencil.everywhere;
  result->unseen = plan->sites - pencil.visible;
  result->zeros = pencil.size;
  if (status == MHO_OK && !pencil.everywhere) status = find_zeros(&pencil, result, error);
  mho_pencil_clear(&pencil);
  return status;
}

mho_status mho_nodes_of_block(const mho_plan *plan, const mho_exact_counts *counts, bool patient,
                              mho_nodes *result, mho_error *error)
{
  bool sure = false;
  *result = (mho_nodes){.everywhere = counts->poles == 0, .unseen = plan->sites - counts->visible};
  if (result->everywhere) return MHO_OK;
  result->node = malloc(((size_t)plan->sites + 1) * sizeof *result->node);
  if (!result->node) return mho_fail(error, MHO_ERR_MEMORY, "solver", NULL, "out of memory");
  mho_status status = MHO_OK;
  if (plan->sites <= MHO_NODES_STATES_MAX)
    status = mho_zeros_find(plan, counts, result, &sure, error);
  if (status != MHO_OK || sure) return status;
  mho_nodes_clear(result);
  if (patient && plan->sites <= MHO_NODES_EXTENDED_MAX) return find_extended(plan, result, error);
  return mho_fail(error, MHO_ERR_NOT_CONVERGED, "solver", "nodes",
                  "doubles do not tell the nodes apart");
}

static mho_status search_levels(const mho_plan *plan, bool patient, mho_nodes *result,
                                mho_error *error)
{
  bool sure = false;
  mho_exact_counts counts;
  mho_status status = mho_exact_count(plan, &counts);
  if (status != MHO_OK) return mho_fail(error, status, "solver", NULL, "out of memory");
  if (counts.poles > 0) status = mho_factors_find(plan, &counts, patient, result, &sure, error);
  if (status == MHO_OK && !sure)
    status = mho_nodes_of_block(plan, &counts, patient, result, error);
  if (status == MHO_OK && result->count > 0)
    qsort(result->node, result->count, sizeof(mho_node), compare_nodes);
  return status;
}

mho_status mho_nodes_search(const mho_plan *plan, bool patient, mho_nodes *result, mho_error *error)
{
  *result = (mho_nodes){0};
  bool single = plan->left == 1 && plan->right == 1;
  if (!plan->connected) {
    result->everywhere = true;
    return MHO_OK;
  }
  if (single && !plan->pair && plan->sites <= MHO_NODES_EXTENDED_MAX)
    return find_extended(plan, result, error);
  mho_status status = MHO_ERR_NOT_CONVERGED;
  if (single && plan->pair) status = search_levels(plan, patient, result, error);
  bool minima = !single || (patient && plan->sites > MHO_NODES_EXTENDED_MAX);
  if (status != MHO_ERR_NOT_CONVERGED || !minima) return status;
  if (error) mho_error_init(error);
  mho_nodes_clear(result);
  return mho_minima_find(plan, result, error);
}

mho_status mho_nodes_find(const mho_plan *plan, mho_nodes *result, mho_error *error)
{
  return mho_nodes_search(plan, true, result, error);
}

void mho_nodes_clear(mho_nodes *result)
{
  free(result->node);
  *result = (mho_nodes){0};
}
