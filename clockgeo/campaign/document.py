"""Reading a campaign document: every problem at once, each in a sentence."""

from __future__ import annotations

import difflib
import tomllib
from dataclasses import dataclass
from pathlib import Path
from types import UnionType
from typing import Any, Union, get_args, get_origin

from pydantic import BaseModel, ValidationError
from pydantic_core import ErrorDetails

from clockgeo.campaign.references import reference_problems
from clockgeo.campaign.schema import Campaign
from clockgeo.errors import CampaignError, DataError

__all__ = ["Document", "campaign_schema", "read_document"]


@dataclass(frozen=True)
class Document:
    """A campaign and the file it stands in; paths in the campaign are relative to its folder."""

    campaign: Campaign
    path: Path

    @property
    def folder(self) -> Path:
        """The folder that relative paths start from."""
        return self.path.parent


def read_document(path: str | Path) -> Document:
    """Read a campaign document.

    Parameters
    ----------
    path : path
        A TOML file.

    Raises
    ------
    DataError
        If the file is missing, not text or not TOML (with the line).
    CampaignError
        If its content is wrong; carries all problems found.
    """
    path = Path(path)
    raw = _tables(path)
    problems: list[str] = []
    campaign = None
    try:
        campaign = Campaign.model_validate(raw)
    except ValidationError as error:
        problems += [_sentence(detail, raw) for detail in error.errors()]
    problems += reference_problems(raw, campaign)
    if problems or campaign is None:
        raise CampaignError(problems, where=str(path))
    return Document(campaign, path)


def campaign_schema() -> dict[str, Any]:
    """JSON Schema of the campaign document, for editors that complete and check TOML."""
    schema = Campaign.model_json_schema(by_alias=True)
    return {"$schema": "https://json-schema.org/draft/2020-12/schema", **schema}


def _tables(path: Path) -> dict[str, Any]:
    try:
        return tomllib.loads(path.read_text(encoding="utf-8"))
    except FileNotFoundError:
        near = sorted(other.name for other in path.parent.glob("*.toml"))
        raise DataError(
            "the campaign document is not there",
            value=path,
            advice=f"In that folder: {', '.join(near)}" if near else "Check the folder's name",
        ) from None
    except IsADirectoryError:
        raise DataError(
            "the campaign document is a folder", value=path, advice="Name the TOML file in it"
        ) from None
    except UnicodeDecodeError as error:
        raise DataError(
            "the campaign document is not text in UTF-8",
            value=f"byte {error.object[error.start]:#04x} at position {error.start}",
            where=str(path),
        ) from None
    except tomllib.TOMLDecodeError as error:
        raise DataError("the campaign document is not TOML", value=error, where=str(path)) from None


def _sentence(detail: ErrorDetails, raw: dict[str, Any]) -> str:
    """One validation error as: place, what is wrong, what is allowed."""
    location = detail["loc"]
    place = _place(location, raw)
    if detail["type"] == "extra_forbidden":
        known = _known_keys(location[:-1])
        near = difflib.get_close_matches(str(location[-1]), known, n=1, cutoff=0.5)
        hint = f"did you mean {near[0]!r}?" if near else f"known: {', '.join(known)}"
        return f"{place}: unknown key; {hint}"
    if detail["type"] == "missing":
        return f"{place}: missing; it must be given"
    shown = "" if isinstance(detail["input"], dict | list) else f" (found {detail['input']!r})"
    message = detail["msg"].removeprefix("Value error, ").replace("Input should be", "must be")
    return f"{place}: {message}{shown}"


def _place(location: tuple[int | str, ...], raw: Any) -> str:
    """Name a place in the document by table and id rather than by position."""
    parts: list[str] = []
    node: Any = raw
    for step in location:
        try:
            node = node[step]
        except (KeyError, IndexError, TypeError):
            node = None
        if isinstance(step, int):
            name = node.get("id") or node.get("name") if isinstance(node, dict) else None
            parts[-1] = f"[[{parts[-1].strip('[]')}]] {repr(name) if name else f'no. {step + 1}'}"
        elif not parts:
            parts.append(f"[{step}]")
        else:
            parts.append(step)
    return ", ".join(parts)


def _known_keys(location: tuple[int | str, ...]) -> list[str]:
    """Keys of the table at `location`, as written in the file."""
    table: type[BaseModel] | None = Campaign
    for step in location:
        if isinstance(step, int) or table is None:
            continue
        field = next((f for name, f in table.model_fields.items() if step in (name, f.alias)), None)
        table = _table_in(field.annotation) if field else None
    if table is None:
        return []
    return [field.alias or name for name, field in table.model_fields.items()]


def _table_in(annotation: Any) -> type[BaseModel] | None:
    """Return the table type inside an annotation such as ``tuple[Site, ...]``."""
    if isinstance(annotation, type) and issubclass(annotation, BaseModel):
        return annotation
    if get_origin(annotation) in (tuple, list, Union, UnionType):
        return next(filter(None, map(_table_in, get_args(annotation))), None)
    return None
