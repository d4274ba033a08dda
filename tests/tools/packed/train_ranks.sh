# A small training alone and by two ranks: the same policy file, byte for byte; ranks that differ are refused and leave nothing.
# usage: sh train_ranks.sh MPIRUN PASTERN SOURCE
set -eu
mpirun=$1 pastern=$2 robots=$3/hal_stub/robots
folder=$(mktemp -d)
trap 'rm -rf "$folder"' EXIT
cd "$folder"
small="--iterations 2 --directions 6 --seed 5 --threads 1 --name small --quiet"
"$pastern" train --robot "$robots/dunlin8.robot.txtpb" --out alone.policy $small >alone.txt
"$mpirun" -n 2 "$pastern" train --robot "$robots/dunlin8.robot.txtpb" --out ranks.policy $small >ranks.txt
cmp alone.policy ranks.policy
[ "$(grep -c sha256 ranks.txt)" = 1 ] || { echo "not one rank spoke:"; cat ranks.txt; exit 1; }
[ ! -e ranks.policy.training ] || { echo "a state was left"; exit 1; }
# The second rank has another robot file.
if "$mpirun" -n 1 "$pastern" train --robot "$robots/dunlin8.robot.txtpb" --out other.policy $small : \
  -n 1 "$pastern" train --robot "$robots/dunlin12.robot.txtpb" --out other.policy $small >other.txt 2>&1; then
  echo "different robots were trained"; exit 1
fi
grep -q 'differ between ranks' other.txt || { cat other.txt; exit 1; }
# The second rank has none.
if "$mpirun" -n 1 "$pastern" train --robot "$robots/dunlin8.robot.txtpb" --out other.policy $small : \
  -n 1 "$pastern" train --robot nowhere.robot.txtpb --out other.policy $small >none.txt 2>&1; then
  echo "half of a training was run"; exit 1
fi
grep -q 'another rank could not take' none.txt || { cat none.txt; exit 1; }
[ ! -e other.policy ] || { echo "something was written"; exit 1; }
