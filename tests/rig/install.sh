#!/bin/sh
# Install $1 (. or .[test]) into $VENV at the versions of .constraints: uv where it works, else pip.
set -eu
python="$VENV/bin/python"

if "$python" -m pip install -q --disable-pip-version-check -c .constraints uv &&
    "$VENV/bin/uv" pip install -q --compile-bytecode --python "$python" -c .constraints -e "$1"; then
    exit 0
fi
echo "uv could not install the packages; trying pip" >&2
exec "$python" -m pip install -q --disable-pip-version-check -c .constraints -e "$1"
