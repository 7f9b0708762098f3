# Sourced by deploy/demo.sh and tests/run.sh: makes the project's own Python environment.
# Before sourcing: $project is the project folder. After `make_environment run` or
# `make_environment run tests`, $venv is an environment that holds the pinned versions.

venv=${WIDEBERTH_VENV:-$project/.venv}
case $venv in /*) ;; *) venv=$PWD/$venv ;; esac
unset PYTHONHOME PYTHONPATH
export PIP_DISABLE_PIP_VERSION_CHECK=1

say() { printf 'wideberth: %s\n' "$*" >&2; }
stop() { say "$*"; exit 1; }

is_new_enough() {
    "$1" -c 'import sys; sys.exit(sys.version_info < (3, 11))' 2>/dev/null
}

# Prints a Python that can make environments; explains what to install where there is none.
find_python() {
    bare=
    for candidate in python3 python3.14 python3.13 python3.12 python3.11 python; do
        is_new_enough "$candidate" || continue
        "$candidate" -c 'import ensurepip, venv' 2>/dev/null && { echo "$candidate"; return; }
        bare=${bare:-$candidate}
    done
    [ -z "$bare" ] || stop "$bare cannot make environments: install its venv package" \
        "(Debian, Ubuntu: apt-get install python3-venv)."
    stop "Python 3.11 or newer is needed, and none of python3, python3.14 ... python3.11 is that."
}

works() { is_new_enough "$venv/bin/python" && "$venv/bin/python" -c 'import pip' 2>/dev/null; }

lock_of() { [ "$1" = run ] && echo requirements.lock || echo "$1/requirements.lock"; }

# What an environment was made from: where it stands, its Python, one lock, and what pyproject.toml
# says of the project (not how it sets the checks).
digest() {
    "$venv/bin/python" - "$venv" "$project" "$(lock_of "$1")" <<'END'
import hashlib, json, pathlib, sys, tomllib
venv, project, lock = sys.argv[1:]
table = tomllib.loads(pathlib.Path(project, "pyproject.toml").read_text("utf-8"))
declared = [table["build-system"], table["project"], table["tool"]["hatch"]]
made_of = [venv, project, sys.version, declared, pathlib.Path(project, lock).read_text("utf-8")]
print(hashlib.sha256(json.dumps(made_of).encode()).hexdigest())
END
}

stamp() { echo "$venv/wideberth-$1.digest"; }
is_current() { works && [ "$(cat "$(stamp "$1")" 2>/dev/null)" = "$(digest "$1")" ]; }

# An environment made here that no longer fits is made anew, so that nothing of the old pins stays.
# One that WIDEBERTH_VENV names and others made is added to, never emptied.
lay_environment() {
    if [ -e "$venv/wideberth-made" ]; then
        clear=--clear
    elif works; then
        return
    elif [ -d "$venv" ] && [ ! -e "$venv/pyvenv.cfg" ] && [ -n "$(ls -A "$venv")" ]; then
        stop "$venv is not a Python environment: name another in WIDEBERTH_VENV."
    else
        clear=
    fi
    python=$(find_python) || exit 1
    say "making a Python environment in $venv"
    "$python" -m venv $clear "$venv"
    : >"$venv/wideberth-made"
}

install_pins() {
    say "installing the pinned versions of $(lock_of "$1") (takes up to a minute, once)"
    "$venv/bin/python" -m pip install -qq --no-input --require-hashes --no-deps \
        --requirement "$project/$(lock_of "$1")"
    [ "$1" != run ] || "$venv/bin/python" -m pip install -qq --no-input --no-deps \
        --no-build-isolation --editable "$project"
    digest "$1" >"$(stamp "$1")"
}

make_environment() {
    is_current run || lay_environment
    for pins in "$@"; do
        is_current "$pins" || install_pins "$pins"
    done
}
