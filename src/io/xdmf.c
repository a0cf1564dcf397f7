/* SPDX-License-Identifier: LGPL-3.0-or-later
 * xdmf.c: a small XML file that tells ParaView and VisIt what a particle file holds.
 *
 * XDMF 2 with one Polyvertex topology; vectors and places are joined from their components by
 * the function JOIN. In 2-D the geometry has type XY, and other vectors are given a third
 * component of 0. ParaView 5.11 shows all of it through its "XDMF Reader"; its "Xdmf3 Reader"
 * knows no functions and so shows nothing. Ids are called Int because the reader cuts 64-bit
 * UInt to 32 bits; those above 2^63 end there. */
#include "xdmf.h"
#include <errno.h>
#include <inttypes.h>
#include <libgen.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

/* File names may hold what XML reserves. */
static void put_escaped(FILE *out, const char *text) {
  for (const char *c = text; *c != '\0'; c++) {
    if (*c == '&')
      fputs("&amp;", out);
    else if (*c == '<')
      fputs("&lt;", out);
    else if (*c == '>')
      fputs("&gt;", out);
    else
      fputc(*c, out);
  }
}

static void put_data(FILE *out, const wend_xdmf *x, const char *record, int axis) {
  static const char *const name[] = {"/x", "/y", "/z", ""};
  const char *slash = strrchr(x->path, '/');
  fprintf(out,
          "<DataItem Dimensions=\"%" PRId64
          "\" NumberType=\"%s\" Precision=\"8\" Format=\"HDF\">",
          x->total, strcmp(record, "id") == 0 ? "Int" : "Float");
  put_escaped(out, slash != NULL ? slash + 1 : x->path);
  fprintf(out, ":/data/%" PRId64 "/particles/gas/%s%s</DataItem>\n", x->iteration, record,
          name[axis]);
}

/* Components x, y (and z) of a vector side by side. */
static void put_joined(FILE *out, const wend_xdmf *x, const char *record, int n, bool fill) {
  const char *join = n == 3 ? "JOIN($0, $1, $2)"
                     : fill ? "JOIN($0, $1, 0 * $0)"
                            : "JOIN($0, $1)";
  fprintf(out,
          "<DataItem ItemType=\"Function\" Function=\"%s\" Dimensions=\"%" PRId64 " %d\">\n",
          join, x->total, fill ? 3 : n);
  for (int a = 0; a < n; a++) put_data(out, x, record, a);
  fprintf(out, "</DataItem>\n");
}

static void put_attribute(FILE *out, const wend_xdmf *x, const char *record, int n) {
  fprintf(out, "<Attribute Name=\"%s\" AttributeType=\"%s\" Center=\"Node\">\n", record,
          n == 1 ? "Scalar" : "Vector");
  if (n == 1)
    put_data(out, x, record, 3);
  else
    put_joined(out, x, record, n, true);
  fprintf(out, "</Attribute>\n");
}

static void put_grid(FILE *out, const wend_xdmf *x) {
  fprintf(out, "<?xml version=\"1.0\"?>\n<Xdmf Version=\"2.0\">\n<Domain>\n"
               "<Grid Name=\"gas\" GridType=\"Uniform\">\n");
  fprintf(out, "<Time Value=\"%.17g\"/>\n", x->time);
  fprintf(out, "<Topology TopologyType=\"Polyvertex\" NumberOfElements=\"%" PRId64 "\"/>\n",
          x->total);
  fprintf(out, "<Geometry GeometryType=\"%s\">\n", x->dim == 2 ? "XY" : "XYZ");
  put_joined(out, x, "position", x->dim, false);
  fprintf(out, "</Geometry>\n");
  put_attribute(out, x, "id", 1);
  for (int k = 1; wend_record_at(k) != NULL; k++)
    if (x->components[k] > 0) put_attribute(out, x, wend_record_at(k)->name, x->components[k]);
  fprintf(out, "</Grid>\n</Domain>\n</Xdmf>\n");
}

/* NAME.h5 -> NAME.xmf; any other name gets .xmf appended. */
static void companion_name(const char *path, char *name) {
  const size_t length = strlen(path);
  const bool h5 = length > 3 && strcmp(path + length - 3, ".h5") == 0;
  sprintf(name, "%.*s.xmf", (int)(h5 ? length - 3 : length), path);
}

static void write_all(wend_team *team, const wend_xdmf *xdmf, const char *name,
                      const char *part) {
  FILE *out = fopen(part, "w");
  if (out == NULL) {
    wend_fail(team, WEND_ERR_FILE, "%s cannot be written: %s", part, strerror(errno));
    return;
  }
  put_grid(out, xdmf);
  const bool written = fflush(out) == 0 && !ferror(out) && fsync(fileno(out)) == 0;
  const bool closed = fclose(out) == 0;
  if (!written || !closed || rename(part, name) != 0)
    wend_fail(team, WEND_ERR_FILE, "%s cannot be written: %s", name, strerror(errno));
}

wend_status wend_xdmf_write(wend_team *team, const wend_xdmf *xdmf) {
  if (team->rank == 0) {
    const int64_t length = (int64_t)strlen(xdmf->path);
    char *name = wend_allocate(team, length + 5, 1),
         *part = wend_allocate(team, length + 10, 1);
    if (team->status == WEND_OK) {
      companion_name(xdmf->path, name);
      sprintf(part, "%s.part", name);
      write_all(team, xdmf, name, part);
    }
    free(name);
    free(part);
  }
  return wend_agree(team);
}
