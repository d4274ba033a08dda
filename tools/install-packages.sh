#!/bin/sh
# Installs the Debian packages of tools/packages.txt that are missing. Says what it does; does nothing, and needs no network,
# when all are there. As root, or through sudo.
set -eu
list="$(dirname "$0")/packages.txt"
missing=""
for package in $(grep -v '^#' "$list"); do
  state=$(dpkg-query -W -f '${db:Status-Status}' "$package" 2>/dev/null || true)
  [ "$state" = installed ] || missing="$missing $package"
done
[ -n "$missing" ] || exit 0
as_root=""
if [ "$(id -u)" -ne 0 ]; then
  command -v sudo >/dev/null 2>&1 || { echo "install-packages: missing:$missing - run as root, or install sudo" >&2; exit 1; }
  as_root="sudo"
fi
echo "installing Debian packages:$missing"
log=$(mktemp)
trap 'rm -f "$log"' EXIT
# shellcheck disable=SC2086
if ! { $as_root env DEBIAN_FRONTEND=noninteractive apt-get update -q &&
  $as_root env DEBIAN_FRONTEND=noninteractive apt-get install -q -y --no-install-recommends $missing; } >"$log" 2>&1; then
  tail -n 20 "$log" >&2
  echo "install-packages: apt-get failed (its last lines stand above); missing:$missing" >&2
  exit 1
fi
