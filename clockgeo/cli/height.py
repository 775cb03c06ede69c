"""`clockgeo height`: geopotential numbers, heights, tide systems and zero levels of one place."""

from __future__ import annotations

from typing import TYPE_CHECKING, Annotated, Any, Literal

import typer

from clockgeo.cli.options import Json, Latitude, Quiet

if TYPE_CHECKING:
    pass

TIDES = "mean_tide, zero_tide or tide_free"

Number = Annotated[
    float | None, typer.Option("--geopotential-number", help="C = W0 - W in m² s⁻².")
]
HeightValue = Annotated[float | None, typer.Option("--height", help="Height of --kind, m.")]
Kind = Annotated[str, typer.Option("--kind", help="normal, orthometric or dynamic.")]
Gravity = Annotated[
    float | None, typer.Option("--gravity", help="Gravity at the point, m s⁻² (orthometric).")
]
MeanGravity = Annotated[
    float | None,
    typer.Option("--mean-gravity", help="Mean gravity along the plumb line, m s⁻² (orthometric)."),
]
UInput = Annotated[float, typer.Option("--u", help="u of the number (m² s⁻²) or height (m).")]
UGravity = Annotated[float, typer.Option("--u-gravity", help="u of the gravity, m s⁻².")]
FromTide = Annotated[str | None, typer.Option("--from-tide", help=f"Tide system given: {TIDES}.")]
ToTide = Annotated[str | None, typer.Option("--to-tide", help=f"Tide system wanted: {TIDES}.")]
FixedIn = Annotated[
    str,
    typer.Option("--fixed-in", help="crust (a mark) or space; differs for tide_free only."),
]
DatumLatitude = Annotated[
    float | None,
    typer.Option("--datum-latitude", help="Of a datum point that keeps its number in all tides."),
]
FromLevel = Annotated[
    str | None, typer.Option("--from-zero-level", help="Zero level given: name or W0 in m² s⁻².")
]
ToLevel = Annotated[
    str | None, typer.Option("--to-zero-level", help="Zero level wanted: name or W0 in m² s⁻².")
]
Ellipsoid = Annotated[str, typer.Option("--ellipsoid", help="grs80 or wgs84 (normal heights).")]


def command(
    latitude: Latitude,
    geopotential_number: Number = None,
    height: HeightValue = None,
    kind: Kind = "normal",
    gravity: Gravity = None,
    mean_gravity: MeanGravity = None,
    u: UInput = 0.0,
    u_gravity: UGravity = 0.0,
    from_tide: FromTide = None,
    to_tide: ToTide = None,
    fixed_in: FixedIn = "crust",
    datum_latitude: DatumLatitude = None,
    from_zero_level: FromLevel = None,
    to_zero_level: ToLevel = None,
    ellipsoid: Ellipsoid = "grs80",
    json: Json = False,
    quiet: Quiet = False,
) -> None:
    """Convert between geopotential numbers, heights and tide systems.

    Give either --geopotential-number or --height; the other comes out, after the conversion of tide
    system and zero level that was asked for. Orthometric heights need gravity.

    Example: clockgeo height --geopotential-number 748 --latitude 52.3 --kind normal
    """
    from clockgeo.cli.terminal import print_json
    from clockgeo.gravity import CAUTION, height_of, number_of, tide_system_shift, zero_level_shift
    from clockgeo.gravity.places import checked_latitude

    if (geopotential_number is None) == (height is None):
        raise typer.BadParameter("give either --geopotential-number or --height")
    for name, pair in (("tide", (from_tide, to_tide)), ("level", (from_zero_level, to_zero_level))):
        if (pair[0] is None) != (pair[1] is None):
            raise typer.BadParameter(f"give both the {name} you have and the one you want, or none")
    checked_latitude(latitude)
    place: dict[str, Any] = {
        "kind": kind,
        "latitude": latitude,
        "gravity": gravity,
        "mean_gravity": mean_gravity,
        "u_gravity": u_gravity,
        "ellipsoid": ellipsoid,
    }
    number, u_number = (
        (geopotential_number, u) if height is None else number_of(height, u=u, **place)
    )
    assert number is not None
    if from_tide is not None and to_tide is not None:
        shift = tide_system_shift(
            "geopotential_number",
            latitude,
            source=from_tide,
            target=to_tide,
            fixed_in=_fixed_in(fixed_in),
            datum_latitude=datum_latitude,
        )
        number += float(shift)
    if from_zero_level is not None and to_zero_level is not None:
        number += zero_level_shift(source=from_zero_level, target=to_zero_level)
    converted = height_of(number, u=u_number, **(place if height is None else _exact(place)))
    result = {
        "schema": "clockgeo/height/1",
        "kind": converted.kind,
        "height": converted.value,
        "u_height": converted.u,
        "geopotential_number": number,
        "u_geopotential_number": u_number,
        "latitude": latitude,
        "tide_system": to_tide,
        "zero_level": to_zero_level,
        "ellipsoid": ellipsoid,
        "height_per_potential": converted.per_potential,
        "caution": CAUTION,
    }
    if json:
        print_json(result)
    elif not quiet:
        _tell(result)


def _exact(place: dict[str, Any]) -> dict[str, Any]:
    """The same place with gravity taken as exact: its u is in the number already."""
    return {**place, "u_gravity": 0.0}


def _fixed_in(stated: str) -> Literal["crust", "space"]:
    if stated not in ("crust", "space"):
        raise typer.BadParameter("--fixed-in takes crust or space")
    return "crust" if stated == "crust" else "space"


def _tell(result: dict[str, Any]) -> None:
    from clockgeo.cli.terminal import say, show_table

    rows = [
        (f"{result['kind']} height", f"{result['height']:.6f}", f"{result['u_height']:.6f}", "m"),
        (
            "geopotential number",
            f"{result['geopotential_number']:.6f}",
            f"{result['u_geopotential_number']:.6f}",
            "m² s⁻²",
        ),
    ]
    show_table("Height", ("quantity", "value", "u", "unit"), rows)
    say(
        f"tide system {result['tide_system'] or 'as given'}; "
        f"zero level {result['zero_level'] or 'as given'}; ellipsoid {result['ellipsoid']}"
    )
    say(result["caution"])
