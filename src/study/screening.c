/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "study/screening.h"

#include <stdlib.h>
#include <string.h>

#include <mho/screen_store.h>

#include "base/text.h"
#include "report/stages.h"

/* What is wanted: options first, then what the store was made for. */
typedef struct {
  mho_screen_rank_options rank;
  mho_screen_requirement requirement[SCREENING_REQUIREMENTS_MAX];
} aims;

static mho_status read_stored_requirements(const char *text, aims *a, char *reason, size_t size)
{
  mho_status status = MHO_OK;
  const size_t most = sizeof a->requirement / sizeof *a->requirement;
  while (status == MHO_OK && *text && a->rank.requirements < most) {
    size_t length = strcspn(text, ";");
    char *one = mho_print_text("%.*s", (int)length, text);
    if (!one) return MHO_ERR_MEMORY;
    status = mho_screen_require_read(one, &a->requirement[a->rank.requirements++], reason, size);
    free(one);
    text += length + (text[length] == ';');
  }
  return status;
}

static mho_status find_aims(const mho_screening_question *s, const mho_screen_store *store,
                            const char *path, aims *a, mho_error *error)
{
  char reason[1000] = "";
  mho_status status = MHO_OK;
  const char *goal = mho_screen_store_meta(store, "goal");
  const char *require = mho_screen_store_meta(store, "require");
  const char *seed = mho_screen_store_meta(store, "seed");
  *a = (aims){.rank = mho_screen_rank_defaults()};
  if (s->has_goal) a->rank.goal = s->goal;
  else if (goal) status = mho_screen_goal_read(goal, &a->rank.goal, reason, sizeof reason);
  if (s->requirements > 0) {
    memcpy(a->requirement, s->requirement, sizeof a->requirement);
    a->rank.requirements = (size_t)s->requirements;
  } else if (status == MHO_OK && require) {
    status = read_stored_requirements(require, a, reason, sizeof reason);
  }
  a->rank.requirement = a->requirement;
  if (s->has_seed) a->rank.seed = s->seed;
  else if (seed) a->rank.seed = strtoull(seed, NULL, 10);
  if (s->has_top) a->rank.top = (size_t)s->top;
  if (status == MHO_OK) return MHO_OK;
  return mho_fail_at(error, MHO_ERR_RANGE, "study", path, 0, 0, NULL, "is damaged: %s", reason);
}

/* Candidates by rank; those without one are left out. */
static size_t *sort_places(const mho_screen_place *place, size_t count, size_t ranked)
{
  size_t *order = calloc(ranked + 1, sizeof *order);
  for (size_t i = 0; order && i < count; i++)
    if (place[i].rank >= 1 && place[i].rank <= ranked) order[place[i].rank - 1] = i;
  return order;
}

typedef struct {
  mho_screen_store *store;
  aims aims;
  mho_screen_quantities *quantities;
  uint64_t *row;
  mho_screen_place *place;
  size_t count, *order;
  mho_screen_ranking ranking;
} shelf;

static mho_status load(const mho_screening_question *question, const char *path, shelf *sh,
                       mho_error *error)
{
  mho_status status = find_aims(question, sh->store, path, &sh->aims, error);
  if (status == MHO_OK)
    status = mho_screen_store_load(sh->store, &sh->quantities, &sh->row, &sh->count, error);
  if (status != MHO_OK) return status;
  sh->place = calloc(sh->count + 1, sizeof *sh->place);
  if (!sh->place) return mho_fail(error, MHO_ERR_MEMORY, "study", NULL, "out of memory");
  status = mho_screen_rank(sh->quantities, sh->count, &sh->aims.rank, sh->place, &sh->ranking, error);
  if (status != MHO_OK) return status;
  sh->order = sort_places(sh->place, sh->count, sh->ranking.ranked);
  return sh->order ? MHO_OK : mho_fail(error, MHO_ERR_MEMORY, "study", NULL, "out of memory");
}

/* The first three names. */
static mho_status answer_in_words(const shelf *sh, char **answer, mho_error *error)
{
  mho_buffer words = {0};
  mho_status status = MHO_OK;
  size_t ranked = sh->ranking.ranked;
  uint64_t good = mho_screen_store_counts(sh->store)->good;
  if (ranked == 0) mho_buffer_add(&words, "No candidate of the list meets what is required");
  else if (ranked < good)
    mho_buffer_print(&words, "Best of the %zu of %llu candidates that meet what is required: ", ranked,
                     (unsigned long long)good);
  else mho_buffer_print(&words, "Best of %zu candidates: ", ranked);
  for (size_t i = 0; status == MHO_OK && i < 3 && i < ranked; i++) {
    mho_screen_text text;
    status = mho_screen_store_candidate(sh->store, sh->row[sh->order[i]], &text, error);
    if (status == MHO_OK) mho_buffer_print(&words, "%s%.60s", i ? ", " : "", text.name);
  }
  mho_buffer_add(&words, ".");
  if (status == MHO_OK) status = mho_buffer_check(&words, "study", error);
  if (status == MHO_OK) *answer = words.data;
  else mho_buffer_clear(&words);
  return status;
}

static mho_status list_places(const mho_screening_view *view, const shelf *sh, mho_output *output,
                              mho_error *error)
{
  size_t ranked = sh->ranking.ranked, top = sh->aims.rank.top;
  size_t shown = view->all || ranked < top ? ranked : top;
  unsigned warnings = 0;
  mho_status status = MHO_OK;
  mho_table *table = mho_screening_table(output, view->width);
  for (size_t i = 0; status == MHO_OK && i < shown; i++) {
    size_t at = sh->order[i];
    mho_screen_text text;
    status = mho_screen_store_candidate(sh->store, sh->row[at], &text, error);
    if (status != MHO_OK) break;
    mho_screening_row(table, view->width, &text, &sh->place[at], &sh->quantities[at]);
    if (!view->eye) mho_output_warn(output, text.name, (unsigned)sh->quantities[at].warnings);
    warnings |= (unsigned)sh->quantities[at].warnings;
  }
  if (!view->remarks || status != MHO_OK) return status;
  if (shown < ranked)
    mho_output_note(output, "the first %zu of %zu%s", shown, ranked,
                    view->eye ? "; --top N lists more, --csv all" : "");
  mho_screening_note(output, &sh->aims.rank, &sh->ranking, view->eye ? warnings : 0);
  mho_screening_state_note(output, mho_screen_store_counts(sh->store), view->eye);
  return MHO_OK;
}

mho_status mho_screening_list(const mho_screening_question *question, const char *path,
                              const mho_screening_view *view, mho_output *output, char **answer,
                              mho_error *error)
{
  shelf sh = {0};
  mho_status status = mho_screen_store_open(path, &sh.store, error);
  if (status == MHO_OK) status = load(question, path, &sh, error);
  if (status == MHO_OK) status = list_places(view, &sh, output, error);
  if (answer) *answer = NULL;
  if (status == MHO_OK && answer) status = answer_in_words(&sh, answer, error);
  free(sh.quantities);
  free(sh.row);
  free(sh.place);
  free(sh.order);
  mho_screen_store_close(sh.store);
  return status;
}

mho_status mho_screening_failures(const char *path, mho_output *output, mho_error *error)
{
  mho_screen_store *store;
  mho_screen_text text = {0};
  mho_status status = mho_screen_store_open(path, &store, error);
  mho_table *table = mho_failures_table(output);
  while (status == MHO_OK) {
    status = mho_screen_store_failure(store, text.row, &text, error);
    if (status != MHO_OK || !text.row) break;
    mho_failures_row(table, &text);
  }
  mho_screen_store_close(store);
  return status;
}
