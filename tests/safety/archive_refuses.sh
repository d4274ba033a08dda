#!/bin/sh
# archive.sh must refuse an archive that allocates, throws, locks and dispatches, and name each.
# usage: archive_refuses.sh NM ARCHIVE
found=$(sh "$(dirname "$0")/archive.sh" "$1" "$2") && { echo "archive.sh passed $2"; exit 1; }
for what in 'operator new' '__cxa_throw' 'pthread_mutex_lock' 'vtable'; do
  printf '%s\n' "$found" | grep -q "$what" || { echo "not found: $what"; printf '%s\n' "$found"; exit 1; }
done
