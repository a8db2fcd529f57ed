#!/usr/bin/env bash
# Lint, types, tests; fails when any of them fails.  The last line is pytest's own summary.
#
#   bash scripts/test.sh            everything but the slow sweeps
#   CI=true bash scripts/test.sh    the slow sweeps too, in their small form
#   bash scripts/test.sh --all      the slow sweeps in full
#
# Any other argument is handed to pytest.
set -euo pipefail
cd "$(dirname "${BASH_SOURCE[0]}")/.."
source scripts/setup.sh
sieve_setup test

select=(-m "not slow")
arguments=()
for argument in "$@"; do
    case $argument in
        --all) select=(); export SIEVE_SWEEP=full ;;
        *) arguments+=("$argument") ;;
    esac
done
if [ "${CI:-}" = true ] && [ "${SIEVE_SWEEP:-}" != full ]; then
    select=()
    export SIEVE_SWEEP=small
fi
# One thread per process: the two workers of pytest are the parallelism.
export OMP_NUM_THREADS=1 OPENBLAS_NUM_THREADS=1

ruff check .
mypy sieve
exec pytest -q -n 2 --dist worksteal ${select[@]+"${select[@]}"} ${arguments[@]+"${arguments[@]}"}
