#!/usr/bin/env bash
# The second demo: linear Chabauty for a curve of rank 1, then the sieve.  Results go to demo-linear.out.
set -euo pipefail
cd "$(dirname "${BASH_SOURCE[0]}")/.."
source scripts/setup.sh
sieve_setup run
mkdir -p demo-linear.out
sieve candidates data/demo-linear/case.toml -o demo-linear.out/candidates.json
sieve run data/demo-linear/case.toml -c demo-linear.out/candidates.json -o demo-linear.out "$@"
