/* SPDX-License-Identifier: LGPL-3.0-or-later
 * status.c: the texts of status codes, and the version. */
#include "wend.h"

#define TEXT(x) #x
#define VERSION(a, b, c) TEXT(a) "." TEXT(b) "." TEXT(c)

const char *wend_status_text(wend_status status) {
  static const char *const text[] = {
      [WEND_OK] = "no error",
      [WEND_ERR_ARGUMENT] = "argument out of range",
      [WEND_ERR_MEMORY] = "out of memory",
      [WEND_ERR_MPI] = "message layer failed",
      [WEND_ERR_FILE] = "file error",
      [WEND_ERR_SETUP] = "setup error",
      [WEND_ERR_PARTICLES] = "unusable particles",
      [WEND_ERR_GEOMETRY] = "geometry cannot be built",
      [WEND_ERR_STEP] = "no step keeps the bounds",
      [WEND_ERR_PROOF] = "a figure missed its bar",
  };
  const int known = (int)(sizeof text / sizeof text[0]);
  return (int)status >= 0 && (int)status < known ? text[status] : "unknown status";
}

const char *wend_version_text(void) {
  return VERSION(WEND_VERSION_MAJOR, WEND_VERSION_MINOR, WEND_VERSION_PATCH);
}
