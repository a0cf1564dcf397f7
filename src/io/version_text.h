/* SPDX-License-Identifier: LGPL-3.0-or-later
 * version_text.h: the git description of the source, where the build made one. Private. */
#ifndef WEND_IO_VERSION_TEXT_H
#define WEND_IO_VERSION_TEXT_H

#if defined __has_include
#if __has_include("version_git.h")
#include "version_git.h"
#endif
#endif
#ifndef WEND_GIT_TEXT
#define WEND_GIT_TEXT "unknown"
#endif

#endif
