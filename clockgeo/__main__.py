"""`python -m clockgeo` is the same as the `clockgeo` command."""

from clockgeo.cli import main

main()
