#!/usr/bin/env bash
# The main job on the demo: every candidate of data/demo/candidates.json gets its verdict.
# The result goes to demo.out; other arguments are handed to `sieve run`.
set -euo pipefail
cd "$(dirname "${BASH_SOURCE[0]}")/.."
source scripts/setup.sh
sieve_setup run
sieve run data/demo/case.toml -c data/demo/candidates.json -o demo.out "$@"
