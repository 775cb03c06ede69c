"""Options that several commands share, worded once."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

__all__ = [
    "EllipsoidalHeight",
    "Force",
    "Json",
    "Latitude",
    "Longitude",
    "OutFile",
    "OutFolder",
    "Quiet",
    "Verbose",
]

Json = Annotated[bool, typer.Option("--json", help="Print one JSON object and nothing else.")]
Quiet = Annotated[bool, typer.Option("--quiet", help="Print nothing but errors.")]
Verbose = Annotated[bool, typer.Option("--verbose", help="Print more of the working.")]
Force = Annotated[bool, typer.Option("--force", help="Replace results that exist already.")]
OutFolder = Annotated[Path, typer.Option("--out", help="Folder for the results; made if missing.")]
OutFile = Annotated[Path | None, typer.Option("--out", help="File for the result.")]
Latitude = Annotated[float, typer.Option("--latitude", help="Geodetic latitude, degrees.")]
Longitude = Annotated[float, typer.Option("--longitude", help="Longitude, degrees, east positive.")]
EllipsoidalHeight = Annotated[
    float, typer.Option("--ellipsoidal-height", help="Ellipsoidal height, m.")
]
