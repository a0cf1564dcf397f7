/* SPDX-License-Identifier: LGPL-3.0-or-later
 * machine.c: what of a machine may change the bits of a result: processor and math library. */
#include "machine.h"
#include <features.h>
#include <math.h>
#include <stdio.h>
#include <string.h>
#include <sys/utsname.h>
#ifdef __GLIBC__
#include <gnu/libc-version.h>
#endif

static int first_model(FILE *in, size_t size, char *text) {
  char line[512];
  while (fgets(line, sizeof line, in) != NULL) {
    char *colon = strchr(line, ':');
    if (strncmp(line, "model name", 10) != 0 || colon == NULL) continue;
    colon[1 + strcspn(colon + 1, "\n")] = '\0';
    snprintf(text, size, "%s", colon + 1 + strspn(colon + 1, " \t"));
    return 1;
  }
  return 0;
}

void wend_machine_processor(size_t size, char *text) {
  struct utsname name;
  FILE *in = fopen("/proc/cpuinfo", "r");
  const int found = in != NULL && first_model(in, size, text);
  if (in != NULL) fclose(in);
  if (!found) snprintf(text, size, "%s", uname(&name) == 0 ? name.machine : "unknown");
}

void wend_machine_math(size_t size, char *text) {
#ifdef __GLIBC__
  snprintf(text, size, "glibc %s", gnu_get_libc_version());
#else
  snprintf(text, size, "unknown");
#endif
}

uint64_t wend_machine_mix(uint64_t x) {
  x += 0x9e3779b97f4a7c15u;
  x = (x ^ x >> 30) * 0xbf58476d1ce4e5b9u;
  x = (x ^ x >> 27) * 0x94d049bb133111ebu;
  return x ^ x >> 31;
}

/* Arguments are made at run time, lest the compiler put its own values in place of the
 * library's. */
uint64_t wend_machine_fingerprint(void) {
  volatile double step = 0.037;
  uint64_t hash = 0;
  for (int k = 1; k <= 256; k++) {
    const double x = k * step;
    const double value[4] = {exp(-x), log(x), tanh(x / 4), pow(x, 4.0 / 3.0)};
    for (int f = 0; f < 4; f++) {
      uint64_t bits;
      memcpy(&bits, &value[f], sizeof bits);
      hash = wend_machine_mix(hash ^ bits);
    }
  }
  return hash;
}
