/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The table meta: what the content of a store depends on.  Numbers have all
 * their digits, so that equal texts are equal settings.
 */
#include <sha2.h>
#include <stdarg.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include <mho/quantity.h>

#include "base/buffer.h"
#include "base/text.h"
#include "screen/store.h"

void mho_meta_add(mho_meta *meta, const char *key, const char *format, ...)
{
  mho_meta_pair *pair = &meta->pair[meta->count];
  if (meta->count == (int)(sizeof meta->pair / sizeof *meta->pair)) {
    meta->failed = true;
    return;
  }
  va_list arguments;
  va_start(arguments, format);
  int length = vsnprintf(NULL, 0, format, arguments);
  va_end(arguments);
  *pair = (mho_meta_pair){.key = mho_copy_text(key),
                          .value = length < 0 ? NULL : malloc((size_t)length + 1)};
  meta->count++;
  if (!pair->key || !pair->value) {
    meta->failed = true;
    return;
  }
  va_start(arguments, format);
  vsnprintf(pair->value, (size_t)length + 1, format, arguments);
  va_end(arguments);
}

static void leave_open(mho_meta *meta) { meta->pair[meta->count - 1].open = true; }

const char *mho_meta_find(const mho_meta *meta, const char *key)
{
  for (int i = 0; i < meta->count; i++)
    if (meta->pair[i].key && !strcmp(meta->pair[i].key, key)) return meta->pair[i].value;
  return NULL;
}

void mho_meta_clear(mho_meta *meta)
{
  for (int i = 0; i < meta->count; i++) {
    free(meta->pair[i].key);
    free(meta->pair[i].value);
  }
  *meta = (mho_meta){0};
}

/* A number with its unit; what is not set is marked as the default, because a
 * molecule file of the list may say otherwise. */
static void add_number(mho_meta *meta, const char *key, bool set, double value, const char *unit)
{
  char number[32];
  const char *end;
  double back;
  mho_number_write(number, sizeof number, 15, value);
  if (!mho_number_read(number, &end, &back) || back != value)
    mho_number_write(number, sizeof number, 17, value);
  mho_meta_add(meta, key, "%s%s%s", number, unit, set ? "" : " (default)");
}

/* Name of a parameter set; of a file also its content. */
static void add_parameters(mho_meta *meta, const mho_settings *s)
{
  const mho_parameter_set *set = s->parameters;
  if (!set || set != s->own_parameters) {
    mho_meta_add(meta, "parameters", "%s", set ? mho_parameters_name(set) : "van-catledge (default)");
    return;
  }
  mho_buffer text = {0};
  int rows = mho_parameters_count(set);
  for (int i = 0; i < rows; i++) {
    mho_buffer_print(&text, "%s %d ", mho_parameters_row_name(set, i), mho_parameters_electrons(set, i));
    mho_buffer_number(&text, 17, mho_parameters_h(set, i));
    for (int k = 0; k <= i; k++) {
      mho_buffer_add(&text, " ");
      mho_buffer_number(&text, 17, mho_parameters_k(set, i, k));
    }
    mho_buffer_add(&text, "\n");
  }
  char digest[SHA256_DIGEST_STRING_LENGTH];
  if (text.failed || !SHA256Data((const uint8_t *)text.data, text.size, digest)) meta->failed = true;
  else mho_meta_add(meta, "parameters", "%s, sha256 %s", mho_parameters_name(set), digest);
  mho_buffer_clear(&text);
}

static void add_settings(mho_meta *meta, const mho_settings *s)
{
  static const char *const alternation[] = {"formal", "none"}, *const hopping[] = {"table", "bond-length"},
                    *const alkyl[] = {"ignored", "inductive", "heteroatom"};
  char fermi[96];
  mho_fermi_write(&s->fermi, fermi, sizeof fermi);
  if (s->has_fermi) add_number(meta, "fermi_offset", true, s->fermi.offset_ev, " eV");
  mho_meta_add(meta, "fermi", "%s", s->has_fermi ? fermi : "0 eV (default)");
  add_number(meta, "beta", s->has_beta, s->has_beta ? s->beta_ev : MHO_DEFAULT_BETA_EV, " eV");
  add_number(meta, "temperature", s->has_temperature,
             s->has_temperature ? s->temperature_k : MHO_DEFAULT_TEMPERATURE_K, " K");
  if (s->has_coupling) add_number(meta, "coupling", true, s->coupling_ev, " eV");
  else mho_meta_add(meta, "coupling", "of the linkers (default)");
  mho_meta_add(meta, "alternation", "%s%s", alternation[s->has_alternation ? s->alternation : 0],
               s->has_alternation ? "" : " (default)");
  mho_meta_add(meta, "alkyl", "%s%s", alkyl[s->has_alkyl ? s->alkyl : 0],
               s->has_alkyl ? "" : " (default)");
  mho_meta_add(meta, "hopping", "%s%s", hopping[s->has_hopping ? s->hopping : 0],
               s->has_hopping ? "" : " (default)");
  add_parameters(meta, s);
}

static void add_aims(mho_meta *meta, const mho_screen_job *job)
{
  char text[200];
  mho_buffer all = {0};
  mho_screen_rank_options defaults = mho_screen_rank_defaults();
  mho_meta_add(meta, "goal", "%s",
               mho_screen_goal_write(job->goal ? job->goal : &defaults.goal, text, sizeof text));
  if (!job->goal) leave_open(meta);
  for (size_t i = 0; i < job->requirements; i++)
    mho_buffer_print(&all, "%s%s", i ? "; " : "",
                     mho_screen_require_write(&job->requirement[i], text, sizeof text));
  if (all.failed) meta->failed = true;
  mho_meta_add(meta, "require", "%s", all.data ? all.data : "");
  if (job->requirements == 0) leave_open(meta);
  mho_buffer_clear(&all);
}

static void add_shared_names(mho_meta *meta)
{
  mho_buffer names = {0};
  char name[64];
  for (int i = 0; i < MHO_SHARED_COUNT; i++)
    mho_buffer_print(&names, "%s%s", i ? ", " : "", mho_screen_shared_name(i, name, sizeof name));
  if (names.failed) meta->failed = true;
  else mho_meta_add(meta, "shared_parameters", "%s", names.data);
  mho_buffer_clear(&names);
}

mho_status mho_meta_of_job(const mho_screen_job *job, const mho_candidates *list, uint64_t rows,
                           mho_meta *meta, mho_error *error)
{
  char digest[MHO_DIGEST_SIZE];
  *meta = (mho_meta){0};
  mho_status status = mho_candidates_digest(list, digest, error);
  if (status != MHO_OK) return status;
  mho_meta_add(meta, "mholecule", "%s", mho_version());
  mho_meta_add(meta, "list", "%s", job->list);
  leave_open(meta);
  mho_meta_add(meta, "list_format", "%s", mho_candidates_format(list));
  mho_meta_add(meta, "list_sha256", "%s", digest);
  mho_meta_add(meta, "rows", "%llu", (unsigned long long)rows);
  add_settings(meta, mho_candidates_settings(list));
  add_number(meta, "window", true, job->screen.window_ev, " eV");
  mho_meta_add(meta, "samples", "%d", job->screen.sensitivity.samples);
  mho_meta_add(meta, "seed", "%llu", (unsigned long long)job->screen.sensitivity.seed);
  add_aims(meta, job);
  add_shared_names(meta);
  return meta->failed ? mho_fail(error, MHO_ERR_MEMORY, "screen", NULL, "out of memory") : MHO_OK;
}

static mho_status differ(const char *path, const char *key, const char *stored, const char *now,
                         mho_error *error)
{
  if (!strcmp(key, "list_sha256") || !strcmp(key, "rows"))
    return mho_fail_at(error, MHO_ERR_RANGE, "screen", path, 0, 0, key,
                       "is of another list (%s: %s in the store, %s now); finish it with the list "
                       "it was begun with, or choose another store", key, stored, now);
  return mho_fail_at(error, MHO_ERR_RANGE, "screen", path, 0, 0, key,
                     "was begun with %s = %s, which is %s now; give the same options, or choose "
                     "another store", key, stored, now);
}

mho_status mho_meta_compare(const mho_meta *stored, const mho_meta *now, const char *path,
                            mho_error *error)
{
  mho_status status = MHO_OK;
  for (int i = 0; i < now->count; i++) {
    const mho_meta_pair *pair = &now->pair[i];
    const char *before = mho_meta_find(stored, pair->key);
    if (pair->open || (before && !strcmp(before, pair->value))) continue;
    status = differ(path, pair->key, before ? before : "nothing", pair->value, error);
  }
  for (int i = 0; i < stored->count; i++)
    if (!mho_meta_find(now, stored->pair[i].key))
      status = differ(path, stored->pair[i].key, stored->pair[i].value, "nothing", error);
  return status;
}
