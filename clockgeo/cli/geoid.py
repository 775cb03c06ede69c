"""`clockgeo geoid`: sample, describe or convert a gridded geoid model."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING, Annotated, Any

import typer

from clockgeo.cli.options import Force, Json, OutFile, PictureFile, Quiet

if TYPE_CHECKING:
    import numpy as np

    from clockgeo.gravity import GeoidModel

Grid = Annotated[str, typer.Argument(help="Grid file, or the name of a grid shipped here.")]
Latitude = Annotated[
    float | None, typer.Option("--latitude", help="Geodetic latitude of one point, degrees.")
]
Longitude = Annotated[
    float | None, typer.Option("--longitude", help="Its longitude, degrees, east positive.")
]
Points = Annotated[
    Path | None, typer.Option("--points", help="CSV file with columns latitude and longitude.")
]
Describe = Annotated[bool, typer.Option("--describe", help="Tell what the file says of itself.")]
Convert = Annotated[
    Path | None, typer.Option("--convert", help="Write the model to .nc, .ggxf or .gtx.")
]
Resolution = Annotated[
    float | None,
    typer.Option("--resolution", help="With --convert to .nc: pack in multiples of this, m."),
]
Outside = Annotated[str, typer.Option("--outside", help="At points without a value: error or nan.")]
Method = Annotated[
    str | None, typer.Option("--interpolation", help="bilinear, biquadratic or bicubic.")
]
Epoch = Annotated[
    float | None, typer.Option("--epoch", help="Decimal year to bring a model with a rate to.")
]
Quantity = Annotated[
    str | None, typer.Option("--quantity", help="geoid_height or height_anomaly, if not in file.")
]
Tide = Annotated[
    str | None,
    typer.Option("--tide-system", help="mean_tide, zero_tide or tide_free, if not in file."),
]
Level = Annotated[
    str | None, typer.Option("--zero-level", help="Name or W0 in m² s⁻², if not in file.")
]
Body = Annotated[
    str | None, typer.Option("--ellipsoid", help="Such as grs80 or wgs84, if not in file.")
]
U = Annotated[float | None, typer.Option("--u", help="u of a value, m.")]
Length = Annotated[
    float | None, typer.Option("--correlation-length", help="Of the model's errors, m.")
]
FittedTo = Annotated[
    str | None, typer.Option("--fitted-to", help="Levelling datum a hybrid model was fitted to.")
]
Source = Annotated[str | None, typer.Option("--source", help="Title or reference of the model.")]
Variable = Annotated[
    str | None, typer.Option("--variable", help="Of a netCDF file with several, which one.")
]


@dataclass(frozen=True)
class _Samples:
    """What was sampled where."""

    latitude: np.ndarray
    longitude: np.ndarray
    values: np.ndarray
    interpolation_error: np.ndarray
    u: np.ndarray | None


def command(
    grid: Grid,
    latitude: Latitude = None,
    longitude: Longitude = None,
    points: Points = None,
    out: OutFile = None,
    picture: PictureFile = None,
    describe: Describe = False,
    convert: Convert = None,
    resolution: Resolution = None,
    outside: Outside = "error",
    interpolation: Method = None,
    epoch: Epoch = None,
    quantity: Quantity = None,
    tide_system: Tide = None,
    zero_level: Level = None,
    ellipsoid: Body = None,
    u: U = None,
    correlation_length: Length = None,
    fitted_to: FittedTo = None,
    source: Source = None,
    variable: Variable = None,
    force: Force = False,
    json: Json = False,
    quiet: Quiet = False,
) -> None:
    """Sample, describe or convert a gridded geoid model.

    Reads CF netCDF, OGC GGXF, GeoTIFF geodetic grids, GTX and ISG 2.0. What a file does not say of
    its conventions must be stated; it is never guessed. --picture draws a map around the points.

    Example: clockgeo geoid egm96_15.nc --latitude 47.2 --longitude 11.1
    """
    from clockgeo.cli.terminal import print_json, say
    from clockgeo.gravity import open_geoid, write_geoid

    _check_usage(latitude, longitude, points, describe or convert is not None, outside)
    if picture is not None:
        from clockgeo.report import checked_picture

        if latitude is None and points is None:
            raise typer.BadParameter("--picture draws a map around points: give some")
        checked_picture(picture, replace=force)
    path = _path(grid)
    if describe:
        _describe(path, variable, json=json, quiet=quiet)
        return
    model = open_geoid(
        path,
        quantity=quantity,
        tide_system=tide_system,
        zero_level=zero_level,
        ellipsoid=ellipsoid,
        interpolation=interpolation,
        u=u,
        correlation_length=correlation_length,
        fitted_to=fitted_to,
        source=source,
        variable=variable,
    )
    if convert is not None:
        write_geoid(model, convert, resolution=resolution, replace=force)
        say(f"written: {convert}", quiet=quiet or json)
    samples = None
    if points is not None:
        samples = _sampled(model, *_read_points(points), outside, epoch)
    elif latitude is not None:
        samples = _sampled(model, [latitude], [longitude], outside, epoch)
    if out is not None and samples is not None:
        _write_table(out, samples, model, force=force)
    if picture is not None and samples is not None:
        from clockgeo.cli.picturing import draw_geoid

        at = samples.latitude, samples.longitude
        draw_geoid(model, *at, samples.values, samples.u, picture, replace=force)
    if json:
        print_json({"schema": "clockgeo/geoid/1", **_result(model, samples, convert)})
    elif samples is not None and not quiet:
        _tell(model, samples)


def _check_usage(
    latitude: float | None,
    longitude: float | None,
    points: Path | None,
    other_work: bool,
    outside: str,
) -> None:
    if outside not in ("error", "nan"):
        raise typer.BadParameter("--outside takes error or nan")
    one_point = latitude is not None and longitude is not None
    if (latitude is None) != (longitude is None) or (one_point and points is not None):
        raise typer.BadParameter("give --latitude and --longitude, or --points")
    if not (one_point or points is not None or other_work):
        raise typer.BadParameter("give a point, --points, --describe or --convert")


def _path(grid: str) -> Path:
    """Find a file of that name, or a grid that comes with clockgeo."""
    from clockgeo.files import shipped_grid

    if Path(grid).is_file() or Path(grid).parent != Path():
        return Path(grid)
    try:
        return shipped_grid(grid)
    except FileNotFoundError:
        return Path(grid)


def _read_points(path: Path) -> tuple[Any, Any]:
    import polars as pl

    from clockgeo.errors import DataError

    try:
        table = pl.read_csv(path, comment_prefix="#", infer_schema=False)
    except (pl.exceptions.PolarsError, OSError) as error:
        raise DataError("the file of points cannot be read", value=error, where=str(path)) from None
    table = table.rename(str.strip)
    columns = []
    for name in ("latitude", "longitude"):
        if name not in table.columns:
            raise DataError(
                "a column is missing in the file of points",
                value=name,
                where=str(path),
                allowed="A CSV file with columns latitude and longitude in degrees",
            )
        text = table[name].str.strip_chars()
        numbers = text.cast(pl.Float64, strict=False)
        bad = numbers.is_null().arg_true()
        if bad.len():
            raise DataError(
                f"{name} is no number in {bad.len()} of {text.len()} rows",
                value=f"row {bad[0] + 1} holds {text[bad[0]]!r}",
                where=str(path),
            )
        columns.append(numbers.to_numpy())
    return columns[0], columns[1]


def _sampled(
    model: GeoidModel, latitude: Any, longitude: Any, outside: Any, epoch: float | None
) -> _Samples:
    import numpy as np

    from clockgeo.errors import ConventionError

    phi, lam = np.asarray(latitude, dtype=float), np.asarray(longitude, dtype=float)
    values = np.asarray(model.sample(phi, lam, outside=outside, epoch=epoch))
    error = np.asarray(model.interpolation_error(phi, lam, outside="nan"))
    try:
        u = np.asarray(model.u(phi, lam, outside="nan"))
    except ConventionError:  # a model without u can still be sampled
        u = None
    return _Samples(phi, lam, values, error, u)


def _result(model: GeoidModel, samples: _Samples | None, convert: Path | None) -> dict[str, Any]:
    result: dict[str, Any] = {
        "grid": model.name,
        "quantity": model.quantity,
        "tide_system": model.tide_system,
        "interpolation": model.interpolation,
        "conventions": model.conventions,
        "extent": model.extent,
        "source": model.source,
        "converted_to": convert,
    }
    if samples is not None:
        result |= {
            "latitude": samples.latitude,
            "longitude": samples.longitude,
            "values": samples.values,
            "u": samples.u,
            "interpolation_error": samples.interpolation_error,
        }
    return result


def _describe(path: Path, variable: str | None, *, json: bool, quiet: bool) -> None:
    """Tell what the file says, and what it leaves to the user; nothing is needed for that."""
    from clockgeo.cli.terminal import print_json, say, show_table
    from clockgeo.gravity import missing_conventions, read_grid

    content = read_grid(path, variable=variable)
    missing = missing_conventions(content)
    grids = [
        {
            "name": tile.name,
            "depth": tile.depth,
            "south": tile.south,
            "north": tile.north,
            "west": tile.west,
            "east": tile.west + tile.width,
            "latitude_step": tile.latitude_step,
            "longitude_step": tile.longitude_step,
            "has_u": tile.u is not None,
            "has_rate": tile.rate is not None,
        }
        for tile in content.tiles
    ]
    if json:
        stated = {"format": content.format, "stated": content.stated, "not_stated": missing}
        print_json({"schema": "clockgeo/geoid/1", "grid": path.name, **stated, "grids": grids})
        return
    if quiet:
        return
    say(f"{path.name}, {content.format}")
    for key, value in content.stated.items():
        say(f"  {key.replace('_', ' '):20} {value}")
    for key, allowed in missing.items():
        say(f"  {key.replace('_', ' '):20} not stated; give --{key.replace('_', '-')}: {allowed}")
    sides = ("south", "north", "west", "east", "latitude_step", "longitude_step")
    rows = [(str(g["name"] or "-"), *(f"{g[side]:.6f}" for side in sides)) for g in grids]
    show_table("Grids", ("name", *(f"{side.replace('_', ' ')} / °" for side in sides)), rows)


def _tell(model: GeoidModel, samples: _Samples) -> None:
    from clockgeo.cli.terminal import say, show_table
    from clockgeo.gravity import CAUTION

    name = model.quantity.replace("_", " ")
    u = samples.u if samples.u is not None else [float("nan")] * len(samples.values)
    table = (samples.latitude, samples.longitude, samples.values, u, samples.interpolation_error)
    rows = [
        (f"{phi:.6f}", f"{lam:.6f}", f"{value:.4f}", f"{spread:.4f}", f"{error:.4f}")
        for phi, lam, value, spread, error in zip(*table, strict=True)
    ]
    heads = ("latitude / °", "longitude / °", f"{name} / m", "u / m", "interpolation error / m")
    show_table(model.name, heads, rows, left=0)
    say(
        f"{name} above {model.ellipsoid}, {model.tide_system}, zero level "
        f"{model.zero_level.name}, {model.interpolation}"
    )
    if model.hybrid:
        say(f"a hybrid model, fitted to {model.fitted_to or 'a levelling datum that is not named'}")
    say(CAUTION)


def _write_table(path: Path, samples: _Samples, model: GeoidModel, *, force: bool) -> None:
    import polars as pl

    from clockgeo.files import whole_file

    columns = {
        "latitude": samples.latitude,
        "longitude": samples.longitude,
        model.quantity: samples.values,
        "interpolation_error": samples.interpolation_error,
    }
    if samples.u is not None:
        columns["u"] = samples.u
    with whole_file(path, replace=force) as partial:
        pl.DataFrame(columns).write_csv(partial)
