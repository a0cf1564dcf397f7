#!/bin/bash
# SPDX-License-Identifier: GPL-3.0-or-later
# installed.sh: builds a host program against the installed library, as a user would, and runs it.
set -eu
work=$(mktemp -d)
trap 'rm -rf "$work"' EXIT
cat >"$work/host.c" <<'END'
#include <stdio.h>
#include <wend.h>
int main(void) { return puts(wend_version_text()) < 0; }
END
flags=$(pkg-config --cflags --libs wend)
$CC "$work/host.c" -o "$work/host" $flags
got=$("$work/host")
want=$(pkg-config --modversion wend)
[ "$got" = "$want" ] || { echo "wend.pc says $want, the library $got"; exit 1; }
