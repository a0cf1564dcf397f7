#!/bin/bash
# SPDX-License-Identifier: GPL-3.0-or-later
# lint.sh: checks the walls of the house that a compiler does not see: layers, MPI only where ranks
# talk, pure kernels, sizes, licences, exported symbols, format. Prints one line a breach.
#
# Environment: srcdir, the sources (default: the folder above); builddir, where objects are (default:
# none, which leaves symbols unchecked); NM.
set -u
shopt -s nullglob
[ -z "${builddir:-}" ] || builddir=$(cd "$builddir" && pwd)
cd "${srcdir:-$(dirname "$0")/..}" || exit 1

sources=$(find include kernels src tests -name '*.[ch]' | LC_ALL=C sort)
scripts=$(find src tests -name '*.sh' -o -name '*.py' | LC_ALL=C sort)
work=$(mktemp -d)
trap 'rm -rf "$work"' EXIT

# Files that may speak MPI (any may read its clock, MPI_Wtime).
talkers='^src/(team|cut|deal|ids|total|flight|post|halo[a-z_]*)\.[ch]$|^src/io/(setup|run_log|(particle_file|particle_patches|checkpoint|hdf)[a-z_]*)\.[ch]$|^src/cli/main\.c$|^tests/'

# The layer a file belongs to.
layer_of() {
  case $1 in
    src/*/*) set -- "${1#src/}"; echo "${1%%/*}" ;;
    *) echo "${1%%/*}" ;;
  esac
}

# What a layer may include: cli -> draw, scenes, mesh -> io -> src -> kernels.
below() {
  case $1 in
    kernels) echo kernels ;;
    include) echo include ;;
    src) echo "src include kernels" ;;
    io) echo "io src include kernels" ;;
    scenes | draw | mesh) echo "$1 io src include kernels" ;;
    *) echo "tests cli draw scenes mesh io src include kernels" ;;
  esac
}

# System headers that a layer may not include.
banned() {
  case $1 in
    kernels) echo 'mpi|stdio|stdlib|unistd|H5|hdf5|cyaml|udunits|gsl|cairo' ;;
    src | include) echo 'H5|hdf5|cyaml|udunits|gsl|cairo' ;;
    io | mesh) echo 'gsl|cairo' ;;
    scenes) echo 'cairo|H5|hdf5' ;;
    *) echo 'none' ;;
  esac
}

# A copy of each C file without comments and texts, so that words in them do not count.
strip_comments() {
  local file
  for file in $sources; do
    mkdir -p "$work/$(dirname "$file")"
    awk '{
      line = $0; out = ""
      while (line != "") {
        if (inside) {
          if ((k = index(line, "*/")) == 0) break
          line = substr(line, k + 2); inside = 0
        } else if (match(line, /\/\*|\/\/|"([^"\\]|\\.)*"/)) {
          out = out substr(line, 1, RSTART - 1)
          token = substr(line, RSTART, 2)
          line = substr(line, RSTART + RLENGTH)
          if (token == "//") break
          if (token == "/*") inside = 1
          else out = out "\"\""
        } else { out = out line; break }
      }
      sub(/format\(printf/, "", out)
      print out
    }' "$file" >"$work/$file"
  done
}

# code PATTERN WHY FILE...: lines of code that match.
code() {
  local pattern=$1 why=$2
  shift 2
  [ $# -gt 0 ] || return 0
  (cd "$work" && grep -nHE "$pattern" "$@") | sed "s/\$/    <- $why/"
}

check_layers() {
  local file name target allowed
  declare -A where
  for file in $(grep '\.h$' <<<"$sources"); do
    name=${file##*/}
    [ -z "${where[$name]:-}" ] || echo "$file: ${where[$name]} has the same name"
    where[$name]=$file
  done
  for file in $sources; do
    allowed=" $(below "$(layer_of "$file")") version_git.h "
    for name in $(sed -n 's/^ *# *include *"\([^"]*\)".*/\1/p' "$file"); do
      target=$(layer_of "${where[$name]:-$name}")
      [[ $allowed == *" $target "* ]] || echo "$file: may not include $name ($target)"
    done
    grep -nHE "^ *# *include *<($(banned "$(layer_of "$file")"))" "$file" |
      sed 's/$/    <- no header for this layer/'
  done
}

check_words() {
  local silent kernels
  kernels=$(grep '^kernels/' <<<"$sources")
  silent=$(grep -E '^(kernels|src/[^/]*|src/io/[^/]*)' <<<"$sources")
  code '\bMPI_([^W]|W[^t])' 'MPI only where ranks talk' $(grep -vE "$talkers" <<<"$sources")
  code '\b(malloc|calloc|realloc|free|alloca|qsort)\(' 'kernels do not allocate' $kernels
  code '\b(exit|_Exit|abort|printf|puts|putchar|perror|stdout|stderr|MPI_Abort)\b' \
    'the library never exits, aborts or prints' \
    $(grep -E '^(kernels/|src/[^/]*$|src/io/)' <<<"$silent")
  grep -nHE 'TODO|FIXME|XXX' $sources $(grep -v 'lint\.sh$' <<<"$scripts")
}

# Lines a file, lines a function; the licence and the purpose in the first lines; a row in Makefile.am.
check_files() {
  local file licence row
  for file in $sources $scripts; do
    awk -v file="$file" '
      /^[a-zA-Z].*\) \{$/ || /^ +.*\) \{$/ && !start && prior ~ /^[a-zA-Z].*[(,]/ { start = NR }
      /^}/ { if (start && NR - start + 1 > 80 && file ~ /\.[ch]$/)
               print file ":" start ": a function of " NR - start + 1 " lines, 80 at most"
             start = 0 }
      /^[a-zA-Z]/ { prior = $0 }
      END { if (NR > 600) print file ": " NR " lines, 600 at most" }' "$file"
    case $file in
      src/cli/* | src/scenes/* | src/draw/* | src/mesh/* | tests/*) licence=GPL-3.0-or-later ;;
      *) licence=LGPL-3.0-or-later ;;
    esac
    head -n 2 "$file" | grep -q "SPDX-License-Identifier: $licence" ||
      echo "$file: the first two lines do not say SPDX-License-Identifier: $licence"
    head -n 3 "$file" | grep -qF "${file##*/}" || [[ $file == tests/hosts/* ]] ||
      echo "$file: the second line does not say what ${file##*/} is for"
    row=${file//./\\.}
    [[ $file != tests/*.c ]] || row="${file%.c}(\\.c)?"
    grep -qE "(^\s|= )$row( |\$)" Makefile.am || echo "$file: has no row in Makefile.am"
  done
}

# Non-static symbols start with wend_; the libraries have no variables and no way to print or exit.
check_symbols() {
  local object
  [ -n "${builddir:-}" ] || return 0
  for object in "$builddir"/{kernels,src,src/io,src/scenes,src/draw,src/mesh,src/cli}/.libs/*.o; do
    ${NM:-nm} -g --defined-only "$object" | awk -v object="${object#"$builddir"/}" '
      $3 !~ /^wend_|\.resolver$/ { print object ": symbol " $3 " does not start with wend_" }'
  done
  # clang makes what chooses among the variants of a static function a weak symbol: two static
  # functions of one name, in two files, would share it.
  ${NM:-nm} -g --defined-only "$builddir"/{kernels,src,src/io}/.libs/*.o | awk '
    $3 ~ /\.resolver$/ && seen[$3]++ { print $3 ": in two files: give one function another name" }'
  for object in "$builddir"/{kernels,src,src/io}/.libs/*.o; do
    objdump -t "$object" | awk -v object="${object#"$builddir"/}" '
      / O (\.data|\.bss|\.tdata|\.tbss)\t/ { print object ": variable " $NF ": no globals" }'
    ${NM:-nm} -u "$object" | awk -v object="${object#"$builddir"/}" '
      $2 ~ /^(exit|_exit|abort|printf|puts|putchar|perror|stdout|stderr|MPI_Abort)$/ {
        print object ": uses " $2 ": the library never exits, aborts or prints" }'
  done
}

# libwend needs MPI and libm only.
check_needs() {
  local library=${builddir:-}/.libs/libwend.so
  [ -f "$library" ] || return 0
  objdump -p "$library" | awk '$1 == "NEEDED" && $2 !~ /^(libmpi|libm|libc|ld-)[a-z0-9-]*\.so/ {
    print "libwend.so: needs " $2 ": MPI and libm only" }'
}

check_format() {
  local tool
  for tool in clang-format-14 clang-format; do
    "$tool" --version 2>/dev/null | grep -q 'version 14\.' || continue
    "$tool" --dry-run -Werror $sources 2>&1 |
      sed -n 's/:[0-9]*:[0-9]*: error: .*//p' | sort | uniq -c |
      while read -r count file; do echo "$file: $count places unlike clang-format 14: make format"; done
    return
  done
}

strip_comments
breaches=$(check_layers; check_words; check_files; check_symbols; check_needs; check_format)
if [ -n "$breaches" ]; then
  echo "$breaches"
  exit 1
fi
echo "$(wc -w <<<"$sources") C files and $(wc -w <<<"$scripts") scripts: no breach"
