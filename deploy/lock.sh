#!/bin/sh
# Renew the pins from pyproject.toml: requirements.lock (run time) and tests/requirements.lock
# (what the tests and checks need beyond it). One set of versions serves every supported Python and
# platform. Needs uv on the PATH. `sh deploy/lock.sh --upgrade` takes newer versions.
set -eu
cd "$(dirname "$0")/.."
command -v uv >/dev/null || { echo "deploy/lock.sh: uv is not on the PATH" >&2; exit 1; }

# No header, no annotation, no address: only names, versions and digests.
compile() {
    uv pip compile --quiet --no-config --universal --python-version 3.11 --fork-strategy fewest \
        --generate-hashes --no-header --no-annotate "$@" pyproject.toml --group build >/dev/null
}

compile "$@" --output-file requirements.lock
set -- "$@" --constraints requirements.lock --group dev
while IFS= read -r line; do
    case $line in *==*) set -- "$@" --no-emit-package "${line%%==*}" ;; esac
done <requirements.lock
compile "$@" --output-file tests/requirements.lock
