#!/bin/sh
# The demo on a machine with only Python 3.11+ and a shell: makes its own environment, then starts a
# private instance of the service and puts the demo machine through a separation check.
set -eu
project=$(CDPATH='' cd -- "$(dirname -- "$0")/.." && pwd)
. "$project/deploy/environment.sh"

make_environment run
exec "$venv/bin/wideberth" demo "$@"
