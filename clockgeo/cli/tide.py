"""`clockgeo tide`: tidal potential and frequency shift at a place or between two."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from clockgeo.cli.options import (
    EllipsoidalHeight,
    Force,
    Json,
    Latitude,
    Longitude,
    OutFile,
    PictureFile,
    Quiet,
)

if TYPE_CHECKING:
    import numpy as np
    from numpy.typing import NDArray

    from clockgeo.gravity import SiteTide, TideSeries

Start = Annotated[str, typer.Option("--start", help="First epoch, ISO 8601, UTC.")]
Stop = Annotated[str, typer.Option("--stop", help="Last epoch, ISO 8601, UTC.")]
Step = Annotated[float, typer.Option("--step", help="Step in s.")]
ToLatitude = Annotated[
    float | None, typer.Option("--to-latitude", help="Second place: gives to minus from.")
]
ToLongitude = Annotated[float | None, typer.Option("--to-longitude", help="Second place.")]
ToHeight = Annotated[float, typer.Option("--to-ellipsoidal-height", help="Second place, m.")]
Pole = Annotated[
    Path | None,
    typer.Option("--pole", help="CSV with epoch_utc,x_arcsec,y_arcsec: adds the pole tide."),
]
Load = Annotated[
    Path | None,
    typer.Option("--load", help="Harmonic loading of the (first) place, CSV or netCDF."),
]
ToLoad = Annotated[Path | None, typer.Option("--to-load", help="Loading of the second place.")]

_SHOWN = 25


def command(
    latitude: Latitude,
    longitude: Longitude,
    start: Start,
    stop: Stop,
    ellipsoidal_height: EllipsoidalHeight = 0.0,
    step: Step = 3600.0,
    to_latitude: ToLatitude = None,
    to_longitude: ToLongitude = None,
    to_ellipsoidal_height: ToHeight = 0.0,
    pole: Pole = None,
    load: Load = None,
    to_load: ToLoad = None,
    out: OutFile = None,
    picture: PictureFile = None,
    force: Force = False,
    json: Json = False,
    quiet: Quiet = False,
) -> None:
    """Tidal potential and frequency shift at a place or between two.

    Gives the time-variable part that a clock on the solid Earth feels (Moon and Sun, Love numbers
    by degree); the permanent tide is stated beside it, not included. With a second place the
    difference is the second minus the first. --out writes CSV or netCDF, by the suffix; --picture
    draws the series.

    Example: clockgeo tide --latitude 52.3 --longitude 10.5 --start 2027-03-01 --stop 2027-03-02
    """
    from clockgeo.cli.terminal import print_json, say
    from clockgeo.gravity import (
        Place,
        SiteTide,
        read_load_table,
        read_pole_coordinates,
        tide_series,
        write_tide_series,
    )
    from clockgeo.gravity.tide_curves import series_suffix
    from clockgeo.levelling.redshift import shift_from_potential
    from clockgeo.times import tai_from_iso

    if (to_latitude is None) != (to_longitude is None):
        raise typer.BadParameter("a second place needs both --to-latitude and --to-longitude")
    if to_load is not None and to_latitude is None:
        raise typer.BadParameter("--to-load needs a second place")
    if out is not None:
        series_suffix(out)
    if picture is not None:
        from clockgeo.report import checked_picture

        checked_picture(picture, replace=force)
    first, last = tai_from_iso(start), tai_from_iso(stop)
    wobble = None if pole is None else read_pole_coordinates(pole)

    def site(phi: float, lam: float, height: float, table: Path | None) -> SiteTide:
        here = Place(phi, lam, height)
        return SiteTide(here, wobble, None if table is None else read_load_table(table))

    here = site(latitude, longitude, ellipsoidal_height, load)
    there = None
    if to_latitude is not None and to_longitude is not None:
        there = site(to_latitude, to_longitude, to_ellipsoidal_height, to_load)
    series = (
        tide_series(first, last, step, here)
        if there is None
        else tide_series(first, last, step, there, here)
    )
    y = shift_from_potential(-series.potential)
    if out is not None:
        write_tide_series(series, out, fractional_frequency=y, replace=force)
    if picture is not None:
        from clockgeo.cli.picturing import draw_tide

        draw_tide(series, float(shift_from_potential(-1.0)), picture, replace=force)
    if json:
        print_json(_result(series, y))
    elif not quiet:
        _tell(series, y)
        for path in (out, picture):
            if path is not None:
                say(f"written: {path}")


def _result(series: TideSeries, y: NDArray[np.float64]) -> dict[str, object]:
    from clockgeo.gravity import CAUTION
    from clockgeo.gravity.tide_model import NEGLECTED
    from clockgeo.times import iso_utc

    return {
        "schema": "clockgeo/tide/1",
        "place": series.site.place,
        "minus": None if series.other is None else series.other.place,
        "epochs": [iso_utc(int(epoch)) for epoch in series.tai_ns],
        "potential": series.potential,
        "fractional_frequency": y,
        "tide_generating_potential": series.generating_potential,
        "permanent_tide_generating_potential": series.permanent_potential,
        "permanent_potential": series.permanent_on_crust,
        "conventions": "potential: time-variable part of W felt by a clock on the crust, m² s⁻², "
        "permanent_potential not included; fractional_frequency = -potential/c²; "
        "tide_generating_potential: no Love numbers, permanent part included",
        "neglected": NEGLECTED,
        "caution": CAUTION,
    }


def _tell(series: TideSeries, y: NDArray[np.float64]) -> None:
    from clockgeo.cli.terminal import say, show_table
    from clockgeo.gravity import CAUTION
    from clockgeo.times import iso_utc

    place = "the second place minus the first" if series.other is not None else "one place"
    shown = range(min(len(y), _SHOWN))
    rows = [
        (iso_utc(int(series.tai_ns[n]), digits=0), f"{series.potential[n]:.4f}", f"{y[n]:.3e}")
        for n in shown
    ]
    columns = ("epoch (UTC)", "potential (m² s⁻²)", "fractional frequency")
    show_table(f"Time-variable tide, {place}", columns, rows)
    if len(y) > _SHOWN:
        say(f"{len(y) - _SHOWN} more epochs not shown; --out FILE writes them all")
    low, high = float(series.potential.min()), float(series.potential.max())
    say(
        f"potential from {low:.4f} to {high:.4f} m² s⁻², "
        f"frequency from {float(y.min()):.2e} to {float(y.max()):.2e}"
    )
    say(f"permanent tide, not included: {series.permanent_on_crust:.4f} m² s⁻²")
    say(CAUTION)
