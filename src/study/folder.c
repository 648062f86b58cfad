/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "study/folder.h"

#include <dirent.h>
#include <errno.h>
#include <fcntl.h>
#include <ftw.h>
#include <signal.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>
#include <unistd.h>

#include <jansson.h>

#include "base/text.h"
#include "report/json.h"

enum { OPEN_FOLDERS = 16 };

static const char MARK[] = "provenance.json";

static mho_status fail(const char *path, mho_status status, const char *what, mho_error *error)
{
  return mho_fail_at(error, status, "study", path, 0, 0, NULL, "%s: %s", what, strerror(errno));
}

static int remove_entry(const char *path, const struct stat *status, int kind, struct FTW *place)
{
  (void)status;
  (void)kind;
  (void)place;
  return remove(path);
}

static void remove_tree(const char *path)
{
  nftw(path, remove_entry, OPEN_FOLDERS, FTW_DEPTH | FTW_PHYS);
}

/* 1: empty, 0: not, -1: cannot be read. */
static int is_empty(const char *path)
{
  DIR *folder = opendir(path);
  if (!folder) return -1;
  int empty = 1;
  const struct dirent *entry;
  while (empty && (entry = readdir(folder)))
    if (strcmp(entry->d_name, ".") && strcmp(entry->d_name, "..")) empty = 0;
  closedir(folder);
  return empty;
}

/* The files that the run of an earlier provenance.json has written; NULL where it
 * does not say, as the first versions do not. */
static json_t *read_list(const char *mark)
{
  json_t *provenance = json_load_file(mark, 0, NULL);
  json_t *files = json_incref(json_object_get(provenance, "files"));
  json_decref(provenance);
  return files;
}

static bool is_listed(const json_t *files, const char *name)
{
  if (name[0] == '.' || !strcmp(name, MARK)) return true; /* hidden: of desktops and editors */
  for (size_t i = 0; i < json_array_size(files); i++) {
    const char *known = json_string_value(json_array_get(files, i));
    if (known && !strcmp(known, name)) return true;
  }
  return false;
}

/* What somebody else has put into a results folder is not thrown away with it. */
static mho_status check_strangers(const char *target, const char *mark, mho_error *error)
{
  json_t *files = read_list(mark);
  DIR *folder = files ? opendir(target) : NULL;
  mho_status status = MHO_OK;
  const struct dirent *entry;
  while (folder && status == MHO_OK && (entry = readdir(folder)))
    if (!is_listed(files, entry->d_name))
      status = mho_fail_at(error, MHO_ERR_RANGE, "study", target, 0, 0, "output",
                           "holds '%.100s', which no run has written, and is left alone; move that "
                           "file, or choose another place with -o", entry->d_name);
  if (folder) closedir(folder);
  json_decref(files);
  return status;
}

static mho_status check_target(const char *target, mho_error *error)
{
  struct stat status;
  if (lstat(target, &status) != 0) {
    if (errno == ENOENT) return MHO_OK;
    return fail(target, MHO_ERR_WRITE, "cannot be looked at", error);
  }
  if (!S_ISDIR(status.st_mode))
    return mho_fail_at(error, MHO_ERR_RANGE, "study", target, 0, 0, "output",
                       "exists and is not a folder; choose another place with -o");
  char *mark = mho_print_text("%s/%s", target, MARK);
  if (!mark) return mho_fail(error, MHO_ERR_MEMORY, "study", NULL, "out of memory");
  bool results = access(mark, F_OK) == 0;
  mho_status strangers = results ? check_strangers(target, mark, error) : MHO_OK;
  free(mark);
  if (results || is_empty(target) == 1) return strangers;
  return mho_fail_at(error, MHO_ERR_RANGE, "study", target, 0, 0, "output",
                     "holds other files and no provenance.json, so it is not a results folder "
                     "and is left alone; choose another place with -o");
}

/* Splits a path into its folder (with the slash, or "") and its last name. */
static char *parent_of(const char *target, const char **name)
{
  const char *slash = strrchr(target, '/');
  *name = slash ? slash + 1 : target;
  return mho_print_text("%.*s", slash ? (int)(slash - target + 1) : 0, target);
}

/* Temporary folders of processes that no longer live. */
static void remove_leftovers(const char *parent, const char *prefix)
{
  DIR *folder = opendir(parent[0] ? parent : ".");
  if (!folder) return;
  const struct dirent *entry;
  size_t length = strlen(prefix);
  while ((entry = readdir(folder))) {
    if (strncmp(entry->d_name, prefix, length)) continue;
    char *end;
    long process = strtol(entry->d_name + length, &end, 10);
    if (*end || process <= 0 || kill((pid_t)process, 0) == 0 || errno != ESRCH) continue;
    char *path = mho_print_text("%s%s", parent, entry->d_name);
    if (path) remove_tree(path);
    free(path);
  }
  closedir(folder);
}

mho_status mho_folder_open(const char *target, mho_folder *folder, mho_error *error)
{
  *folder = (mho_folder){.target = mho_copy_text(target)};
  size_t length = folder->target ? strlen(folder->target) : 0;
  while (length > 1 && folder->target[length - 1] == '/') folder->target[--length] = '\0';
  const char *name;
  char *parent = folder->target ? parent_of(folder->target, &name) : NULL;
  char *prefix = parent ? mho_print_text(".%s.tmp-", name) : NULL;
  folder->temporary =
      prefix ? mho_print_text("%s%s%ld", parent, prefix, (long)getpid()) : NULL;
  mho_status status = MHO_OK;
  if (!folder->temporary)
    status = mho_fail(error, MHO_ERR_MEMORY, "study", NULL, "out of memory");
  else if (length == 0 || !strcmp(name, ".") || !strcmp(name, "..") || !name[0])
    status = mho_fail_at(error, MHO_ERR_RANGE, "study", target, 0, 0, "output",
                         "is not the name of a folder that could be made");
  else status = check_target(folder->target, error);
  if (status == MHO_OK) {
    remove_leftovers(parent, prefix);
    if (mkdir(folder->temporary, 0777) != 0 ||
        !(folder->handle = opendir(folder->temporary))) {
      status = fail(folder->target, MHO_ERR_WRITE, "cannot be made", error);
      rmdir(folder->temporary);
    }
  }
  free(parent);
  free(prefix);
  if (status != MHO_OK) {
    free(folder->temporary);
    folder->temporary = NULL;
  }
  return status;
}

char *mho_folder_path(const mho_folder *folder, const char *name)
{
  return mho_print_text("%s/%s", folder->temporary, name);
}

mho_status mho_folder_write(const mho_folder *folder, const char *name,
                            const mho_buffer *content, mho_error *error)
{
  char *path = mho_folder_path(folder, name);
  if (!path) return mho_fail(error, MHO_ERR_MEMORY, "study", NULL, "out of memory");
  mho_status status = mho_buffer_save(content, path, "study", error);
  free(path);
  return status;
}

static int compare_entries(const struct dirent **a, const struct dirent **b)
{
  return strcmp((*a)->d_name, (*b)->d_name);
}

static int is_visible(const struct dirent *entry) { return entry->d_name[0] != '.'; }

json_t *mho_folder_list(const mho_folder *folder)
{
  struct dirent **entry = NULL;
  json_t *files = json_array();
  int count = scandir(folder->temporary, &entry, is_visible, compare_entries);
  for (int i = 0; i < count; i++) {
    files = mho_json_append(files, mho_json_text(entry[i]->d_name));
    free(entry[i]);
  }
  free(entry);
  if (count >= 0) return files;
  json_decref(files);
  return NULL;
}

mho_status mho_folder_commit(mho_folder *folder, mho_error *error)
{
  mho_status status = check_target(folder->target, error); /* may have changed */
  if (status != MHO_OK) return status;
  if (access(folder->target, F_OK) != 0) {
    if (rename(folder->temporary, folder->target) != 0)
      return fail(folder->target, MHO_ERR_WRITE, "cannot be written", error);
  } else if (renameat2(AT_FDCWD, folder->temporary, AT_FDCWD, folder->target,
                       RENAME_EXCHANGE) == 0) {
    remove_tree(folder->temporary);
  } else { /* a file system that cannot exchange: two renames */
    char *old = mho_print_text("%s.old", folder->temporary);
    bool moved = old && rename(folder->target, old) == 0;
    if (!moved || rename(folder->temporary, folder->target) != 0) {
      status = fail(folder->target, MHO_ERR_WRITE, "cannot be replaced", error);
      if (moved && rename(old, folder->target) != 0)
        fail(old, MHO_ERR_WRITE, "holds the earlier results", error);
    } else {
      remove_tree(old);
    }
    free(old);
  }
  if (status == MHO_OK) {
    free(folder->temporary);
    folder->temporary = NULL;
  }
  return status;
}

/* Our own files only, and no folders among them. */
static void remove_temporary(const mho_folder *folder)
{
  const struct dirent *entry;
  rewinddir(folder->handle);
  while ((entry = readdir(folder->handle))) unlinkat(dirfd(folder->handle), entry->d_name, 0);
  rmdir(folder->temporary);
}

void mho_folder_close(mho_folder *folder)
{
  if (folder->temporary && folder->handle) remove_temporary(folder);
  if (folder->handle) closedir(folder->handle);
  free(folder->temporary);
  free(folder->target);
  *folder = (mho_folder){0};
}
