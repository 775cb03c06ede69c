"""`clockgeo redshift`: what a laboratory reports to the time scale."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Annotated, Any

import typer

from clockgeo.cli.options import EllipsoidalHeight, Json, Latitude, Longitude, Quiet

if TYPE_CHECKING:
    from clockgeo.gravity import GeopotentialNumber, Separation, SiteTransfer

UHeight = Annotated[float, typer.Option("--u-height", help="u of the ellipsoidal height, m.")]
HeightTide = Annotated[
    str, typer.Option("--height-tide", help="Tide system of the ellipsoidal height.")
]
Grid = Annotated[
    Path | None,
    typer.Option("--grid", help="Gridded geoid model; without one the global grid shipped here."),
]
GeoidHeight = Annotated[
    float | None, typer.Option("--geoid-height", help="Instead of a grid: geoid height, m.")
]
Anomaly = Annotated[
    float | None, typer.Option("--height-anomaly", help="Instead of a grid: height anomaly, m.")
]
USeparation = Annotated[
    float | None, typer.Option("--u-separation", help="u of the geoid height or anomaly, m.")
]
Tide = Annotated[
    str | None,
    typer.Option("--tide-system", help="Of the geoid height or anomaly, if the grid has none."),
]
Level = Annotated[
    str | None,
    typer.Option("--zero-level", help="Of the geoid height or anomaly: name or W0 in m² s⁻²."),
]
Quantity = Annotated[
    str | None,
    typer.Option("--quantity", help="geoid_height or height_anomaly, if the grid does not say."),
]
Ellipsoid = Annotated[
    str | None, typer.Option("--ellipsoid", help="grs80 or wgs84, if the grid does not say.")
]
Gravity = Annotated[
    float | None, typer.Option("--gravity", help="Gravity measured at the marker, m s⁻².")
]
UGravity = Annotated[float, typer.Option("--u-gravity", help="u of the gravity, m s⁻².")]
Rise = Annotated[float, typer.Option("--rise", help="Height of the atoms above the marker, m.")]
URise = Annotated[float, typer.Option("--u-rise", help="u of that height, m.")]

GLOBAL_GRID = "egm96_15.nc"
_UNMEASURED_GRAVITY = 1e-3  # m s-2: real gravity about the normal one (100 mGal)


def command(
    latitude: Latitude,
    longitude: Longitude,
    ellipsoidal_height: EllipsoidalHeight,
    u_height: UHeight = 0.0,
    height_tide: HeightTide = "tide_free",
    grid: Grid = None,
    geoid_height: GeoidHeight = None,
    height_anomaly: Anomaly = None,
    u_separation: USeparation = None,
    tide_system: Tide = None,
    zero_level: Level = None,
    quantity: Quantity = None,
    ellipsoid: Ellipsoid = None,
    gravity: Gravity = None,
    u_gravity: UGravity = 0.0,
    rise: Rise = 0.0,
    u_rise: URise = 0.0,
    json: Json = False,
    quiet: Quiet = False,
) -> None:
    """Shift of a clock at a place against the zero level of the time scale.

    The fractional shift is positive above the zero level; a laboratory subtracts it. The marker's
    ellipsoidal height is taken above the geoid or quasigeoid of a grid, or above a value given.

    Example: clockgeo redshift --latitude 52.3 --longitude 10.5 --ellipsoidal-height 130
    """
    from clockgeo.cli.terminal import print_json
    from clockgeo.gravity import Place, number_from_ellipsoidal_height

    place = Place(latitude, longitude, ellipsoidal_height)
    stated = [value for value in (grid, geoid_height, height_anomaly) if value is not None]
    if len(stated) > 1:
        raise typer.BadParameter("give one of --grid, --geoid-height and --height-anomaly")
    if grid is None and stated:
        separation = _stated(geoid_height, height_anomaly, u_separation, tide_system, zero_level)
        source = "stated by the user"
    else:
        conventions = {
            "quantity": quantity,
            "tide_system": tide_system,
            "zero_level": zero_level,
            "ellipsoid": ellipsoid,
        }
        separation, source = _from_grid(grid, place, u_separation, conventions)
    marker = number_from_ellipsoidal_height(
        ellipsoidal_height,
        separation,
        latitude=latitude,
        height_tide_system=height_tide,
        u_height=u_height,
        gravity=gravity,
        u_gravity=u_gravity,
    )
    transfer = _to_atoms(rise, u_rise, place, gravity, u_gravity)
    result = _result(place, separation, marker, transfer)
    result["inputs"] = {
        "ellipsoidal_height": ellipsoidal_height,
        "u_height": u_height,
        "height_tide_system": height_tide,
        "separation": separation,
        "separation_source": source,
        "gravity": gravity,
        "u_gravity": u_gravity if gravity is not None else None,
        "rise": rise,
        "u_rise": u_rise,
    }
    if json:
        print_json(result)
    elif not quiet:
        _tell(result)


def _stated(
    geoid_height: float | None,
    height_anomaly: float | None,
    u: float | None,
    tide_system: str | None,
    zero_level: str | None,
) -> Separation:
    from clockgeo.gravity import Separation

    if u is None or tide_system is None or zero_level is None:
        raise typer.BadParameter(
            "a stated geoid height or height anomaly needs --u-separation, --tide-system and "
            "--zero-level; none of them can be guessed"
        )
    if geoid_height is not None:
        return Separation(geoid_height, u, "geoid_height", tide_system, zero_level)
    assert height_anomaly is not None
    return Separation(height_anomaly, u, "height_anomaly", tide_system, zero_level)


def _to_atoms(
    rise: float, u_rise: float, place: Any, gravity: float | None, u_gravity: float
) -> SiteTransfer:
    from clockgeo.gravity import marker_to_atoms, normal_gravity

    if gravity is None:
        gravity = float(normal_gravity(place.latitude, place.ellipsoidal_height))
        u_gravity = _UNMEASURED_GRAVITY
    return marker_to_atoms(rise, gravity=gravity, u_dz=u_rise, u_gravity=u_gravity)


def _result(
    place: Any, separation: Separation, marker: GeopotentialNumber, transfer: SiteTransfer
) -> dict[str, Any]:
    from dataclasses import replace

    import numpy as np

    from clockgeo.gravity import CAUTION
    from clockgeo.levelling.redshift import shift_from_potential

    atoms = replace(
        marker,
        value=marker.value + transfer.geopotential_difference,
        u=float(np.hypot(marker.u, transfer.u)),
    )
    scale, reference = atoms.counted_from("time_scale"), atoms.counted_from("height_reference")
    return {
        "schema": "clockgeo/redshift/1",
        "place": place,
        "fractional_shift": shift_from_potential(scale.value),
        "u": shift_from_potential(scale.u),
        "geopotential_number": scale.value,
        "u_geopotential_number": scale.u,
        "zero_level": scale.zero_level.name,
        "tide_system": scale.tide_system,
        "geopotential_number_height_reference": reference.value,
        "marker_to_atoms": transfer,
        "conventions": [
            "fractional_shift = C/c², C = W0 - W at the atoms, W0 = L_G c² of the time scale",
            "it is positive above the zero level: subtract it from the clock's frequency",
            "W is mean-tide: the permanent tide acts on the clock and is included",
            "the time-variable tide is not included; see clockgeo tide",
            f"separation: {separation.quantity}, {separation.tide_system}, converted to mean-tide",
        ],
        "caution": CAUTION,
    }


def _tell(result: dict[str, Any]) -> None:
    from clockgeo.cli.terminal import say, show_table

    inputs = result["inputs"]
    separation = inputs["separation"]
    rows = [
        ("fractional shift", f"{result['fractional_shift']:.6e}", f"{result['u']:.1e}", "1"),
        (
            "geopotential number (time scale)",
            f"{result['geopotential_number']:.4f}",
            f"{result['u_geopotential_number']:.4f}",
            "m² s⁻²",
        ),
        (
            "geopotential number (height reference)",
            f"{result['geopotential_number_height_reference']:.4f}",
            f"{result['u_geopotential_number']:.4f}",
            "m² s⁻²",
        ),
        (
            "ellipsoidal height of the marker",
            f"{inputs['ellipsoidal_height']:.4f}",
            f"{inputs['u_height']:.4f}",
            "m",
        ),
        (
            separation.quantity.replace("_", " "),
            f"{separation.value:.4f}",
            f"{separation.u:.4f}",
            "m",
        ),
        ("rise to the atoms", f"{inputs['rise']:.4f}", f"{inputs['u_rise']:.4f}", "m"),
    ]
    show_table("Shift against the time scale", ("quantity", "value", "u", "unit"), rows)
    say(f"geoid or quasigeoid: {inputs['separation_source']}")
    for convention in result["conventions"]:
        say(f"- {convention}")
    say(result["caution"])


def _from_grid(
    grid: Path | None, place: Any, u: float | None, conventions: dict[str, Any]
) -> tuple[Separation, str]:
    """Sample a grid; what it does not say about itself must be in `conventions`."""
    from clockgeo.files import shipped_grid
    from clockgeo.gravity import Separation, open_geoid

    path = shipped_grid(GLOBAL_GRID) if grid is None else grid
    model = open_geoid(path, u=u, **conventions)
    value = float(model.sample(place.latitude, place.longitude))
    spread = float(model.u(place.latitude, place.longitude))
    separation = Separation(
        value, spread, model.quantity, model.tide_system, model.zero_level, model.ellipsoid
    )
    return separation, path.name
