#!/bin/sh
# Installs what is missing, builds, and runs every test. Quiet on success, clear on failure; works offline once the packages are there.
#   sh tests/run.sh            everything: release, ASan+UBSan, TSan, fuzzers, formatting, clang-tidy
#   sh tests/run.sh STAGE...   some of: release asan tsan fuzz format tidy
set -eu
cd "$(dirname "$0")/.."
sh tools/install-packages.sh
logs=build/logs
mkdir -p "$logs"
jobs=$(nproc)

# step NAME COMMAND...: one line on success, the end of the log on failure.
step() {
  name=$1; shift
  began=$(date +%s)
  if "$@" >"$logs/$name.log" 2>&1; then
    printf '%-24s passed  %4ss\n' "$name" $(($(date +%s) - began))
  else
    printf '%-24s FAILED  %4ss  (%s)\n' "$name" $(($(date +%s) - began)) "$logs/$name.log"
    tail -n 60 "$logs/$name.log"
    exit 1
  fi
}

# build DIR TARGET cmake-arguments...
build() {
  dir=$1; target=$2; shift 2
  cmake -S . -B "$dir" -G Ninja "$@" && cmake --build "$dir" -j "$jobs" --target "$target" -- -k 0
}

# tests NAME DIR ctest-arguments...: prints ctest's closing lines, which count the tests.
tests() {
  name=$1; dir=$2; shift 2
  step "$name" ctest --test-dir "$dir" --output-on-failure --no-tests=error -j "$jobs" "$@"
  grep -E 'tests passed|Total Test time' "$logs/$name.log"
}

release() {
  step build-release build build/release all -DCMAKE_BUILD_TYPE=Release
  tests tests-release build/release
}

asan() {
  step build-asan build build/asan fast_tests -DCMAKE_BUILD_TYPE=Sanitizer -DPASTERN_ASAN=ON
  tests tests-asan build/asan -L fast
}

tsan() {
  step build-tsan build build/tsan threads_tests -DCMAKE_BUILD_TYPE=Sanitizer -DPASTERN_TSAN=ON
  TSAN_OPTIONS="suppressions=$PWD/tests/tsan.supp halt_on_error=1 second_deadlock_stack=1" \
    tests tests-tsan build/tsan -L threads
}

# A minute each, two at a time; seconds by PASTERN_FUZZ_SECONDS.
fuzz() {
  step build-fuzz build build/fuzz fuzz_targets -DCMAKE_BUILD_TYPE=Sanitizer -DPASTERN_FUZZ=ON -DCMAKE_CXX_COMPILER=clang++ \
    -DCMAKE_C_COMPILER=clang
  step fuzz sh -c "ls build/fuzz/corpus | xargs -P $jobs -n 1 sh -c 'build/fuzz/bin/fuzz_\$1 -max_total_time=${PASTERN_FUZZ_SECONDS:-60} \
    -timeout=20 -rss_limit_mb=2048 -verbosity=0 -artifact_prefix=build/logs/fuzz_\$1- build/fuzz/corpus/\$1' fuzz"
}

format() {
  step format sh -c "git ls-files '*.h' '*.cpp' '*.c' | xargs clang-format --dry-run --Werror"
}

# All of safety/ always; elsewhere the files that differ from the last commit on which everything passed, or from the parent.
tidy() {
  files=$(git ls-files 'safety/*.cpp')
  base=$(cat build/tidy-base 2>/dev/null || git rev-parse -q --verify HEAD~1 || true)
  if [ -n "$base" ] && git cat-file -e "$base" 2>/dev/null; then
    files="$files $(git diff --name-only --diff-filter=d "$base" -- 'runtime/*.cpp' 'hal_stub/*.cpp' 'tools/*.cpp' 'proto/*.cpp')"
  fi
  step tidy sh -c "echo '$files' | tr ' ' '\n' | sort -u | grep . | xargs -P $jobs -n 4 clang-tidy -quiet -p build/release"
  git rev-parse HEAD >build/tidy-base
}

[ $# -gt 0 ] || set -- release asan tsan fuzz format tidy
for stage in "$@"; do
  case $stage in
    release | asan | tsan | fuzz | format | tidy) "$stage" ;;
    *) echo "tests/run.sh: unknown stage '$stage': expected release, asan, tsan, fuzz, format or tidy" >&2; exit 2 ;;
  esac
done
echo "all passed"
