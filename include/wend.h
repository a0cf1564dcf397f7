/* SPDX-License-Identifier: LGPL-3.0-or-later
 * wend.h: the public interface of libwend: version and status codes. */
#ifndef WEND_H
#define WEND_H

#include <stdint.h>

#ifdef __cplusplus
extern "C" {
#endif

#define WEND_VERSION_MAJOR 0
#define WEND_VERSION_MINOR 1
#define WEND_VERSION_PATCH 0

/** Status of every fallible call. Codes are only ever appended. */
typedef enum wend_status {
  WEND_OK = 0,
  WEND_ERR_ARGUMENT = 1, /**< an argument is outside its documented range */
  WEND_ERR_MEMORY = 2,   /**< an allocation failed */
  WEND_ERR_MPI = 3,      /**< the message layer reported an error */
  WEND_ERR_FILE = 4,     /**< a file could not be opened, read, written or understood */
  WEND_ERR_SETUP = 5,    /**< the setup holds an unknown key, a wrong unit or an absurd value */
  WEND_ERR_PARTICLES =
      6,                 /**< the particles are unusable: NaN, duplicate id, negative mass... */
  WEND_ERR_GEOMETRY = 7, /**< supports, volumes or faces cannot be built on these particles */
  WEND_ERR_STEP = 8,     /**< no super-step, however short, keeps the bounds */
  WEND_ERR_PROOF = 9     /**< a measured figure missed its bar */
} wend_status;

/** Names a status in a few lower-case words. Local; the text lives for ever. */
const char *wend_status_text(wend_status status);

/** Returns "major.minor.patch" of the linked library. Local; the text lives for ever. */
const char *wend_version_text(void);

#ifdef __cplusplus
}
#endif
#endif
