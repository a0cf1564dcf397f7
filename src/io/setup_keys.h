/* SPDX-License-Identifier: LGPL-3.0-or-later
 * setup_keys.h: the table of all keys of a setup, the one place that knows them. */
#ifndef WEND_IO_SETUP_KEYS_H
#define WEND_IO_SETUP_KEYS_H

#include "units.h"
#include <stddef.h>
#include <stdint.h>

typedef enum wend_key_kind {
  WEND_KEY_TEXT,     /**< char *, owned */
  WEND_KEY_NAME,     /**< const char *, one of a fixed list */
  WEND_KEY_SWITCH,   /**< bool: yes or no */
  WEND_KEY_COUNT,    /**< int */
  WEND_KEY_QUANTITY, /**< double, in run units; a number where the quantity is WEND_Q_NUMBER */
  WEND_KEY_LAW,  /**< a quantity or the word record: the short form of the group of that path */
  WEND_KEY_LIST, /**< quantities */
  WEND_KEY_NAMES /**< a list of names */
} wend_key_kind;

/** One key: a row of the table. */
typedef struct wend_key {
  const char *path; /**< groups and key, joined by points */
  wend_key_kind kind;
  wend_quantity quantity; /**< of a QUANTITY, a LAW, and the entries of a LIST */
  const char *fallback; /**< the default as a user would write it; in brackets: in words; NULL:
                           that of wend_settings_default */
  double least, most;   /**< range of a COUNT or QUANTITY, ends included */
  bool positive;        /**< greater than 0, beside the range */
  const char *(*names)(int k); /**< the k-th allowed name, NULL beyond the last */
  size_t offset; /**< of the value in wend_setup; WEND_KEY_ELSEWHERE: set by its own code */
  const char *meaning;
} wend_key;

#define WEND_KEY_ELSEWHERE SIZE_MAX

/** The k-th key; NULL beyond the last. Local. */
const wend_key *wend_key_at(int k);
/** Number of a path in the table; -1 where there is no such key. Local. */
int wend_key_find(const char *path);
/** How many keys there are. Local. */
int wend_key_count(void);
/** The default as text to be understood; NULL where there is none. Local. */
const char *wend_key_fallback(const wend_key *key);

#endif
