#!/bin/sh
# The whole job without a robot: builds, starts the onboard program on the simulated robot, adapts its walking policy for a
# site that is not the one it was trained for, and ends with a verdict, an adopted policy and a report.
#   sh tools/dry-run.sh [--scenario NAME|FILE] [--robot NAME|FILE] [--operator gradient|batch|sequential|averaged]
#                       [--wall] [--seed N] [--journal FOLDER] [--policy FILE] [--plan FILE] [--port N] [--walks]
# Defaults: cold_store, dunlin12, gradient, stepped pace, seed 1, a new folder under build/dry-run, the default plan, port 7741.
# --wall: real time (needs minutes); --walks: one line a walk. Exit status: 0 adopted, 1 kept, else what failed.
set -eu
cd "$(dirname "$0")/.."

usage() {
  echo "dry-run: $1 (see the first lines of tools/dry-run.sh)" >&2
  exit 2
}

scenario=cold_store
robot=dunlin12
operator=gradient
pace=stepped
seed=1
journal=""
policy=""
plan=tools/plans/default.plan.txtpb
port=${PASTERN_PORT:-7741}
show=--brief
while [ $# -gt 0 ]; do
  case $1 in
    --wall) pace=wall ;;
    --walks) show="" ;;
    --scenario | --robot | --operator | --seed | --journal | --policy | --plan | --port)
      [ $# -ge 2 ] || usage "$1: expected a value"
      case $1 in
        --scenario) scenario=$2 ;;
        --robot) robot=$2 ;;
        --operator) operator=$2 ;;
        --seed) seed=$2 ;;
        --journal) journal=$2 ;;
        --policy) policy=$2 ;;
        --plan) plan=$2 ;;
        --port) port=$2 ;;
      esac
      shift
      ;;
    *) usage "found '$1', expected an option" ;;
  esac
  shift
done
case $operator in
  gradient) kind=ES_GRADIENT ;;
  batch) kind=BATCH_HILL_CLIMBING ;;
  sequential) kind=SEQUENTIAL_HILL_CLIMBING ;;
  averaged) kind=AVERAGED_HILL_CLIMBING ;;
  *) usage "--operator: found '$operator', expected gradient, batch, sequential or averaged" ;;
esac
case $seed in '' | *[!0-9]*) usage "--seed: found '$seed', expected a whole number" ;; esac
case $port in '' | *[!0-9]*) usage "--port: found '$port', expected a port" ;; esac

# A name is a shipped file, anything with a slash or a suffix is a path.
file_of() {
  case $1 in */* | *.txtpb) echo "$1" ;; *) echo "hal_stub/$2/$1$3" ;; esac
}
robot_file=$(file_of "$robot" robots .robot.txtpb)
scenario_file=$(file_of "$scenario" scenarios .scenario.txtpb)
robot_name=$(basename "$robot_file" .robot.txtpb)
scenario_name=$(basename "$scenario_file" .scenario.txtpb)
[ -n "$policy" ] || policy=hal_stub/policies/$robot_name.policy
for file in "$robot_file" "$scenario_file" "$policy" "$plan"; do
  [ -r "$file" ] || { echo "dry-run: $file: not found, or not readable" >&2; exit 3; }
done

sh tools/install-packages.sh
build=build/release
mkdir -p build/logs
began=$(date +%s)
[ -x "$build/bin/pastern" ] || echo "building into $build (a few minutes the first time)"
if ! { cmake -S . -B "$build" -G Ninja -DCMAKE_BUILD_TYPE=Release &&
  cmake --build "$build" --target pastern pastern-onboard pastern-stub-robot pastern_hal_stub_plugin; } >build/logs/dry-run.log 2>&1; then
  tail -n 40 build/logs/dry-run.log >&2
  echo "dry-run: the build failed; all of its words: build/logs/dry-run.log" >&2
  exit 70
fi
pastern=$build/bin/pastern

if [ -z "$journal" ]; then
  n=1
  while [ -e "build/dry-run/$robot_name-$scenario_name-$n" ]; do n=$((n + 1)); done
  journal=build/dry-run/$robot_name-$scenario_name-$n
fi
mkdir -p "$journal"

onboard=""
stub=""
bus=""
leave() {
  # What this script started, by its process number; in order first.
  for process in $onboard $stub; do kill -TERM "$process" 2>/dev/null || true; done
  for process in $onboard $stub; do wait "$process" 2>/dev/null || true; done
  [ -z "$bus" ] || rm -rf "$bus"
}
trap leave EXIT
trap 'exit 130' INT TERM

hal_options="scenario=$scenario_file"
if [ "$pace" = wall ]; then
  bus=$(mktemp -d)
  "$build/bin/pastern-stub-robot" --robot "$robot_file" --scenario "$scenario_file" --seed "$seed" --socket "$bus/drives" \
    >"$journal/stub-robot.log" 2>&1 &
  stub=$!
  tries=0
  until [ -S "$bus/drives" ]; do
    tries=$((tries + 1))
    if ! kill -0 "$stub" 2>/dev/null || [ "$tries" -gt 100 ]; then
      cat "$journal/stub-robot.log" >&2
      echo "dry-run: pastern-stub-robot did not come up; its words stand above" >&2
      exit 4
    fi
    sleep 0.1
  done
  hal_options="socket=$bus/drives"
fi
"$build/bin/pastern-onboard" --robot "$robot_file" --policy "$policy" --hal "$build/lib/libpastern_hal_stub.so" \
  --hal-options "$hal_options" --journal "$journal" --pace "$pace" --seed "$seed" \
  --command-port "$port" --telemetry-port $((port + 1)) --fetch-port $((port + 2)) >"$journal/onboard.log" 2>&1 &
onboard=$!
export PASTERN_PORT="$port" PASTERN_HOST=127.0.0.1 PASTERN_KEYS=""
tries=0
# Its own word first: somebody else's program may answer at this port.
until grep -q '^ready: ' "$journal/onboard.log" && "$pastern" status --keys "" --wait 0.2 >/dev/null 2>&1; do
  tries=$((tries + 1))
  if ! kill -0 "$onboard" 2>/dev/null || [ "$tries" -gt 100 ]; then
    cat "$journal/onboard.log" >&2
    echo "dry-run: pastern-onboard did not come up; its words stand above" >&2
    exit 4
  fi
  sleep 0.1
done

# A simulated robot hurts nobody: its first start is confirmed here. On real drives a person reads the procedure.
"$pastern" confirm --keys "" --yes-i-have-read "$robot_file" >"$journal/confirm.log" ||
  { echo "dry-run: the first start was not confirmed" >&2; exit 5; }
session=$journal/session.plan.txtpb
sed -e "/^#/d" -e "s/kind: [A-Z_]*/kind: $kind/" -e "s/^seed: .*/seed: $seed/" -e "s/^name: .*/name: \"$operator\"/" \
  "$plan" >"$session"
echo "$robot_name in $scenario_name, $operator, $pace pace, seed $seed; record in $journal"
result=0
# shellcheck disable=SC2086
"$pastern" start --keys "" $show "$session" || result=$?
[ "$result" -le 1 ] || { echo "dry-run: the session did not reach a verdict (status $result); onboard's words: $journal/onboard.log" >&2; exit "$result"; }
[ "$result" -ne 0 ] || "$pastern" adopt --keys "" | sed '/^next: /d'
"$pastern" report --keys "" --robot-file "$robot_file" --out "$journal/report.html" | sed '/^next: /d'
if [ "$result" -eq 0 ]; then word=adopted; else word=kept; fi
echo "dry run: $word, $(($(date +%s) - began)) s"
exit "$result"
