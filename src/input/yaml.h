/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * A YAML document as a tree that knows where every value stands, read over
 * libyaml's event interface.  Anchors, aliases, tags and second documents are
 * refused (an alias is how a small file becomes a large one); depth, number of
 * values and file size are capped.
 *
 * The typed readers below add a cause to the document's error object and
 * return false; a reader of a file goes on after each, so that all mistakes of
 * a file are reported together.  A NULL node is "absent": false, no error.
 */
#ifndef MHOLECULE_INPUT_YAML_H
#define MHOLECULE_INPUT_YAML_H

#include <mho/quantity.h>
#include <mho/settings.h>
#include <mho/status.h>

typedef enum { MHO_YAML_TEXT, MHO_YAML_LIST, MHO_YAML_MAPPING } mho_yaml_kind;

typedef struct mho_yaml_node mho_yaml_node;
struct mho_yaml_node {
  mho_yaml_kind kind;
  long line, column;
  char *text;           /* of a MHO_YAML_TEXT */
  bool quoted;          /* the text begins one column further */
  size_t count;         /* items, or pairs of a mapping */
  mho_yaml_node **item; /* items, or values of a mapping */
  mho_yaml_node **key;  /* keys of a mapping, texts */
};

typedef struct {
  char *file; /* as named in messages */
  mho_yaml_node *root;
  mho_error *error;
} mho_yaml;

/* Reads a file; the root must be a mapping.  The caller clears the document,
 * also after a failure.  error must not be NULL. */
MHO_MUST_USE mho_status mho_yaml_read(const char *path, mho_yaml *document,
                                      mho_error *error);
void mho_yaml_clear(mho_yaml *document);

/* Adds a cause at a node. */
void mho_yaml_fail(const mho_yaml *document, const mho_yaml_node *node,
                   mho_status status, const char *field, const char *format, ...)
    MHO_PRINTF(5, 6);

/* Value of a key, or NULL. */
const mho_yaml_node *mho_yaml_find(const mho_yaml_node *mapping, const char *key);

/* The same; a missing key is an error at the mapping. */
const mho_yaml_node *mho_yaml_require(const mho_yaml *document,
                                      const mho_yaml_node *mapping, const char *key);

/* Refuses every key that is not among `known`, naming the nearest one. */
void mho_yaml_check_keys(const mho_yaml *document, const mho_yaml_node *mapping,
                         const char *const *known, size_t count);

bool mho_yaml_is(const mho_yaml *document, const mho_yaml_node *node,
                 mho_yaml_kind kind, const char *field);

/* A non-empty text; *text points into the document. */
bool mho_yaml_get_text(const mho_yaml *document, const mho_yaml_node *node,
                       const char *field, const char **text);

/* A quantity in [low, high] of the base unit. */
bool mho_yaml_get_quantity(const mho_yaml *document, const mho_yaml_node *node,
                           const char *field, mho_dimension dimension, double low,
                           double high, double *value);

bool mho_yaml_get_number(const mho_yaml *document, const mho_yaml_node *node,
                         const char *field, double low, double high, double *value);

bool mho_yaml_get_integer(const mho_yaml *document, const mho_yaml_node *node,
                          const char *field, long low, long high, long *value);

/* Index of the text among `choices`. */
bool mho_yaml_get_choice(const mho_yaml *document, const mho_yaml_node *node,
                         const char *field, const char *const *choices,
                         size_t count, size_t *index);

/* Every setting that the mapping has among its keys (see mho_settings_names);
 * the Fermi level remembers its place. */
void mho_yaml_get_settings(const mho_yaml *document, const mho_yaml_node *mapping,
                           mho_settings *settings);

/* true or false. */
bool mho_yaml_get_flag(const mho_yaml *document, const mho_yaml_node *node,
                       const char *field, bool *value);

/* A text, or a list or mapping of texts as `a, b` or `key = a, other = b`, in
 * buffer; what does not fit is an error. */
bool mho_yaml_get_joined(const mho_yaml *document, const mho_yaml_node *node,
                         const char *field, char *buffer, size_t size);

/* A list of {bond: C5-C8, angle: 38 deg}. */
void mho_yaml_get_twists(const mho_yaml *document, const mho_yaml_node *list,
                         mho_settings *settings);

#endif
