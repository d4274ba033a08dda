#!/bin/sh
# Measures what the project promises: a line a promise - name, value, bar, holds or short - and what machine.
# A promise that could not be measured says so and why; it is not held either: the exit status is 1.
#   sh tests/promises.sh             all benches
#   sh tests/promises.sh NAME...     some; sh tests/promises.sh --list names them
#   PASTERN_BENCH_ARGS="--seed 7"    handed to each bench (seeds and sizes; see bench --help)
set -eu
cd "$(dirname "$0")/.."
dir=build/release
if [ "${1:-}" = --list ]; then
  ls tests/bench/*.cmake | sed 's|.*/||; s|\.cmake$||'
  exit 0
fi
sh tools/install-packages.sh
mkdir -p build/logs
{ cmake -S . -B "$dir" -G Ninja -DCMAKE_BUILD_TYPE=Release && cmake --build "$dir" -j "$(nproc)"; } >build/logs/promises-build.log 2>&1 ||
  { tail -n 40 build/logs/promises-build.log; exit 1; }
[ $# -gt 0 ] || set -- $(ls tests/bench/*.cmake | sed 's|.*/||; s|\.cmake$||')
printf 'machine: %s, %s processors, %s, %s\n' "$(sed -n 's/^model name[^:]*: //p' /proc/cpuinfo | head -n 1)" "$(nproc)" \
  "$(uname -sr)" "$(g++ --version | head -n 1)"
short=0
for name in "$@"; do
  [ -x "$dir/bench/bench_$name" ] || { echo "tests/promises.sh: no bench '$name': see --list" >&2; exit 2; }
  began=$(date +%s)
  # shellcheck disable=SC2086
  "$dir/bench/bench_$name" ${PASTERN_BENCH_ARGS:-} 2>"build/logs/bench_$name.log" >"build/logs/bench_$name.out" ||
    { echo "bench $name ended with an error:"; tail -n 5 "build/logs/bench_$name.log"; short=1; }
  awk -F '\t' '$1 == "promise" { printf "%-58s %-34s %-26s %s\n", $2, $3, $4, $5 }' "build/logs/bench_$name.out"
  grep -qE '	(short|not measured)$' "build/logs/bench_$name.out" && short=1
  printf '  (%s: %s min)\n' "$name" "$(awk "BEGIN { printf \"%.1f\", ($(date +%s) - $began) / 60 }")"
done
exit $short
