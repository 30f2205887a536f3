#!/usr/bin/env bash
# Runs lint, types and every test; what follows the name goes to pytest.
#
# Makes its own environment in .venv-test, or uses the one that $ODDSBENCH_VENV names. The last line is pytest's own;
# the exit code is 0 only if lint and types passed too.
set -euo pipefail
cd "$(dirname "${BASH_SOURCE[0]}")/.."

# One thread a process: timings mean something, and sums are added up in one order.
export OMP_NUM_THREADS=1 OPENBLAS_NUM_THREADS=1 MKL_NUM_THREADS=1
export PIP_DISABLE_PIP_VERSION_CHECK=1 PIP_ROOT_USER_ACTION=ignore

venv=${ODDSBENCH_VENV:-.venv-test}

recent_python() {
    local candidate
    for candidate in python3.11 python3.12 python3.13 python3; do
        if "$candidate" -c 'import sys; sys.exit(sys.version_info < (3, 11))' 2>/dev/null; then
            echo "$candidate"
            return
        fi
    done
    echo "tests/run.sh needs Python 3.11 or later, and found none" >&2
    return 2
}

make_environment() {
    local python
    python=$(recent_python)
    if ! "$python" -c 'import ensurepip, venv' 2>/dev/null; then
        if [ "$(id -u)" -ne 0 ]; then
            echo "$python cannot make environments; install the distribution's python3-venv" >&2
            return 2
        fi
        apt-get update -qq
        DEBIAN_FRONTEND=noninteractive apt-get install -y -qq python3-venv >/dev/null
    fi
    "$python" -m venv "$venv"
}

[ -x "$venv/bin/python" ] || make_environment

# Installed again only when pyproject.toml changed; the code itself is used from the tree.
if ! cmp -s pyproject.toml "$venv/installed-from.toml"; then
    "$venv/bin/python" -m pip install --quiet --editable '.[test]'
    cp pyproject.toml "$venv/installed-from.toml"
fi
# The browser tests need a Chromium, and are skipped without one.
if ! command -v chromium >/dev/null && [ -z "${CHROMIUM:-}" ] && [ "$(id -u)" -eq 0 ] && command -v apt-get >/dev/null; then
    if ! { apt-get update -qq && DEBIAN_FRONTEND=noninteractive apt-get install -y -qq chromium; } >/dev/null 2>&1; then
        echo "Chromium could not be installed; the browser tests will be skipped" >&2
    fi
fi

PATH="$(cd "$venv/bin" && pwd):$PATH"
export PATH

outcome=0
ruff check . || outcome=1
ruff format --check . || outcome=1
mypy || outcome=1
if [ "$outcome" -ne 0 ]; then
    echo "lint or types failed (above); the exit code will say so whatever the tests do" >&2
fi

# Everything goes to two workers; what is asked for by name runs alone, so that timings mean something.
[ "$#" -gt 0 ] || set -- --numprocesses 2 --benchmark-disable
python -m pytest "$@" || outcome=$?
exit "$outcome"
