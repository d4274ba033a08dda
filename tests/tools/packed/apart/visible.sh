# What an object that was compiled for one set of instructions shows to the linker: only the entry, nothing weak, no groups; and what
# of it runs before main (the start of iostreams, by way of headers) has no wide instructions, which this machine may lack. The object
# as compiled must show more, or this test could not fail.
# usage: sh visible.sh NM READELF OBJDUMP OBJECT ENTRY
set -eu
nm=$1 readelf=$2 objdump=$3 object=$4 entry=$5
shown=$("$nm" --defined-only --extern-only --demangle "$object" | cut -d' ' -f3-)
others=$(printf '%s\n' "$shown" | grep -v "^pastern::packed::[a-z0-9]*::$entry(" || true)
if [ -n "$others" ]; then echo "$object shows to the linker: $others"; exit 1; fi
if [ -z "$shown" ]; then echo "$object: $entry is not visible"; exit 1; fi
if "$readelf" --sections --wide "$object" | grep ' GROUP '; then echo "$object has groups that the linker merges"; exit 1; fi
if "$objdump" --disassemble --no-show-raw-insn --section=.text.startup "$object" 2>/dev/null |
  grep -E '^ *[0-9a-f]+:[[:space:]]+(v[a-z0-9]+|k[a-z]+[bwdq]) '; then
  echo "$object runs wide instructions before main"; exit 1
fi
if ! "$nm" --defined-only "$object.visible" | grep -q ' W '; then echo "$object.visible has nothing weak: nothing was tested"; exit 1; fi
