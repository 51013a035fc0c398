#!/usr/bin/env python
"""Haleward's command line: `python manage.py help` lists the commands."""

import os
import sys

from django.core.management import execute_from_command_line

if __name__ == "__main__":
    os.environ.setdefault("DJANGO_SETTINGS_MODULE", "programme.settings")
    # The demo runs without TLS and a secret of its own; where a secret is set, a real site may
    # be near, and the command asks for the switch in so many words.
    if sys.argv[1:2] == ["demo"] and not os.environ.get("HALEWARD_SECRET_KEY"):
        os.environ.setdefault("HALEWARD_PLAIN_HTTP", "1")
    execute_from_command_line(sys.argv)
