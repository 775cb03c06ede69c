"""Files that appear whole or not at all, their checksums, and one way to write JSON."""

from __future__ import annotations

import dataclasses
import errno
import hashlib
import json
import math
import secrets
from collections.abc import Iterator, Mapping
from contextlib import contextmanager
from enum import Enum
from pathlib import Path
from typing import TYPE_CHECKING, Any

from clockgeo.errors import OutputError

if TYPE_CHECKING:
    import xarray as xr

__all__ = [
    "json_text",
    "netcdf_file",
    "sha256_of",
    "shipped_grid",
    "whole_file",
    "write_dataset",
    "write_text",
]


@contextmanager
def whole_file(path: str | Path, *, replace: bool = False) -> Iterator[Path]:
    """Give a temporary path beside `path`; move it there when the block ends well.

    Parameters
    ----------
    path : path
        Where the file shall stand at the end.
    replace : bool
        Whether an existing file may be replaced.

    Yields
    ------
    Path
        Where to write. If the block raises, the temporary file is removed and `path` is as before.

    Raises
    ------
    OutputError
        If `path` exists and `replace` is false, the folder is missing or read-only, or the disk is
        full.
    """
    target = Path(path)
    if target.exists() and not replace:
        raise OutputError(
            "the output exists already",
            value=target,
            advice="Choose another name, or allow replacing it with --force",
        )
    partial = target.with_name(f".{target.name}.{secrets.token_hex(4)}.part")
    try:
        yield partial
        partial.replace(target)
    except OSError as error:
        raise _output_error(error, target) from error
    finally:
        partial.unlink(missing_ok=True)


def _output_error(error: OSError, target: Path) -> OutputError:
    advice = {
        errno.ENOSPC: "The disk is full: free some space and run again",
        errno.EACCES: "The folder may not be written to: choose another with --out",
        errno.EROFS: "The folder is read-only: choose another with --out",
        errno.ENOENT: "The folder does not exist: create it first",
    }.get(error.errno or 0, "Check the disk and the folder, then run again")
    reason = error.strerror or str(error)
    return OutputError(f"cannot write the output ({reason})", value=target, advice=advice)


def write_text(path: str | Path, text: str, *, replace: bool = False) -> None:
    """Write UTF-8 text with `\\n` line ends, whole or not at all (see `whole_file`)."""
    with whole_file(path, replace=replace) as partial:
        partial.write_text(text, encoding="utf-8", newline="\n")


@contextmanager
def netcdf_file(path: Path) -> Iterator[Any]:
    """Give an empty netCDF-4 dataset; write it to `path` when the block ends well.

    The dataset grows in memory and is written in one go: the HDF5 library itself can take the whole
    process down when a disk fills up.

    Yields
    ------
    netCDF4.Dataset
    """
    import netCDF4

    dataset = netCDF4.Dataset(path.name, "w", format="NETCDF4", memory=1)
    try:
        yield dataset
    finally:
        content = dataset.close()
    path.write_bytes(content)


def write_dataset(
    path: str | Path,
    dataset: xr.Dataset,
    *,
    replace: bool = False,
    classic: bool = False,
    encoding: Mapping[Any, Any] | None = None,
) -> None:
    """Write an xarray dataset as netCDF, whole or not at all (see `whole_file`).

    Parameters
    ----------
    path : path
    dataset : xarray.Dataset
    replace : bool
        Whether an existing file may be replaced.
    classic : bool
        Write the classic format, whose bytes depend on nothing but the content; netCDF-4, which
        can compress and hold 64-bit integers, also notes the time of writing.
    encoding : mapping, optional
        Of `xarray.Dataset.to_netcdf`.
    """
    with whole_file(path, replace=replace) as partial:
        # In memory first, for the same reason as in `netcdf_file`.
        engine: Any = "scipy" if classic else "netcdf4"
        partial.write_bytes(dataset.to_netcdf(engine=engine, encoding=encoding))


def sha256_of(path: str | Path) -> str:
    """SHA-256 of a file's bytes, as 64 hexadecimal digits."""
    with Path(path).open("rb") as stream:
        return hashlib.file_digest(stream, "sha256").hexdigest()


def json_text(value: Any) -> str:
    """Write any result as JSON: numpy, dataclasses, pydantic models, enums and paths included.

    NaN and infinity become `null`, since JSON has no word for them. Floats keep their shortest
    exact form and keys their order, so that equal results give equal bytes.
    """
    return json.dumps(_plain(value), ensure_ascii=False, indent=2, allow_nan=False) + "\n"


def _plain(value: Any) -> Any:
    if hasattr(value, "model_dump"):
        value = value.model_dump(by_alias=True)
    elif dataclasses.is_dataclass(value) and not isinstance(value, type):
        value = {f.name: getattr(value, f.name) for f in dataclasses.fields(value)}
    if isinstance(value, Enum):
        return _plain(value.value)
    if isinstance(value, dict):
        return {str(key): _plain(item) for key, item in value.items()}
    if isinstance(value, list | tuple | set | frozenset):
        return [_plain(item) for item in value]
    if hasattr(value, "tolist"):
        return _plain(value.tolist())
    if isinstance(value, float):
        return value if math.isfinite(value) else None
    if isinstance(value, str | int | bool) or value is None:
        return value
    return str(value)


def shipped_grid(name: str) -> Path:
    """Path of a grid that comes with clockgeo, in a checkout as in an installed wheel.

    Raises
    ------
    OutputError
        Never; a missing grid raises `FileNotFoundError` with the folders searched.
    """
    package = Path(__file__).resolve().parent
    folders = [package / "_grids", package.parent / "grids"]
    for folder in folders:
        if (folder / name).is_file():
            return folder / name
    message = f"no shipped grid {name!r} in {' or '.join(map(str, folders))}"
    raise FileNotFoundError(message)
