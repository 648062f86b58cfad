/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "input/yaml.h"

#include <stdlib.h>
#include <string.h>

#include <yaml.h>

#include "base/text.h"

enum {
  FILE_LIMIT = 8 << 20,
  DEPTH_LIMIT = 16,
  NODE_LIMIT = 200000,
  MAPPING_LIMIT = 200,
  TEXT_LIMIT = 100000
};

typedef struct {
  mho_yaml *document;
  const char *input; /* the text of the file */
  yaml_parser_t parser;
  yaml_event_t event;
  size_t nodes;
} walker;

static void node_free(mho_yaml_node *node)
{
  if (!node) return;
  for (size_t i = 0; i < node->count; i++) {
    node_free(node->item[i]);
    if (node->key) node_free(node->key[i]);
  }
  free(node->item);
  free(node->key);
  free(node->text);
  free(node);
}

void mho_yaml_clear(mho_yaml *document)
{
  node_free(document->root);
  free(document->file);
  document->root = NULL;
  document->file = NULL;
}

static mho_status fail_mark(const walker *w, yaml_mark_t mark, mho_status status,
                            const char *message)
{
  return mho_fail_at(w->document->error, status, "input", w->document->file,
                     (long)mark.line + 1, (long)mark.column + 1, NULL, "%s", message);
}

static mho_status fail_memory(const walker *w)
{
  return mho_fail_at(w->document->error, MHO_ERR_MEMORY, "input", w->document->file, 0, 0,
                     NULL, "out of memory");
}

/* What libyaml stumbles over most, in words: a tab, and a SMILES without the
 * quotes that its brackets need.  NULL: nothing of the kind in this line. */
static const char *find_habit(const walker *w, size_t number)
{
  const char *line = w->input;
  for (; line && number > 0; number--) {
    line = strchr(line, '\n');
    if (line) line++;
  }
  if (!line) return NULL;
  size_t length = strcspn(line, "\r\n"), blanks = strspn(line, " \t");
  if (memchr(line, '\t', blanks < length ? blanks : length))
    return "a tab stands before the first word; YAML is indented with blanks";
  const char *smiles = strstr(line, "smiles:");
  if (!smiles || smiles >= line + length) return NULL;
  smiles += strlen("smiles:");
  smiles += strspn(smiles, " ");
  bool quoted = *smiles == '"' || *smiles == '\'';
  return quoted || !memchr(smiles, '[', strcspn(smiles, ",}\r\n"))
             ? NULL : "write the SMILES in quotes, smiles: \"[SH:1]c1...\"";
}

static mho_status next_event(walker *w)
{
  yaml_event_delete(&w->event);
  if (yaml_parser_parse(&w->parser, &w->event)) return MHO_OK;
  memset(&w->event, 0, sizeof w->event);
  if (w->parser.error == YAML_MEMORY_ERROR) return fail_memory(w);
  yaml_mark_t mark = w->parser.problem_mark;
  const char *habit = find_habit(w, mark.line);
  if (habit) return fail_mark(w, mark, MHO_ERR_SYNTAX, habit);
  return mho_fail_at(w->document->error, MHO_ERR_SYNTAX, "input", w->document->file,
                     (long)mark.line + 1, (long)mark.column + 1, NULL,
                     "this is not valid YAML: %s%s%s",
                     w->parser.problem ? w->parser.problem : "unknown problem",
                     w->parser.context ? " " : "",
                     w->parser.context ? w->parser.context : "");
}

static mho_status refuse_references(const walker *w, const yaml_char_t *anchor,
                                    const yaml_char_t *tag)
{
  if (anchor)
    return fail_mark(w, w->event.start_mark, MHO_ERR_SYNTAX,
                     "anchors (&name) are not allowed; write the value out");
  if (tag)
    return fail_mark(w, w->event.start_mark, MHO_ERR_SYNTAX,
                     "tags (!name) are not allowed; write the plain value");
  return MHO_OK;
}

static mho_status node_create(walker *w, mho_yaml_kind kind, mho_yaml_node **node)
{
  if (++w->nodes > NODE_LIMIT)
    return fail_mark(w, w->event.start_mark, MHO_ERR_LIMIT,
                     "the file holds more than 200000 values");
  *node = calloc(1, sizeof **node);
  if (!*node) return fail_memory(w);
  (*node)->kind = kind;
  (*node)->line = (long)w->event.start_mark.line + 1;
  (*node)->column = (long)w->event.start_mark.column + 1;
  return MHO_OK;
}

/* Room for one more item (and key). */
static bool node_grow(mho_yaml_node *node)
{
  if (node->count & (node->count - 1) && node->count) return true;
  size_t capacity = node->count ? 2 * node->count : 1;
  mho_yaml_node **item = realloc(node->item, capacity * sizeof *item);
  if (item) node->item = item;
  if (!item) return false;
  if (node->kind != MHO_YAML_MAPPING) return true;
  mho_yaml_node **key = realloc(node->key, capacity * sizeof *key);
  if (key) node->key = key;
  return key != NULL;
}

static mho_status read_text(walker *w, mho_yaml_node **result)
{
  mho_status status = refuse_references(w, w->event.data.scalar.anchor,
                                        w->event.data.scalar.tag);
  if (status != MHO_OK) return status;
  const char *value = (const char *)w->event.data.scalar.value;
  size_t length = w->event.data.scalar.length;
  if (length > TEXT_LIMIT)
    return fail_mark(w, w->event.start_mark, MHO_ERR_LIMIT,
                     "a text is longer than 100000 bytes");
  if (memchr(value, '\0', length))
    return fail_mark(w, w->event.start_mark, MHO_ERR_SYNTAX,
                     "a text must not contain a NUL character");
  status = node_create(w, MHO_YAML_TEXT, result);
  if (status != MHO_OK) return status;
  (*result)->quoted = w->event.data.scalar.style == YAML_SINGLE_QUOTED_SCALAR_STYLE ||
                      w->event.data.scalar.style == YAML_DOUBLE_QUOTED_SCALAR_STYLE;
  (*result)->text = mho_copy_text(value);
  return (*result)->text ? MHO_OK : fail_memory(w);
}

static mho_status check_key(const walker *w, const mho_yaml_node *mapping,
                            const mho_yaml_node *key)
{
  if (mapping->count >= MAPPING_LIMIT)
    return fail_mark(w, w->event.start_mark, MHO_ERR_LIMIT,
                     "a mapping holds more than 200 keys");
  const mho_yaml_node *first = NULL;
  for (size_t i = 0; i < mapping->count && !first; i++)
    if (!strcmp(mapping->key[i]->text, key->text)) first = mapping->key[i];
  /* Goes on: the first value counts, the file is refused in the end. */
  if (first)
    mho_yaml_fail(w->document, key, MHO_ERR_KEY, key->text,
                  "key '%.40s' is given twice; it stands in line %ld already", key->text,
                  first->line);
  return MHO_OK;
}

static mho_status read_node(walker *w, int depth, mho_yaml_node **result);

static mho_status read_collection(walker *w, int depth, mho_yaml_node *node)
{
  bool mapping = node->kind == MHO_YAML_MAPPING;
  yaml_event_type_t end = mapping ? YAML_MAPPING_END_EVENT : YAML_SEQUENCE_END_EVENT;
  for (;;) {
    mho_status status = next_event(w);
    if (status != MHO_OK) return status;
    if (w->event.type == end) return MHO_OK;
    mho_yaml_node *key = NULL, *value = NULL;
    if (mapping) {
      if (w->event.type != YAML_SCALAR_EVENT)
        return fail_mark(w, w->event.start_mark, MHO_ERR_SYNTAX,
                         w->event.type == YAML_ALIAS_EVENT
                             ? "aliases (*name) are not allowed; write the value out"
                             : "a key must be a plain word");
      status = read_text(w, &key);
      if (status == MHO_OK) status = check_key(w, node, key);
      if (status == MHO_OK) status = next_event(w);
    }
    if (status == MHO_OK) status = read_node(w, depth + 1, &value);
    if (status == MHO_OK && !node_grow(node)) status = fail_memory(w);
    if (status != MHO_OK) {
      node_free(key);
      node_free(value);
      return status;
    }
    if (mapping) node->key[node->count] = key;
    node->item[node->count++] = value;
  }
}

static mho_status read_node(walker *w, int depth, mho_yaml_node **result)
{
  *result = NULL;
  if (depth > DEPTH_LIMIT)
    return fail_mark(w, w->event.start_mark, MHO_ERR_LIMIT,
                     "values are nested deeper than 16 levels");
  mho_status status;
  switch (w->event.type) {
  case YAML_SCALAR_EVENT: return read_text(w, result);
  case YAML_ALIAS_EVENT:
    return fail_mark(w, w->event.start_mark, MHO_ERR_SYNTAX,
                     "aliases (*name) are not allowed; write the value out");
  case YAML_SEQUENCE_START_EVENT:
    status = refuse_references(w, w->event.data.sequence_start.anchor,
                               w->event.data.sequence_start.tag);
    if (status == MHO_OK) status = node_create(w, MHO_YAML_LIST, result);
    break;
  case YAML_MAPPING_START_EVENT:
    status = refuse_references(w, w->event.data.mapping_start.anchor,
                               w->event.data.mapping_start.tag);
    if (status == MHO_OK) status = node_create(w, MHO_YAML_MAPPING, result);
    break;
  default:
    return fail_mark(w, w->event.start_mark, MHO_ERR_SYNTAX, "a value is missing here");
  }
  return status == MHO_OK ? read_collection(w, depth, *result) : status;
}

static mho_status read_document(walker *w)
{
  mho_yaml *document = w->document;
  mho_status status = next_event(w); /* stream start */
  if (status == MHO_OK) status = next_event(w);
  if (status != MHO_OK) return status;
  if (w->event.type == YAML_STREAM_END_EVENT)
    return mho_fail_at(document->error, MHO_ERR_SYNTAX, "input", document->file, 1, 1, NULL,
                       "the file is empty; a mapping of keys is needed");
  status = next_event(w);
  if (status == MHO_OK) status = read_node(w, 0, &document->root);
  if (status == MHO_OK) status = next_event(w); /* document end */
  if (status == MHO_OK) status = next_event(w);
  if (status != MHO_OK) return status;
  if (w->event.type != YAML_STREAM_END_EVENT)
    return fail_mark(w, w->event.start_mark, MHO_ERR_SYNTAX,
                     "a second document begins here; one a file is allowed");
  if (document->root->kind != MHO_YAML_MAPPING)
    return mho_fail_at(document->error, MHO_ERR_SYNTAX, "input", document->file,
                       document->root->line, document->root->column, NULL,
                       "a mapping of keys such as 'name: ...' is needed here");
  return MHO_OK;
}

static mho_status check_encoding(const mho_yaml *document, const char *text, size_t size)
{
  size_t good = mho_utf8_prefix(text, size);
  if (good == size) return MHO_OK;
  long line = 1, column = 1;
  for (size_t i = 0; i < good; i++) {
    column++;
    if (text[i] == '\n') line++, column = 1;
  }
  return mho_fail_at(document->error, MHO_ERR_SYNTAX, "input", document->file, line, column,
                     NULL, "this is not UTF-8 text; save the file as UTF-8");
}

mho_status mho_yaml_read(const char *path, mho_yaml *document, mho_error *error)
{
  *document = (mho_yaml){.error = error, .file = mho_copy_text(path)};
  walker w = {.document = document};
  if (!document->file) return mho_fail(error, MHO_ERR_MEMORY, "input", NULL, "out of memory");
  int before = error->count;
  char *text = NULL;
  size_t size = 0;
  mho_status status = mho_read_file(path, FILE_LIMIT, "input", &text, &size, error);
  if (status == MHO_OK) status = check_encoding(document, text, size);
  if (status == MHO_OK && !yaml_parser_initialize(&w.parser)) status = fail_memory(&w);
  else if (status == MHO_OK) {
    yaml_parser_set_encoding(&w.parser, YAML_UTF8_ENCODING);
    size_t mark = !strncmp(text, "\xEF\xBB\xBF", 3) ? 3 : 0; /* some editors begin with it */
    w.input = text + mark;
    yaml_parser_set_input_string(&w.parser, (const unsigned char *)w.input, size - mark);
    status = read_document(&w);
    yaml_event_delete(&w.event);
    yaml_parser_delete(&w.parser);
  }
  free(text);
  if (status == MHO_OK && error->count > before) status = error->cause[before].status;
  return status;
}
