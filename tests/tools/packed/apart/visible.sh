# What an object that was compiled for one set of instructions shows to the linker: only the entry, nothing weak, nothing that runs
# before main. The object as compiled must show more, or this test could not fail.
# usage: sh visible.sh NM READELF OBJECT ENTRY
set -eu
nm=$1 readelf=$2 object=$3 entry=$4
shown=$("$nm" --defined-only --extern-only --demangle "$object" | cut -d' ' -f3-)
others=$(printf '%s\n' "$shown" | grep -v "^pastern::packed::[a-z0-9]*::$entry(" || true)
if [ -n "$others" ]; then echo "$object shows to the linker: $others"; exit 1; fi
if [ -z "$shown" ]; then echo "$object: $entry is not visible"; exit 1; fi
if "$readelf" --sections --wide "$object" | grep -E ' (GROUP|INIT_ARRAY|PREINIT_ARRAY) '; then
  echo "$object has groups that the linker merges, or code that runs before main"; exit 1
fi
if ! "$nm" --defined-only "$object.visible" | grep -q ' W '; then echo "$object.visible has nothing weak: nothing was tested"; exit 1; fi
