#!/bin/sh
# Every check of the project, in an environment of its own; needs no root.
#   sh tests/run.sh                  all stages
#   sh tests/run.sh lint types       these stages, of: lint format types arrows tests
#   sh tests/run.sh tests -- -k rpm  what follows -- goes to pytest
set -eu
project=$(CDPATH='' cd -- "$(dirname -- "$0")/.." && pwd)
. "$project/deploy/environment.sh"

stages=
while [ $# -gt 0 ]; do
    case $1 in
        lint | format | types | arrows | tests) stages="$stages $1" ;;
        --) shift; break ;;
        *) stop "no stage is called '$1': there are lint, format, types, arrows, tests." ;;
    esac
    shift
done

# Checks that need a system package which this machine lacks are named here, never left out silently.
# No check needs one so far.
not_run=

make_environment run tests
PATH=$venv/bin:$PATH
export PATH
cd "$project"

run_stage() {
    case $1 in
        lint) ruff check --quiet ;;
        format) ruff format --quiet --check ;;
        types) mypy ;;
        arrows) lint-imports --no-logo ;;
        tests)
            shift
            say "not run for lack of a system package: ${not_run:-nothing}"
            python -m pytest "$@"
            ;;
    esac
}

failed=
for stage in ${stages:-lint format types arrows tests}; do
    say "$stage"
    run_stage "$stage" "$@" || failed="$failed $stage"
done
[ -z "$failed" ] || stop "failed:$failed"
