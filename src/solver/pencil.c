/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * From H and two vectors to the Hessenberg matrix of the zeros:
 * block Krylov basis of {v_l, v_r} (deflates what neither contact sees),
 * staircase (deflates the zeros at infinity), Householder reduction.
 */
#include "solver/pencil.h"

#include <stdlib.h>
#include <string.h>

/* Smaller than this against what it came from is zero; rounding leaves 1e-32. */
#define ZERO ((mho_quad)1e-26)

/* Roundings of its largest entry that a reduced matrix carries. */
#define REDUCTION 16

typedef struct {
  size_t n;
  mho_quad *a; /* [n][stride] */
  size_t stride;
  mho_quad *b, *c; /* input and output vector */
} linear_system;

static mho_quad dot(const mho_quad *x, const mho_quad *y, size_t n)
{
  mho_quad sum = 0;
  for (size_t i = 0; i < n; i++) sum += x[i] * y[i];
  return sum;
}

static void apply_hamiltonian(const mho_plan *plan, const mho_quad *x, mho_quad *y)
{
  for (int i = 0; i < plan->sites; i++) y[i] = 0;
  for (size_t e = 0; e < plan->entries; e++) {
    int i = plan->entry[e].i, j = plan->entry[e].j;
    mho_quad h = plan->entry[e].value_ev;
    y[i] += h * x[j];
    if (i != j) y[j] += h * x[i];
  }
}

/* Orthogonalises w against the basis, twice; false if nothing is left of it. */
static bool extend_basis(mho_quad *basis, size_t size, size_t n, mho_quad *w, mho_quad reference)
{
  for (int pass = 0; pass < 2; pass++)
    for (size_t k = 0; k < size; k++) {
      mho_quad overlap = dot(basis + k * n, w, n);
      for (size_t i = 0; i < n; i++) w[i] -= overlap * basis[k * n + i];
    }
  mho_quad norm = mho_quad_sqrt(dot(w, w, n));
  if (!(norm > ZERO * reference)) return false;
  for (size_t i = 0; i < n; i++) basis[size * n + i] = w[i] / norm;
  return true;
}

/* Orthonormal basis of all that H makes of the two vectors. */
static size_t krylov_basis(const mho_plan *plan, mho_quad norm, mho_quad *basis, mho_quad *w)
{
  size_t n = (size_t)plan->sites, size = 0;
  for (int c = 0; c < 2; c++) {
    for (size_t i = 0; i < n; i++) w[i] = plan->vector[(size_t)c * n + i];
    mho_quad length = mho_quad_sqrt(dot(w, w, n));
    size += extend_basis(basis, size, n, w, length);
  }
  for (size_t next = 0; next < size && size < n; next++) {
    apply_hamiltonian(plan, basis + next * n, w);
    size += extend_basis(basis, size, n, w, norm);
  }
  return size;
}

/* H and the vectors of both contacts in that basis. */
static void reduce(const mho_plan *plan, const mho_quad *basis, mho_quad *w, linear_system *s)
{
  size_t n = (size_t)plan->sites;
  for (size_t k = 0; k < s->n; k++) {
    apply_hamiltonian(plan, basis + k * n, w);
    for (size_t i = 0; i < s->n; i++) s->a[i * s->stride + k] = dot(basis + i * n, w, n);
    s->b[k] = s->c[k] = 0;
    for (size_t i = 0; i < n; i++) {
      s->b[k] += basis[k * n + i] * plan->vector[i];
      s->c[k] += basis[k * n + i] * plan->vector[n + i];
    }
  }
}

/* x -= u (u.x) 2/|u|^2 for x[0], x[step], ... */
static void reflect(const mho_quad *u, mho_quad scale, mho_quad *x, size_t step, size_t n)
{
  mho_quad sum = 0;
  for (size_t i = 0; i < n; i++) sum += u[i] * x[i * step];
  sum *= scale;
  for (size_t i = 0; i < n; i++) x[i * step] -= sum * u[i];
}

/* u and 2/|u|^2 of the reflection that takes u to a multiple of unit vector k;
 * returns that multiple. */
static mho_quad householder(mho_quad *u, size_t n, size_t k, mho_quad *scale)
{
  mho_quad norm = mho_quad_sqrt(dot(u, u, n)), target = u[k] > 0 ? -norm : norm;
  u[k] -= target;
  mho_quad square = dot(u, u, n);
  *scale = square > 0 ? 2 / square : 0;
  return target;
}

/* Turns the output c.x into its last state alone and drops that state while the
 * input does not reach it.  False if the input never reaches the output. */
static bool staircase(linear_system *s, mho_quad norm, mho_quad *u)
{
  mho_quad input = mho_quad_sqrt(dot(s->b, s->b, s->n));
  while (s->n > 0) {
    size_t n = s->n;
    mho_quad scale;
    memcpy(u, s->c, n * sizeof *u);
    householder(u, n, n - 1, &scale);
    for (size_t j = 0; j < n; j++) reflect(u, scale, s->a + j, s->stride, n);
    for (size_t i = 0; i < n; i++) reflect(u, scale, s->a + i * s->stride, 1, n);
    reflect(u, scale, s->b, 1, n);
    if (mho_quad_abs(s->b[n - 1]) > ZERO * input) return true;
    s->n = n - 1;
    memcpy(s->c, s->a + (n - 1) * s->stride, s->n * sizeof *s->c);
    if (!(mho_quad_sqrt(dot(s->c, s->c, s->n)) > ZERO * norm)) return false;
  }
  return false;
}

/* With the last state held at zero by the input: Z = A11 - b1 a21 / b2. */
static void close_loop(linear_system *s)
{
  size_t n = s->n - 1;
  for (size_t i = 0; i < n; i++) {
    mho_quad factor = s->b[i] / s->b[n];
    for (size_t j = 0; j < n; j++)
      s->a[i * s->stride + j] -= factor * s->a[n * s->stride + j];
  }
  s->n = n;
}

static void reduce_to_hessenberg(linear_system *s, mho_quad *u)
{
  for (size_t k = 0; k + 2 < s->n; k++) {
    size_t m = s->n - k - 1;
    mho_quad scale;
    for (size_t i = 0; i < m; i++) u[i] = s->a[(k + 1 + i) * s->stride + k];
    mho_quad below = householder(u, m, 0, &scale);
    for (size_t j = k; j < s->n; j++) reflect(u, scale, s->a + (k + 1) * s->stride + j, s->stride, m);
    for (size_t i = 0; i < s->n; i++) reflect(u, scale, s->a + i * s->stride + k + 1, 1, m);
    s->a[(k + 1) * s->stride + k] = below;
    for (size_t i = k + 2; i < s->n; i++) s->a[i * s->stride + k] = 0;
  }
}

static mho_status keep_hessenberg(const linear_system *s, mho_pencil *pencil)
{
  size_t n = s->n;
  pencil->size = (int)n;
  pencil->matrix = malloc((n * n + 1) * sizeof(mho_quad));
  pencil->block = malloc((n + 1) * sizeof(int));
  if (!pencil->matrix || !pencil->block) return MHO_ERR_MEMORY;
  for (size_t i = 0; i < n; i++)
    for (size_t j = 0; j < n; j++) pencil->matrix[i * n + j] = s->a[i * s->stride + j];
  for (size_t i = 0; i < n; i++) {
    mho_quad below = i ? mho_quad_abs(pencil->matrix[i * n + i - 1]) : 0;
    if (!(below > ZERO * pencil->norm)) pencil->block[pencil->blocks++] = (int)i;
  }
  pencil->block[pencil->blocks] = (int)n;
  return MHO_OK;
}

static mho_quad largest_entry(const mho_plan *plan)
{
  mho_quad largest = 0;
  for (size_t e = 0; e < plan->entries; e++)
    largest = fmax((double)largest, fabs(plan->entry[e].value_ev));
  return largest;
}

mho_status mho_pencil_create(const mho_plan *plan, mho_pencil *pencil)
{
  *pencil = (mho_pencil){.norm = largest_entry(plan)};
  size_t n = (size_t)plan->sites;
  mho_quad *basis = malloc((2 * n * n + 4 * n) * sizeof *basis);
  if (!basis) return MHO_ERR_MEMORY;
  mho_quad *w = basis + n * n;
  linear_system s = {.a = w + n, .b = w + n + n * n, .c = w + 2 * n + n * n};
  s.n = krylov_basis(plan, pencil->norm, basis, w);
  s.stride = s.n;
  pencil->visible = (int)s.n;
  mho_status status = MHO_OK;
  if (s.n > 0) reduce(plan, basis, w, &s);
  pencil->everywhere = s.n == 0 || !staircase(&s, pencil->norm, w);
  if (!pencil->everywhere) {
    close_loop(&s);
    reduce_to_hessenberg(&s, w);
    status = keep_hessenberg(&s, pencil);
  }
  free(basis);
  return status;
}

void mho_pencil_clear(mho_pencil *pencil)
{
  free(pencil->matrix);
  free(pencil->block);
  *pencil = (mho_pencil){0};
}

void mho_pencil_evaluate(const mho_pencil *pencil, int block, mho_quad_complex z,
                         mho_quad_complex *work, mho_quad_complex *value,
                         mho_quad_complex *derivative)
{
  size_t stride = (size_t)pencil->size, first = (size_t)pencil->block[block];
  size_t n = (size_t)pencil->block[block + 1] - first;
  const mho_quad *m = pencil->matrix + first * stride + first;
  mho_quad_complex *x = work, *y = work + n; /* y = dx/dz */
  x[n - 1] = 1;
  y[n - 1] = 0;
  for (size_t i = n; i-- > 0;) {
    mho_quad_complex sum = -z * x[i], slope = -z * y[i] - x[i];
    for (size_t j = i; j < n; j++) {
      sum += m[i * stride + j] * x[j];
      slope += m[i * stride + j] * y[j];
    }
    if (i == 0) {
      *value = sum;
      *derivative = slope;
      return;
    }
    mho_quad below = m[i * stride + i - 1];
    x[i - 1] = -sum / below;
    y[i - 1] = -slope / below;
  }
}

/* Row i of the recurrence is wrong by u sum_j |m_ij x_j|; what that does to the
 * value is the adjoint a_i: a_0 = 1, a_i = -sum_r<i a_r m_r,i-1 / m_i,i-1.  The
 * matrix itself is wrong everywhere by what its reduction has rounded. */
mho_quad mho_pencil_noise(const mho_pencil *pencil, int block, mho_quad_complex z,
                          mho_quad_complex *work)
{
  size_t stride = (size_t)pencil->size, first = (size_t)pencil->block[block];
  size_t n = (size_t)pencil->block[block + 1] - first;
  const mho_quad *m = pencil->matrix + first * stride + first;
  mho_quad_complex *x = work, *adjoint = work + 2 * n, value, derivative;
  mho_pencil_evaluate(pencil, block, z, work, &value, &derivative);
  mho_quad noise = 0, adjoints = 0, entries = 0, largest = 0;
  for (size_t i = 0; i < n; i++) {
    mho_quad_complex sum = i ? -z * adjoint[i - 1] : 0;
    for (size_t r = 0; r < i; r++) sum += m[r * stride + i - 1] * adjoint[r];
    adjoint[i] = i ? -sum / m[i * stride + i - 1] : 1;
    mho_quad size = mho_quad_size(z) * mho_quad_size(x[i]);
    for (size_t j = i; j < n; j++) {
      mho_quad entry = mho_quad_abs(m[i * stride + j]);
      size += entry * mho_quad_size(x[j]);
      if (entry > largest) largest = entry;
    }
    noise += size * mho_quad_size(adjoint[i]);
    adjoints += mho_quad_size(adjoint[i]);
    entries += mho_quad_size(x[i]);
  }
  return QUAD_ROUNDOFF * (4 * noise + REDUCTION * largest * adjoints * entries);
}
