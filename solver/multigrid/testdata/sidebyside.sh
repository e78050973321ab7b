#!/bin/sh
# Runs this package's campaign and the general libraries of peers.py in turn on
# one core, so that a busy machine slows both alike. Run from the root of the
# project; PYTHON names an interpreter that finds scipy and petsc4py.
set -eu
PYTHON=${PYTHON:-python3}
here=solver/multigrid
bin=$(mktemp)
trap 'rm -f "$bin"' EXIT
go test -c -o "$bin" ./$here
ours() { taskset -c 0 "$bin" -test.run Campaign -campaign "$1:$3:$2" -campaign.reps 3 | grep "^| $1"; }
peer() { taskset -c 0 "$PYTHON" $here/testdata/peers.py "$@"; }
for problem in A1 A2; do
	ours $problem 1024 2
	peer hypre $problem 1024 2
	peer superlu $problem 1024 2
	ours $problem 1024 2
	taskset -c 0,1 "$bin" -test.run Campaign -campaign "$problem:2:1024" -campaign.workers 2 -campaign.reps 3 | grep "^| $problem"
done
for problem in A1 A2; do
	ours $problem 96 3
	peer hypre $problem 96 3
	peer gamg $problem 96 3
	ours $problem 96 3
done
