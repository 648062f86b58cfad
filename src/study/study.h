/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * What a study file says.
 */
#ifndef MHOLECULE_STUDY_STUDY_H
#define MHOLECULE_STUDY_STUDY_H

#include <mho/compare.h>
#include <mho/molecule.h>
#include <mho/study.h>
#include <mho/traces.h>

#include "study/interference.h"
#include "study/screening.h"
#include "study/twist.h"

typedef struct {
  char *path; /* as opened */
  char *name; /* as the study names it */
} mho_study_input;

/* Traces of one molecule. */
typedef struct {
  int molecule;
  mho_trace_options options; /* columns is owned */
  char **path;
  size_t paths;
} mho_study_traces;

struct mho_study {
  char *path, *title;
  mho_settings defaults; /* owns what molecules may point to */
  int molecule_count;
  mho_molecule *molecule;
  mho_study_input *input; /* files that were read, the study first */
  int input_count;
  mho_measured_peak *peak;
  int peak_count;
  mho_study_traces *traces;
  int traces_count;
  /* questions */
  bool has_energies;
  double energy_low_ev, energy_high_ev;
  long samples; /* 0: as the resonances ask for */
  double window_ev;
  bool sensitivity, currents, orbitals;
  mho_twist_question twist;
  mho_interference_question interference;
  bool *asks_twist, *asks_interference; /* [molecule_count] */
  char *screen_list; /* NULL: no screening is asked for */
  mho_settings screen_settings; /* what goes above molecule files */
  mho_screening_question screening;
  bool compare;
  int reference; /* index, or -1 */
};

#endif
