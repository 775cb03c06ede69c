"""The command line: words in, a library call, words out. One file a command."""

from __future__ import annotations

from clockgeo.cli.shell import app, main

__all__ = ["app", "main"]
