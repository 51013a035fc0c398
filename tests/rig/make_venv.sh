#!/bin/sh
# Make the virtual environment $VENV with $PYTHON; say what to install where that fails.
set -eu

"$PYTHON" -c 'import sys; sys.exit(None if sys.version_info >= (3, 11) else
    "Python 3.11 or newer is needed; this is " + sys.version.split()[0] + " (PYTHON=... names another)")'

works() { "$VENV/bin/python" -m pip --version >/dev/null 2>&1; }

works && exit 0
"$PYTHON" -m venv "$VENV" 2>/dev/null && works && exit 0
rm -rf "$VENV"
if [ "$(id -u)" = 0 ] && command -v apt-get >/dev/null; then
    echo "Installing python3-venv, which $PYTHON needs to make a virtual environment"
    apt-get update -q
    DEBIAN_FRONTEND=noninteractive apt-get install -qy python3-venv
    "$PYTHON" -m venv "$VENV" && works && exit 0
fi
echo "$PYTHON cannot make a virtual environment; install its venv package (Debian: python3-venv)" >&2
exit 1
