"""A plan on disk: `plan.json`, CF netCDF, and the sessions as they go into the document."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path

from clockgeo.campaign.schema import Placed, Session
from clockgeo.errors import DataError
from clockgeo.files import json_text, write_dataset, write_text
from clockgeo.planning.dataset import plan_dataset
from clockgeo.planning.results import PlanResult

__all__ = ["PLAN_FILES", "read_plan", "sessions_toml", "write_plan"]

PLAN_FILES = ("plan.json", "plan.nc", "sessions.toml")


def write_plan(
    result: PlanResult, sessions: Sequence[Session], folder: Path, *, replace: bool = False
) -> list[Path]:
    """Write `plan.json`, `plan.nc` and `sessions.toml` into `folder`; return their paths.

    Raises
    ------
    OutputError
        If a file exists and `replace` is false, or cannot be written.
    """
    paths = [folder / name for name in PLAN_FILES]
    write_text(paths[0], json_text(result), replace=replace)
    write_dataset(paths[1], plan_dataset(result), replace=replace, classic=True)
    write_text(paths[2], sessions_toml(sessions), replace=replace)
    return paths


def read_plan(path: str | Path) -> PlanResult:
    """Read a `plan.json` back, checked against its schema.

    Raises
    ------
    DataError
        If the file is missing or is no plan of clockgeo.
    """
    from pydantic import ValidationError

    path = Path(path)
    path = path / PLAN_FILES[0] if path.is_dir() else path
    try:
        return PlanResult.model_validate_json(path.read_bytes())
    except FileNotFoundError:
        raise DataError(
            "no plan here", value=path, advice="Run clockgeo plan with --out first"
        ) from None
    except ValidationError as error:
        first = error.errors()[0]
        raise DataError(
            "not a plan of clockgeo",
            value=f"{'.'.join(map(str, first['loc']))}: {first['msg']}",
            where=str(path),
        ) from None


def sessions_toml(sessions: Sequence[Session]) -> str:
    """Return planned sessions as `[[session]]` tables, ready for the campaign document."""
    return "\n".join(_session(one) for one in sessions)


def _session(session: Session) -> str:
    lines = ["[[session]]", f"id = {_text(session.id)}"]
    for role, placed in zip(("numerator", "denominator"), session.places, strict=True):
        lines.append(f"{role} = {_placed(placed)}")
    if session.links:
        lines.append(f"links = [{', '.join(map(_text, session.links))}]")
    if session.start is not None:
        lines.append(f"start = {session.start:%Y-%m-%dT%H:%M:%SZ}")
    if session.planned_seconds is not None:
        lines.append(f"hours = {session.planned_seconds / 3600.0!r}")
    lines.append(f"uptime = {session.uptime!r}")
    return "\n".join(lines) + "\n"


def _placed(placed: Placed) -> str:
    return f"{{ clock = {_text(placed.clock)}, site = {_text(placed.site)} }}"


def _text(text: str) -> str:
    """Basic string of TOML."""
    import json

    # JSON escapes are escapes of TOML too; only DEL must be escaped there and is not here.
    return json.dumps(text, ensure_ascii=False).replace("\x7f", "\\u007f")
