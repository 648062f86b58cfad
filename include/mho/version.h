/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef MHOLECULE_VERSION_H
#define MHOLECULE_VERSION_H

/* Every public function carries MHO_API; nothing else leaves the shared
 * library.  MHO_MUST_USE marks results that a caller may not drop. */
#if defined(__GNUC__)
#define MHO_API __attribute__((visibility("default")))
#define MHO_MUST_USE __attribute__((warn_unused_result))
#define MHO_PRINTF(format_index, first_argument) \
  __attribute__((format(printf, format_index, first_argument)))
#else
#define MHO_API
#define MHO_MUST_USE
#define MHO_PRINTF(format_index, first_argument)
#endif

#ifdef __cplusplus
#define MHO_BEGIN_DECLARATIONS extern "C" {
#define MHO_END_DECLARATIONS }
#else
#define MHO_BEGIN_DECLARATIONS
#define MHO_END_DECLARATIONS
#endif

#define MHO_VERSION "0.1.0"

MHO_BEGIN_DECLARATIONS

/* Version of the library that is linked, which may differ from MHO_VERSION
 * of the header that was compiled against. */
MHO_API const char *mho_version(void);

MHO_END_DECLARATIONS

#endif
