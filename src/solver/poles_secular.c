/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * With levels eps_j and amplitudes w_j of the two channels, poles are zeros of
 *
 *   p(z) = prod_j (z - eps_j) det M,   M = 1 - Sigma F(z),
 *   F(z) = sum_j w_j w_j^T / (z - eps_j),
 *
 * found together (O. Aberth, Math. Comp. 27, 339 (1973)) at O(sites^2) a round,
 * where the general eigensolver takes O(sites^3).  Next to the level k of a pole,
 * with A = M without that level and d = z - eps_k,
 *
 *   d det M = d det A - w_k^T adj(A) Sigma w_k
 *
 * has no cancellation, and s = adj(A) Sigma w_k gives the state x_j = w_j.s/(z -
 * eps_j).  Traces of (H + Sigma) and its square check the sum.
 */
#include "solver/poles_secular.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "base/processor.h"

enum { L = 8, ROUNDS = 40 };

/* Levels closer than the first (times ||H||) are one; than the second, they
 * leave too few digits. */
#define SAME_LEVEL (64 * UNIT_ROUNDOFF)
#define CLOSE_LEVELS 1e-7

/* Amplitudes below that are rounding. */
#define UNSEEN 1e-13

/* Where the own level gives so little of s, det A is nearly 0 as well. */
#define SMALL_STATE 0.1

/* Steps below the first (times ||H||) end the search; traces hold to the second. */
#define FINISHED 2e-15
#define TRACE 1e-12

/* Visible levels; states that no contact sees are poles already. */
typedef struct {
  size_t count, padded; /* padded to whole lanes */
  double *level, *w0, *w1;
  double *re, *im; /* z */
  double sigma_re[2], sigma_im[2];
  double norm_ev;
} secular;

/* A cluster's amplitudes by two states at most: QR, the larger column first. */
static void see_cluster(const mho_plan *plan, size_t first, size_t end, secular *s,
                        double complex *value, size_t *unseen)
{
  double square[2] = {0, 0}, level = 0, projection = 0, rest = 0;
  const double(*w)[2] = (const double(*)[2])plan->amplitude;
  for (size_t k = first; k < end; k++) {
    level += plan->level_ev[k] / (double)(end - first);
    for (int c = 0; c < 2; c++) square[c] += w[k][c] * w[k][c];
    projection += w[k][0] * w[k][1];
  }
  bool left = square[0] >= square[1];
  double largest = left ? square[0] : square[1];
  for (size_t k = first; largest > 0 && k < end; k++) { /* what is left of the other column */
    double part = w[k][left] - w[k][!left] * (projection / largest);
    rest += part * part;
  }
  double first_column = sqrt(largest), along = largest > 0 ? projection / first_column : 0;
  double across = end - first > 1 ? sqrt(rest) : 0;
  double state[2][2] = {{first_column, along}, {0, across}};
  for (size_t k = 0; k < end - first; k++) {
    bool seen = k < 2 && hypot(state[k < 2 ? k : 0][0], state[k < 2 ? k : 0][1]) > UNSEEN;
    if (!seen) {
      value[(*unseen)++] = level;
      continue;
    }
    s->level[s->count] = level;
    s->w0[s->count] = state[k][left ? 0 : 1];
    s->w1[s->count++] = state[k][left ? 1 : 0];
  }
}

/* False where levels nearly coincide. */
static bool see_levels(const mho_plan *plan, secular *s, double complex *value, size_t *unseen)
{
  size_t n = (size_t)plan->sites;
  for (size_t k = 0, end; k < n; k = end) {
    for (end = k + 1; end < n && plan->level_ev[end] - plan->level_ev[end - 1] <=
                                     SAME_LEVEL * plan->norm_ev;)
      end++;
    see_cluster(plan, k, end, s, value, unseen);
    if (end < n && plan->level_ev[end] - plan->level_ev[end - 1] < CLOSE_LEVELS * plan->norm_ev)
      return false;
  }
  return true;
}

/* First order places, apart from each other. */
static void start(secular *s)
{
  for (size_t k = 0; k < s->count; k++) {
    double a = s->w0[k] * s->w0[k], b = s->w1[k] * s->w1[k];
    s->re[k] = s->level[k] + s->sigma_re[0] * a + s->sigma_re[1] * b;
    s->im[k] = s->sigma_im[0] * a + s->sigma_im[1] * b;
    if (k > 0 && s->re[k] == s->re[k - 1] && s->im[k] == s->im[k - 1])
      s->re[k] += 1e-3 * (a + b) * s->norm_ev;
  }
  for (size_t k = s->count; k < s->padded; k++) { /* lanes that do nothing */
    s->re[k] = s->re[0];
    s->im[k] = s->im[0];
  }
}

/* Complex arithmetic written out, for vectors. */
#define MUL_RE(ar, ai, br, bi) ((ar) * (br) - (ai) * (bi))
#define MUL_IM(ar, ai, br, bi) ((ar) * (bi) + (ai) * (br))

/* Steps of Aberth for lanes first .. first + L - 1. */
FOR_EVERY_PROCESSOR
static void find_steps(const secular *s, const int *nearest, size_t first, double *step_re,
                       double *step_im)
{
  double zr[L], zi[L], f[6][L], g[6][L], sum_re[L], sum_im[L], apart_re[L], apart_im[L];
  memcpy(zr, s->re + first, sizeof zr);
  memcpy(zi, s->im + first, sizeof zi);
  memset(f, 0, sizeof f);
  memset(g, 0, sizeof g);
  for (int l = 0; l < L; l++) sum_re[l] = sum_im[l] = apart_re[l] = apart_im[l] = 0;
  for (size_t j = 0; j < s->count; j++) {
    double w00 = s->w0[j] * s->w0[j], w01 = s->w0[j] * s->w1[j], w11 = s->w1[j] * s->w1[j];
    for (int l = 0; l < L; l++) {
      double keep = nearest[l] == (int)j ? 0.0 : 1.0; /* A leaves the own level out */
      double dr = zr[l] - s->level[j], size = dr * dr + zi[l] * zi[l];
      double inverse = keep / (keep != 0.0 ? size : 1.0);
      double r = dr * inverse, i = -zi[l] * inverse;
      double rr = MUL_RE(r, i, r, i), ri = MUL_IM(r, i, r, i);
      sum_re[l] += r;
      sum_im[l] += i;
      f[0][l] += w00 * r;
      f[1][l] += w00 * i;
      f[2][l] += w01 * r;
      f[3][l] += w01 * i;
      f[4][l] += w11 * r;
      f[5][l] += w11 * i;
      g[0][l] -= w00 * rr;
      g[1][l] -= w00 * ri;
      g[2][l] -= w01 * rr;
      g[3][l] -= w01 * ri;
      g[4][l] -= w11 * rr;
      g[5][l] -= w11 * ri;
      double own = first + (size_t)l == j ? 0.0 : 1.0; /* the other poles */
      double pr = zr[l] - s->re[j], pi = zi[l] - s->im[j];
      double distance = own / (own != 0.0 ? pr * pr + pi * pi + 1e-300 : 1.0);
      apart_re[l] += pr * distance;
      apart_im[l] -= pi * distance;
    }
  }
  for (int l = 0; l < L; l++) {
    double complex s0 = s->sigma_re[0] + I * s->sigma_im[0];
    double complex s1 = s->sigma_re[1] + I * s->sigma_im[1];
    double complex f00 = f[0][l] + I * f[1][l], f01 = f[2][l] + I * f[3][l];
    double complex f11 = f[4][l] + I * f[5][l], g00 = g[0][l] + I * g[1][l];
    double complex g01 = g[2][l] + I * g[3][l], g11 = g[4][l] + I * g[5][l];
    double a = s->w0[nearest[l]], b = s->w1[nearest[l]];
    double complex d = zr[l] - s->level[nearest[l]] + I * zi[l];
    double complex det = (1 - s0 * f00) * (1 - s1 * f11) - s0 * s1 * f01 * f01;
    double complex det_slope = -s0 * g00 * (1 - s1 * f11) - (1 - s0 * f00) * s1 * g11 -
                               2 * s0 * s1 * f01 * g01;
    double complex c = a * a * s0 * (1 - s1 * f11) + 2 * a * b * s0 * s1 * f01 +
                       b * b * s1 * (1 - s0 * f00);
    double complex c_slope = -a * a * s0 * s1 * g11 + 2 * a * b * s0 * s1 * g01 -
                             b * b * s1 * s0 * g00;
    double complex p = d * det - c, slope = det + d * det_slope - c_slope;
    double complex newton = slope + p * (sum_re[l] + I * sum_im[l]);
    double complex step = p / (newton - p * (apart_re[l] + I * apart_im[l]));
    step_re[l] = creal(step);
    step_im[l] = cimag(step);
  }
}

static int nearest_level(const secular *s, double re)
{
  size_t low = 0, high = s->count;
  while (high - low > 1) {
    size_t middle = (low + high) / 2;
    if (s->level[middle] <= re) low = middle;
    else high = middle;
  }
  return (int)(low + 1 < s->count && s->level[low + 1] - re < re - s->level[low] ? low + 1 : low);
}

/* Moves all poles until they stand; false if they do not. */
static bool iterate(secular *s)
{
  double step_re[L], step_im[L];
  for (int round = 0; round < ROUNDS; round++) {
    double largest = 0;
    for (size_t first = 0; first < s->count; first += L) {
      int nearest[L];
      for (size_t l = 0; l < L; l++) nearest[l] = nearest_level(s, s->re[first + l]);
      find_steps(s, nearest, first, step_re, step_im);
      for (size_t l = 0; l < L && first + l < s->count; l++) {
        double size = hypot(step_re[l], step_im[l]);
        if (!isfinite(size)) return false;
        s->re[first + l] -= step_re[l];
        s->im[first + l] -= step_im[l];
        if (size > largest) largest = size;
      }
    }
    if (largest <= FINISHED * s->norm_ev) return true;
  }
  return false;
}

/* The sums of all poles and of their squares. */
static bool traces_hold(const secular *s)
{
  double complex sigma[2] = {s->sigma_re[0] + I * s->sigma_im[0],
                             s->sigma_re[1] + I * s->sigma_im[1]};
  double complex sum = 0, squares = 0;
  double w[3] = {0, 0, 0};
  for (size_t k = 0; k < s->count; k++) {
    double complex z = s->re[k] + I * s->im[k];
    double complex own = sigma[0] * s->w0[k] * s->w0[k] + sigma[1] * s->w1[k] * s->w1[k];
    sum += z - s->level[k] - own;
    squares += z * z - s->level[k] * s->level[k] - 2 * s->level[k] * own;
    w[0] += s->w0[k] * s->w0[k];
    w[1] += s->w0[k] * s->w1[k];
    w[2] += s->w1[k] * s->w1[k];
  }
  squares -= sigma[0] * sigma[0] * w[0] * w[0] + 2 * sigma[0] * sigma[1] * w[1] * w[1] +
             sigma[1] * sigma[1] * w[2] * w[2];
  double size = s->norm_ev + cabs(sigma[0]) * w[0] + cabs(sigma[1]) * w[2];
  double allowed = TRACE * (double)s->count * size;
  return cabs(sum) <= allowed && cabs(squares) <= allowed * size;
}

/* v_c.x of the normalised state of pole k. */
static void find_overlaps(const secular *s, size_t k, double complex overlap[2])
{
  double complex z = s->re[k] + I * s->im[k];
  double complex s0 = s->sigma_re[0] + I * s->sigma_im[0];
  double complex s1 = s->sigma_re[1] + I * s->sigma_im[1], f00 = 0, f01 = 0, f11 = 0;
  size_t own = (size_t)nearest_level(s, s->re[k]);
  for (size_t j = 0; j < s->count; j++) {
    if (j == own) continue;
    double complex inverse = 1 / (z - s->level[j]);
    f00 += s->w0[j] * s->w0[j] * inverse;
    f01 += s->w0[j] * s->w1[j] * inverse;
    f11 += s->w1[j] * s->w1[j] * inverse;
  }
  double a = s->w0[own], b = s->w1[own];
  double complex d = z - s->level[own];
  double complex left = (1 - s1 * f11) * s0 * a + s0 * f01 * s1 * b;
  double complex right = s1 * f01 * s0 * a + (1 - s0 * f00) * s1 * b;
  double complex m[2][2] = {{d * (1 - s0 * f00) - s0 * a * a, -s0 * (d * f01 + a * b)},
                            {-s1 * (d * f01 + a * b), d * (1 - s1 * f11) - s1 * b * b}}; /* d M */
  double other = fabs(creal(s0 * a)) + fabs(cimag(s0 * a)) + fabs(creal(s1 * b)) + fabs(cimag(s1 * b));
  if (!(cabs(left) + cabs(right) > SMALL_STATE * other)) { /* M s = 0 by its larger row */
    int row = cabs(m[0][0]) + cabs(m[0][1]) > cabs(m[1][0]) + cabs(m[1][1]) ? 0 : 1;
    left = -m[row][1];
    right = m[row][0];
  }
  double complex seen = a * left + b * right;
  double square = creal(seen * conj(seen));
  for (size_t j = 0; j < s->count; j++) {
    if (j == own) continue;
    double complex x = d * (s->w0[j] * left + s->w1[j] * right) / (z - s->level[j]);
    square += creal(x * conj(x));
  }
  double scale = 1 / sqrt(square);
  overlap[0] = scale * (d * (f00 * left + f01 * right) + a * seen);
  overlap[1] = scale * (d * (f01 * left + f11 * right) + b * seen);
}

mho_status mho_poles_secular(const mho_plan *plan, double complex *value,
                             double complex (*overlap)[2], bool *good)
{
  size_t n = (size_t)plan->sites, room = n + L, unseen = 0;
  *good = plan->pair != NULL;
  if (!*good) return MHO_OK;
  double *numbers = calloc(5 * room, sizeof *numbers);
  if (!numbers) return MHO_ERR_MEMORY;
  secular s = {.level = numbers,         .w0 = numbers + room,     .w1 = numbers + 2 * room,
               .re = numbers + 3 * room, .im = numbers + 4 * room, .norm_ev = plan->norm_ev};
  for (int c = 0; c < 2; c++) {
    s.sigma_re[c] = plan->shift_ev[c];
    s.sigma_im[c] = -0.5 * plan->coupling_ev[c];
  }
  *good = see_levels(plan, &s, value, &unseen);
  if (*good && s.count > 0) {
    s.padded = (s.count + L - 1) / L * L;
    start(&s);
    *good = iterate(&s) && traces_hold(&s);
  }
  for (size_t k = 0; k < unseen; k++) overlap[k][0] = overlap[k][1] = 0;
  for (size_t k = 0; *good && k < s.count; k++) {
    value[unseen + k] = s.re[k] + I * s.im[k];
    find_overlaps(&s, k, overlap[unseen + k]);
  }
  free(numbers);
  return MHO_OK;
}
