/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "study/gallery.h"

#include <stdio.h>
#include <stdlib.h>

#include "base/text.h"
#include "report/figure.h"

enum { SVG_LIMIT = 64 << 20 };

static void clear_figure(mho_figure *figure)
{
  free(figure->file);
  free(figure->caption);
  mho_buffer_clear(&figure->svg);
}

void mho_gallery_clear(mho_gallery *gallery)
{
  for (size_t i = 0; i < gallery->figures; i++) clear_figure(&gallery->figure[i]);
  free(gallery->figure);
  *gallery = (mho_gallery){0};
}

static mho_status add_figure(mho_gallery *gallery, const char *section, char *file, char *caption,
                             mho_error *error)
{
  mho_figure *larger = realloc(gallery->figure, (gallery->figures + 1) * sizeof *larger);
  if (larger) gallery->figure = larger;
  if (!larger || !file || !caption) {
    free(file);
    free(caption);
    return mho_fail(error, MHO_ERR_MEMORY, "study", NULL, "out of memory");
  }
  gallery->figure[gallery->figures++] =
      (mho_figure){.section = section, .file = file, .caption = caption};
  return MHO_OK;
}

static mho_status render(const mho_gallery *gallery, const mho_buffer *script, mho_figure *figure,
                         bool *available, mho_error *error)
{
  static const char script_name[] = ".figure.gp";
  char *script_path = mho_folder_path(gallery->folder, script_name);
  char *path = mho_folder_path(gallery->folder, figure->file), *text = NULL;
  size_t size = 0;
  mho_status status = script_path && path
                          ? MHO_OK : mho_fail(error, MHO_ERR_MEMORY, "study", NULL, "out of memory");
  if (status == MHO_OK) status = mho_folder_write(gallery->folder, script_name, script, error);
  if (status == MHO_OK) status = mho_figure_render(script_path, path, available, error);
  if (status == MHO_OK && *available)
    status = mho_read_file(path, SVG_LIMIT, "study", &text, &size, error);
  if (status == MHO_OK && *available) mho_buffer_add_bytes(&figure->svg, text, size);
  if (script_path) remove(script_path);
  if (path && !*available) remove(path);
  free(text);
  free(path);
  free(script_path);
  return status;
}

mho_status mho_gallery_draw(mho_gallery *gallery, const char *section, char *file, char *caption,
                            const mho_buffer *script, mho_error *error)
{
  bool available = false;
  mho_status status = add_figure(gallery, section, file, caption, error);
  if (status == MHO_OK)
    status = render(gallery, script, &gallery->figure[gallery->figures - 1], &available, error);
  if (status == MHO_OK && !available) {
    gallery->without_gnuplot = true;
    clear_figure(&gallery->figure[--gallery->figures]);
  }
  return status;
}

mho_status mho_gallery_hang(mho_gallery *gallery, const char *section, char *file, char *caption,
                            mho_buffer *svg, mho_error *error)
{
  mho_status status = add_figure(gallery, section, file, caption, error);
  if (status != MHO_OK) return status;
  mho_figure *figure = &gallery->figure[gallery->figures - 1];
  figure->drawn = true;
  figure->svg = *svg;
  *svg = (mho_buffer){0};
  return mho_folder_write(gallery->folder, figure->file, &figure->svg, error);
}
