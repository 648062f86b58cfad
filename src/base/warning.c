/* SPDX-License-Identifier: GPL-3.0-or-later */
#include <mho/warning.h>

#include <stddef.h>

static const struct {
  const char *word, *sentence;
} warnings[] = {
#define MHO_WARNING_ROW(code, word, sentence) {word, sentence},
    MHO_WARNING_LIST(MHO_WARNING_ROW)
#undef MHO_WARNING_ROW
};

const char *mho_warning_word(int index)
{
  return index >= 0 && index < MHO_WARNING_COUNT ? warnings[index].word : NULL;
}

const char *mho_warning_sentence(int index)
{
  return index >= 0 && index < MHO_WARNING_COUNT ? warnings[index].sentence : NULL;
}
