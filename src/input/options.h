/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Options of a question by name, in one table that serves the command line and
 * study files.
 */
#ifndef MHOLECULE_INPUT_OPTIONS_H
#define MHOLECULE_INPUT_OPTIONS_H

#include <stddef.h>

#include "input/yaml.h"

enum { MHO_OPTION_TEXT_SIZE = 400, MHO_OPTION_LIST_MAX = 8, MHO_OPTION_WORD_SIZE = 136 };

/* What a member of an options struct is; all zero: not given. */
typedef struct {
  bool given;
  double value;
} mho_option_quantity;
typedef struct {
  bool given;
  double low, high;
} mho_option_range;
typedef struct {
  bool given;
  long value;
} mho_option_count;
typedef struct {
  char text[MHO_OPTION_TEXT_SIZE]; /* "": not given */
} mho_option_text;
typedef struct {
  int count;
  char text[MHO_OPTION_LIST_MAX][MHO_OPTION_WORD_SIZE];
} mho_option_list;

typedef enum {
  MHO_OPTION_FLAG, /* bool */
  MHO_OPTION_QUANTITY,
  MHO_OPTION_RANGE,
  MHO_OPTION_COUNT,
  MHO_OPTION_TEXT,
  MHO_OPTION_LIST /* repeated on the command line, a list in a file */
} mho_option_kind;

typedef struct {
  const char *name;
  mho_option_kind kind;
  size_t offset; /* of the member */
  mho_dimension dimension;
  double low, high; /* allowed, in the base unit */
  const char *example; /* of a range */
} mho_option;

/* The row of a name, or NULL. */
const mho_option *mho_option_find(const mho_option *table, size_t count, const char *name);

/* Reads an option from the text of a command line (NULL for a flag).  On
 * failure `reason` says what is wrong and what is allowed. */
MHO_MUST_USE mho_status mho_option_read(const mho_option *option, const char *text, void *options,
                                        char *reason, size_t reason_size);

/* Reads every option that a mapping has; a range is a list of two quantities. */
void mho_yaml_get_options(const mho_yaml *document, const mho_yaml_node *mapping,
                          const mho_option *table, size_t count, void *options);

#endif
