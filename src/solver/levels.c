/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "solver/levels.h"

#include <math.h>
#include <stdlib.h>

/* The least number that is not zero is this many times the largest that is. */
#define APART 100

/* Amplitudes below this are rounding; a state that has no other is not seen. */
#define AMPLITUDE 1e-13

/* Weights that may be faint, and the shift of energy (over ||H||) up to which
 * they are. */
#define FAINT 1e-9
#define FAINT_SHIFT 1e-11

/* |B - A (A.B)/(A.A)|^2 for the larger of both contacts as A: the second
 * combination of equal levels that they see. */
static double second_amplitude(const mho_plan *plan, int first, const mho_level_group *g)
{
  bool left = g->left >= g->right;
  double norm = left ? g->left : g->right, sum = 0;
  for (int k = first; k < first + g->states && norm > 0; k++) {
    double a = plan->amplitude[2 * k + !left], b = plan->amplitude[2 * k + left];
    double rest = b - a * g->weight / norm;
    sum += rest * rest;
  }
  return sum;
}

int mho_levels_group(const mho_plan *plan, mho_level_group *group)
{
  int count = 0;
  for (int k = 0; k < plan->sites; k++) {
    const mho_pole_pair *pair = &plan->pair[k];
    mho_level_group *last = count ? &group[count - 1] : NULL;
    if (!last || pair->level_ev - last->level_ev > SAME_LEVEL * plan->norm_ev) {
      last = &group[count++];
      *last = (mho_level_group){.level_ev = pair->level_ev};
    }
    last->weight += pair->w01;
    last->left += pair->w00;
    last->right += pair->w11;
    last->states++;
  }
  for (int i = 0, first = 0; i < count; first += group[i++].states)
    group[i].second = group[i].states > 1 ? second_amplitude(plan, first, &group[i]) : 0;
  return count;
}

static int descending(const void *a, const void *b)
{
  double x = *(const double *)a, y = *(const double *)b;
  return (x < y) - (x > y);
}

/* A number that at most `most` of value[count], all above `least`, exceed; false
 * where the next one is too near to the last of them. */
static bool threshold(double *value, int count, int most, double least, double *limit)
{
  int kept = 0;
  qsort(value, (size_t)count, sizeof *value, descending);
  while (kept < count && kept < most && value[kept] > least) kept++;
  double next = kept < count ? value[kept] : 0;
  *limit = fmax(next, least);
  return !kept || next <= least || value[kept - 1] >= APART * next;
}

/* The zero beside a level of tiny weight stands at w + (E - eps) rest = 0, and
 * counts as one at the level where that is not far, whatever rounding did to w. */
static bool is_faint(const mho_level_group *group, int count, double scale_ev, mho_level_group *g)
{
  double weight = g->weight;
  g->weight = 0;
  mho_level_sum rest = mho_levels_sum(group, count, scale_ev, g->level_ev);
  double slope = fmax(0, fabs(creal(rest.value)) - rest.noise);
  double doubt = AMPLITUDE * (sqrt(g->left) + sqrt(g->right));
  if (fabs(weight) + doubt <= FAINT_SHIFT * scale_ev * slope) g->faint = weight / creal(rest.value);
  else g->weight = weight;
  return g->weight == 0;
}

bool mho_levels_settle(mho_level_group *group, int count, const mho_exact_counts *exact,
                       double scale_ev, double *room)
{
  double weight, amplitude;
  int combinations = 0;
  for (int i = 0; i < count; i++) {
    room[combinations++] = fmax(group[i].left, group[i].right);
    if (group[i].states > 1) room[combinations++] = group[i].second;
  }
  if (!threshold(room, combinations, exact->visible, AMPLITUDE * AMPLITUDE, &amplitude))
    return false;
  for (int i = 0; i < count; i++) room[i] = fabs(group[i].weight);
  bool clear = threshold(room, count, exact->poles, 0, &weight);
  for (int i = 0; i < count; i++) {
    mho_level_group *g = &group[i];
    g->seen = (fmax(g->left, g->right) > amplitude) + (g->second > amplitude);
    if (!g->seen || (clear && fabs(g->weight) <= weight)) g->weight = 0;
    if (g->weight == 0 || fabs(g->weight) > FAINT) continue;
    if (!is_faint(group, count, scale_ev, g) && !clear) return false;
  }
  return true;
}

mho_level_sum mho_levels_sum(const mho_level_group *group, int count, double scale_ev,
                             double complex z)
{
  double re = 0, im = 0, slope_re = 0, slope_im = 0, pole_re = 0, pole_im = 0;
  double size = 0, left = 0, right = 0;
  for (int k = 0; k < count; k++) {
    double w = group[k].weight;
    if (w == 0) continue;
    double x = creal(z) - group[k].level_ev, y = cimag(z), square = 1 / (x * x + y * y);
    double p = x * square, q = -y * square; /* 1/(z - eps) */
    pole_re += p;
    pole_im += q;
    re += w * p;
    im += w * q;
    slope_re -= w * (p * p - q * q);
    slope_im -= w * 2 * p * q;
    size += fabs(w) * sqrt(square);
    left += group[k].left * square;
    right += group[k].right * square;
  }
  double noise = 8 * size + 16 * (scale_ev + cabs(z)) * sqrt(left * right);
  return (mho_level_sum){CMPLX(re, im), CMPLX(slope_re, slope_im), CMPLX(pole_re, pole_im),
                         UNIT_ROUNDOFF * noise};
}
