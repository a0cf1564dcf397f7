#!/bin/bash
# SPDX-License-Identifier: GPL-3.0-or-later
# run_ranks.sh tests/check_NAME-RANKS.ranks: runs tests/check_NAME on that many ranks. The time limit
# stands outside mpirun, where a hanging rank cannot stop it.
set -u
name=${1%.ranks}
ranks=${name##*-}
limit=${WEND_TEST_SECONDS:-600}
timeout -k 10 "$limit" mpirun -n "$ranks" "${name%-*}" </dev/null
status=$?
echo "took $SECONDS s"
if [ $status -eq 124 ] || [ $status -eq 137 ]; then
  echo "${name%-*} on $ranks ranks did not end within $limit s"
fi
# 77 and 99 have a meaning of their own for the test harness, which no crash should borrow.
[ $status -eq 0 ] || exit 1
