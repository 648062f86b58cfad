/* SPDX-License-Identifier: GPL-3.0-or-later */
#include <mho/compare.h>

#include <mho/warning.h>

#include <math.h>

#define LN10 2.302585092994045684

double mho_peak_log10_g0(const mho_measured_peak *peak)
{
  double log10_g0 = log10(peak->peak_g0);
  if (peak->histogram == MHO_HISTOGRAM_LINEAR && peak->has_spread)
    log10_g0 += peak->spread_decades * peak->spread_decades * LN10;
  return log10_g0;
}

static void set_computed(const mho_conductance *g, double error_decades, mho_comparison *c)
{
  *c = (mho_comparison){0};
  bool node = g->warnings & MHO_WARN_NEAR_NODE;
  c->has_computed = g->has_log && !node;
  c->has_error = c->has_computed && error_decades >= 0;
  c->computed_log10_g0 = g->log10_g0;
  c->computed_low = g->log10_g0 - error_decades;
  c->computed_high = g->log10_g0 + error_decades;
}

/* Mean of the logarithms, and the envelope of peak -+ spread. */
static void set_measured(const mho_measured_peak *peak, int peaks, int molecule,
                         mho_comparison *c)
{
  int count = 0;
  double sum = 0;
  for (int p = 0; p < peaks; p++) {
    if (peak[p].molecule != molecule) continue;
    double value = mho_peak_log10_g0(&peak[p]);
    sum += value;
    count++;
    if (!peak[p].has_spread) continue;
    double low = value - peak[p].spread_decades, high = value + peak[p].spread_decades;
    c->measured_low = c->has_spread ? fmin(c->measured_low, low) : low;
    c->measured_high = c->has_spread ? fmax(c->measured_high, high) : high;
    c->has_spread = true;
  }
  c->has_measured = count > 0;
  if (count) c->measured_log10_g0 = sum / count;
}

static bool is_usable(const mho_comparison *c) { return c->has_computed && c->has_measured; }

static void set_ratios(mho_comparison *comparison, int count, mho_agreement *agreement)
{
  const mho_comparison *reference = &comparison[agreement->reference];
  double sum = 0;
  for (int i = 0; i < count; i++) {
    mho_comparison *c = &comparison[i];
    if (!is_usable(c)) continue;
    double computed = c->computed_log10_g0 - reference->computed_log10_g0;
    double measured = c->measured_log10_g0 - reference->measured_log10_g0;
    c->has_ratio = true;
    c->ratio_computed = pow(10.0, computed);
    c->ratio_measured = pow(10.0, measured);
    c->deviation_decades = computed - measured;
    if (i == agreement->reference) continue;
    agreement->compared++;
    sum += c->deviation_decades * c->deviation_decades;
    if (fabs(c->deviation_decades) >= agreement->largest_decades) {
      agreement->largest_decades = fabs(c->deviation_decades);
      agreement->largest = i;
    }
  }
  if (agreement->compared) agreement->rms_decades = sqrt(sum / agreement->compared);
}

static double half_width(const mho_comparison *c)
{
  return c->has_spread ? 0.5 * (c->measured_high - c->measured_low) : 0.0;
}

static void count_order(const mho_comparison *comparison, int count, mho_agreement *agreement)
{
  for (int i = 0; i < count; i++)
    for (int j = 0; j < i; j++) {
      const mho_comparison *a = &comparison[i], *b = &comparison[j];
      if (!is_usable(a) || !is_usable(b)) continue;
      double measured = a->measured_log10_g0 - b->measured_log10_g0;
      double computed = a->computed_log10_g0 - b->computed_log10_g0;
      if (fabs(measured) <= hypot(half_width(a), half_width(b))) continue;
      agreement->pairs++;
      agreement->ordered += measured * computed > 0;
    }
}

mho_status mho_compare_ratios(const mho_conductance *computed, const double *error_decades,
                              int count, const mho_measured_peak *peak, int peaks, int reference,
                              mho_comparison *comparison, mho_agreement *agreement,
                              mho_error *error)
{
  *agreement = (mho_agreement){.reference = reference};
  for (int i = 0; i < count; i++) {
    set_computed(&computed[i], error_decades ? error_decades[i] : -1, &comparison[i]);
    set_measured(peak, peaks, i, &comparison[i]);
  }
  for (int i = 0; reference < 0 && i < count; i++)
    if (is_usable(&comparison[i])) reference = i;
  if (reference < 0 || reference >= count || !is_usable(&comparison[reference]))
    return mho_fail(error, MHO_ERR_REFERENCE, "compare", "reference",
                    "ratios need a reference molecule with a measured and a computed value");
  agreement->reference = reference;
  set_ratios(comparison, count, agreement);
  count_order(comparison, count, agreement);
  return MHO_OK;
}
