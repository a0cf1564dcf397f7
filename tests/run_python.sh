#!/bin/bash
# SPDX-License-Identifier: GPL-3.0-or-later
# run_python.sh TEST.py: runs a test in Python 3 with h5py; skips it where there is none.
[ -n "$PYTHON" ] || { echo "no Python 3 with h5py"; exit 77; }
PYTHONDONTWRITEBYTECODE=1 exec timeout -k 10 "${WEND_TEST_SECONDS:-600}" "$PYTHON" "$@" </dev/null
