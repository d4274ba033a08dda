#!/bin/sh
# tools/dry-run.sh refuses wrong arguments in one line, before it installs or builds anything. $1: the source root.
set -u
failed=0
# expect STATUS WORDS arguments...
expect() {
  status=$1 words=$2
  shift 2
  said=$(sh "$script" "$@" 2>&1)
  got=$?
  lines=$(printf '%s\n' "$said" | wc -l)
  case $said in *"$words"*) found=yes ;; *) found=no ;; esac
  if [ "$got" -ne "$status" ] || [ "$lines" -ne 1 ] || [ "$found" = no ]; then
    echo "dry-run.sh $*: status $got (expected $status), said: $said (expected one line with '$words')"
    failed=1
  fi
}
script=$1/tools/dry-run.sh
expect 2 "found '--nonsense', expected an option" --nonsense
expect 2 "--seed: expected a value" --seed
expect 2 "--seed: found 'x', expected a whole number" --seed x
expect 2 "--seed: found '-1'" --seed -1
expect 2 "--operator: found 'magic', expected gradient, batch, sequential or averaged" --operator magic
expect 2 "--port: found '77a'" --port 77a
expect 3 "hal_stub/robots/none.robot.txtpb: not found" --robot none
expect 3 "hal_stub/scenarios/none.scenario.txtpb: not found" --scenario none
expect 3 "/no/such.policy: not found" --policy /no/such.policy
exit $failed
