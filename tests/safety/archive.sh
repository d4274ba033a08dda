#!/bin/sh
# The gate's archive must not be able to allocate, throw, lock, dispatch virtually or talk to the system.
# usage: archive.sh NM ARCHIVE. Fails when a symbol that is needed from outside is not on the list below.
set -u
nm=$1
archive=$2
[ -f "$archive" ] || { echo "no such archive: $archive"; exit 1; }

# Memory copies and plain mathematics of the C library.
allowed='memcpy|memset|memmove|memcmp|exp|expm1|sin|cos|sincos|sqrt|atan2|fabs|log|lround|llround|_GLOBAL_OFFSET_TABLE_'
# Checks that hardened or sanitizing builds add.
allowed="$allowed|__stack_chk_fail|__asan_[a-z0-9_]*|__ubsan_[a-z0-9_]*|__tsan_[a-z0-9_]*|__sanitizer_[a-z0-9_]*"

needed=$("$nm" -C --undefined-only "$archive" | sed -n 's/^ *[Uw] //p' | sort -u)
[ -n "$needed" ] || { echo "no symbols read from $archive"; exit 1; }
strange=$(printf '%s\n' "$needed" | grep -v '^pastern::safety::' | grep -Evx "$allowed")
defined=$("$nm" -C --defined-only "$archive" | grep -E 'vtable|typeinfo|guard variable|operator (new|delete)')
if [ -n "$strange" ]; then
  echo "safety/ needs what it must not:"
  printf '%s\n' "$strange"
fi
if [ -n "$defined" ]; then
  echo "safety/ defines what it must not:"
  printf '%s\n' "$defined"
fi
[ -z "$strange$defined" ]
