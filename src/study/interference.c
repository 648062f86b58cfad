/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "study/interference.h"

#include <stdlib.h>

const mho_option *mho_interference_question_options(size_t *count)
{
#define AT(member) offsetof(mho_interference_question, member)
  static const mho_option table[] = {
      {"rules", MHO_OPTION_FLAG, AT(rules), 0, 0, 0, NULL},
      {"modify", MHO_OPTION_FLAG, AT(modify), 0, 0, 0, NULL},
      {"every-site", MHO_OPTION_FLAG, AT(every_site), 0, 0, 0, NULL},
      {"from", MHO_OPTION_TEXT, AT(from), 0, 0, 0, NULL},
      {"window", MHO_OPTION_QUANTITY, AT(window), MHO_ENERGY, 0, 10, NULL}};
#undef AT
  *count = sizeof table / sizeof *table;
  return table;
}

const char *mho_interference_conflict(const mho_interference_question *q, bool one_table)
{
  if (q->window.given && !q->modify) return "--window belongs to --modify";
  if (!one_table || !q->modify) return NULL;
  if (q->rules || q->every_site) return "--modify keeps the contacts; it excludes --rules and --every-site";
  return q->from.text[0] ? "--from belongs to pairs; --modify excludes it" : NULL;
}

double mho_interference_window(const mho_interference_question *q)
{
  return q->window.given ? q->window.value : MHO_DEFAULT_WINDOW_EV;
}

/* Leaves the pairs with one site. */
static void keep_from(mho_interference *map, int from)
{
  size_t kept = 0;
  for (size_t p = 0; p < map->count; p++) {
    mho_pair pair = map->pair[p];
    if (pair.site[0] == from || pair.site[1] == from) map->pair[kept++] = pair;
    else free(pair.magic);
  }
  map->count = kept;
}

mho_status mho_interference_find(const mho_interference_question *q, const mho_molecule *m,
                                 const mho_junction *junction, bool full, mho_interference *map,
                                 int *from, mho_error *error)
{
  mho_interference_options options = mho_interference_defaults(m);
  options.every_site = q->every_site;
  options.nodes = options.magic = full;
  *map = (mho_interference){0};
  *from = q->from.text[0] ? mho_molecule_find_site(m, q->from.text) : -1;
  if (q->from.text[0] && *from < 0)
    return mho_fail_at(error, MHO_ERR_REFERENCE, "study", m->source ? m->source : m->name, 0, 0,
                       "from", "--from: there is no site '%.60s' in the pi system", q->from.text);
  mho_status status = mho_interference_map(m, junction, &options, map, error);
  if (status == MHO_OK && *from >= 0) keep_from(map, *from);
  return status;
}
