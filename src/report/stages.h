/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Each stage's result as rows of its table.  A *_table function opens the
 * table in an output, a *_row function adds to it.
 */
#ifndef MHOLECULE_REPORT_STAGES_H
#define MHOLECULE_REPORT_STAGES_H

#include <mho/compare.h>
#include <mho/conductance.h>
#include <mho/inside.h>
#include <mho/interference.h>
#include <mho/modify.h>
#include <mho/molecule.h>
#include <mho/nodes.h>
#include <mho/peaks.h>
#include <mho/screen_store.h>
#include <mho/sensitivity.h>
#include <mho/telegraph.h>
#include <mho/transmission.h>
#include <mho/twist.h>

#include "report/table.h"

mho_table *mho_conductance_table(mho_output *output);
void mho_conductance_row(mho_table *table, const char *molecule,
                         const mho_conductance *conductance, unsigned warnings);

/* Every parameter, then a row for all of them that names the rule. */
mho_table *mho_sensitivity_table(mho_output *output);
void mho_sensitivity_rows(mho_table *table, const mho_molecule *molecule,
                          const mho_sensitivity *sensitivity);
/* How uncertain the conductance is, and by what. */
void mho_sensitivity_note(mho_output *output, const mho_molecule *molecule,
                          const mho_sensitivity *sensitivity);

/* energy_ev is absolute; the table has it relative to fermi_ev. */
mho_table *mho_transmission_table(mho_output *output);
void mho_transmission_row(mho_table *table, const char *molecule, double relative_energy_ev,
                          const mho_point *point);

/* With `widths` also what each contact adds to the width. */
mho_table *mho_poles_table(mho_output *output, bool widths);
void mho_poles_row(mho_table *table, const char *molecule, double fermi_ev,
                   const mho_pole *pole, bool widths);

/* Which of pole[sites], ascending, belong to HOMO and LUMO: the k-th to the k-th
 * level, or where no contact sees that one, the next that one sees. */
void mho_frontier_note(mho_output *output, const char *molecule, const mho_junction *junction,
                       const mho_pole *pole);

mho_table *mho_nodes_table(mho_output *output);
void mho_nodes_row(mho_table *table, const char *molecule, double fermi_ev,
                   const mho_node *node);

/* T of a view of the inside, and where. */
void mho_inside_note(mho_output *output, const char *molecule, double relative_energy_ev,
                     const mho_inside *inside);

/* Currents relative to T, each from where it comes to where it goes, without a
 * value where nothing flows.  What each orbital adds to T. */
mho_table *mho_currents_table(mho_output *output);
void mho_currents_rows(mho_table *table, const mho_molecule *molecule,
                       const mho_inside *inside);
mho_table *mho_orbitals_table(mho_output *output);
void mho_orbitals_rows(mho_table *table, const char *molecule, double fermi_ev,
                       const mho_inside *inside);

/* Which levels are HOMO and LUMO. */
void mho_orbitals_note(mho_output *output, const char *molecule, const mho_junction *junction);

/* Eigenchannels; with `parts` a row for each site of the contacts. */
mho_table *mho_channels_table(mho_output *output, bool parts);
void mho_channels_rows(mho_table *table, const mho_molecule *molecule, const mho_inside *inside,
                       bool parts);
void mho_channels_note(mho_output *output, const mho_molecule *molecule, const mho_inside *inside);

mho_table *mho_compare_table(mho_output *output);
void mho_compare_row(mho_table *table, const char *molecule, const mho_comparison *comparison);

/* `coupling 0.3 eV`, `chain of hopping -5 eV, joint -1.1 eV, band -10 to 10 eV`. */
void mho_write_electrode(const mho_contact *contact, int digits, mho_buffer *buffer);

/* The result in one sentence. */
void mho_verdict_note(mho_output *output, const char *molecule, const mho_conductance *g,
                      double window_ev);

/* `bond` names the bonds that turn; log10_g0 is -INFINITY for zero. */
mho_table *mho_twist_table(mho_output *output);
void mho_twist_row(mho_table *table, const char *molecule, const char *bond, double angle_deg,
                   const mho_point *point, double log10_g0);

/* T(theta, E), and T of two angles at the Fermi level. */
mho_table *mho_twist_map_table(mho_output *output);
void mho_twist_map_row(mho_table *table, const char *molecule, const char *bond,
                       double angle_deg, double relative_energy_ev, const mho_point *point);
mho_table *mho_twist_plane_table(mho_output *output);
void mho_twist_plane_row(mho_table *table, const char *molecule, const char *const bond[2],
                         const double angle_deg[2], const mho_point *point);

mho_table *mho_twist_average_table(mho_output *output);
void mho_twist_average_row(mho_table *table, const char *molecule, const char *bond,
                           const char *torsion, const mho_twist_average *average);

/* What thermal motion leaves, by the names of the potentials. */
void mho_twist_average_note(mho_output *output, const mho_molecule *molecule, const char *bond,
                            const char *torsion, const mho_twist_average *average);

/* The answer in words: how flat it must be, and how far cos^2 holds. */
void mho_twist_note(mho_output *output, const char *molecule, const char *bond,
                    const double limit_deg[2], const mho_twist_law *law);

mho_table *mho_interference_table(mho_output *output);
void mho_interference_rows(mho_table *table, const mho_molecule *molecule,
                           const mho_interference *map);

/* How many pairs conduct, which best, and what holds for the contacts of the
 * molecule. */
void mho_interference_note(mho_output *output, const mho_molecule *molecule,
                           const mho_interference *map);

mho_table *mho_modify_table(mho_output *output);
void mho_modify_rows(mho_table *table, const mho_molecule *molecule,
                     const mho_modifications *modifications);

/* Rules of thumb beside the exact result; the note counts disagreements. */
mho_table *mho_rules_table(mho_output *output);
void mho_rules_rows(mho_table *table, const mho_molecule *molecule, const mho_interference *map);
void mho_rules_note(mho_output *output, const mho_molecule *molecule,
                    const mho_interference *map);

/* The best change upwards and downwards. */
void mho_modify_note(mho_output *output, const mho_molecule *molecule,
                     const mho_modifications *modifications);

/* Measured traces.  Each opens its table and fills it; traces, peaks and levels
 * count from 1. */
void mho_histogram_rows(mho_output *output, const mho_histogram *histogram,
                        const mho_trace_counts *counts);
void mho_linear_rows(mho_output *output, const mho_histogram *histogram);
void mho_map_rows(mho_output *output, const mho_histogram *histogram);
void mho_peak_rows(mho_output *output, const mho_peaks *peaks);
void mho_comb_rows(mho_output *output, const mho_comb *comb);
void mho_plateau_rows(mho_output *output, const mho_histogram *histogram);
void mho_cluster_rows(mho_output *output, const mho_clusters *clusters);
void mho_correlation_rows(mho_output *output, const mho_histogram *histogram);
void mho_flicker_rows(mho_output *output, const mho_flicker *flicker);
void mho_blink_rows(mho_output *output, const mho_telegraph *telegraph);
void mho_step_rows(mho_output *output, const mho_telegraph *telegraph);
void mho_dwell_rows(mho_output *output, const mho_telegraph *telegraph);

/* Of a study: the peaks of each molecule, one row without them if none. */
mho_table *mho_traces_table(mho_output *output);
void mho_traces_rows(mho_table *table, const char *molecule, uint64_t traces, uint64_t rejected,
                     const mho_peaks *peaks);

/* The peak with the largest weight, or NULL. */
const mho_peak *mho_main_peak(const mho_peaks *peaks);

/* What was read, rejected and found, in words. */
void mho_reading_note(mho_output *output, const mho_trace_report *report, double floor_g0);
void mho_rejection_note(mho_output *output, const mho_histogram *histogram);
void mho_peaks_note(mho_output *output, const mho_peaks *peaks);
void mho_unrejected_note(mho_output *output, const mho_peaks *peaks);
void mho_comb_note(mho_output *output, const mho_comb *comb);
void mho_plateaus_note(mho_output *output, const mho_histogram *histogram);
void mho_clusters_note(mho_output *output, const mho_clusters *clusters, size_t samples);
void mho_flicker_note(mho_output *output, const mho_flicker *flicker);
void mho_blink_note(mho_output *output, const mho_telegraph *telegraph);

/* A screening.  width 0: whole; else for the eye on a screen of that width, with
 * fewer digits, texts cut and columns left out. */
mho_table *mho_screening_table(mho_output *output, int width);
void mho_screening_row(mho_table *table, int width, const mho_screen_text *text,
                       const mho_screen_place *place, const mho_screen_quantities *quantities);
mho_table *mho_failures_table(mho_output *output);
void mho_failures_row(mho_table *table, const mho_screen_text *text);

/* What is wanted, how far the ranking can be trusted, and a set of warnings in
 * words; how far the screening has come. */
void mho_screening_note(mho_output *output, const mho_screen_rank_options *options,
                        const mho_screen_ranking *ranking, unsigned warnings);
void mho_screening_state_note(mho_output *output, const mho_screen_counts *counts, bool eye);

/* What was assumed for a molecule: beta, parameters, couplings, Fermi level. */
void mho_assumption_note(mho_output *output, const mho_molecule *molecule,
                         const mho_junction *junction);

/* What the plan of a molecule can do, and how many points each method settled. */
void mho_method_note(mho_output *output, const char *molecule, const mho_plan *plan,
                     const mho_point *point, size_t count);

/* What `mho check` says about a molecule. */
typedef struct {
  const mho_molecule *molecule;
  const mho_junction *junction;
  unsigned warnings;
} mho_checked;

MHO_MUST_USE mho_status mho_write_check_json(const mho_checked *checked, size_t count,
                                             mho_buffer *buffer, mho_error *error);
MHO_MUST_USE mho_status mho_write_check_screen(const mho_checked *checked, size_t count,
                                               int digits, mho_buffer *buffer,
                                               mho_error *error);

#endif
