"""Options that several commands share, worded once."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

__all__ = [
    "EllipsoidalHeight",
    "FigureKind",
    "Figures",
    "Force",
    "Json",
    "Latitude",
    "Longitude",
    "OutFile",
    "OutFolder",
    "PictureFile",
    "Quiet",
    "Verbose",
]

Json = Annotated[bool, typer.Option("--json", help="Print one JSON object and nothing else.")]
Quiet = Annotated[bool, typer.Option("--quiet", "-q", help="Print nothing but errors.")]
Verbose = Annotated[bool, typer.Option("--verbose", "-v", help="Print more of the working.")]
Force = Annotated[bool, typer.Option("--force", help="Replace results that exist already.")]
OutFolder = Annotated[Path, typer.Option("--out", help="Folder for the results; made if missing.")]
OutFile = Annotated[Path | None, typer.Option("--out", help="File for the result.")]
Figures = Annotated[
    Path | None,
    typer.Option("--figures", help="Folder for the pictures as files; made if missing."),
]
FigureKind = Annotated[str, typer.Option("--figure-kind", help="png, svg or pdf.")]
PictureFile = Annotated[
    Path | None, typer.Option("--picture", help="Draw it into this file: .png, .svg or .pdf.")
]
Latitude = Annotated[float, typer.Option("--latitude", help="Geodetic latitude, degrees.")]
Longitude = Annotated[float, typer.Option("--longitude", help="Longitude, degrees, east positive.")]
EllipsoidalHeight = Annotated[
    float, typer.Option("--ellipsoidal-height", help="Ellipsoidal height, m.")
]
