"""Reading the open exchange format of fibre-link comparisons; `exchange_writing` writes it.

A folder holds headers (`*.yml`, one or several, the same after concatenation) and, for each
comparator, a folder of its name with data files whose names sort by time. Columns: MJD (UTC),
output Δ, flag 0, 1 or 2, perhaps a systematic uncertainty, then anything. Headers are read as text
throughout, so that no nominal value passes through a float; what is not changed is written back
byte by byte.
"""

from __future__ import annotations

import re
from collections.abc import Iterable
from dataclasses import dataclass
from pathlib import Path

from clockgeo.errors import DataError
from clockgeo.frequency.comparator import Comparator, comparator_from, refuse_contradictions
from clockgeo.frequency.layout import RecordLayout
from clockgeo.frequency.reading import read_record
from clockgeo.frequency.record import Record
from clockgeo.times import SECOND_NS

__all__ = ["ExchangeFolder", "read_exchange", "read_output", "read_outputs", "rows_state_u"]

HEADERS = "*.yml"
_SEPARATORS = re.compile(r"[\s,;]+")
MJD_COLUMN, OUTPUT_COLUMN, FLAG_COLUMN, U_COLUMN = 1, 2, 3, 4
VALID_FLAG, EXPERIMENTAL_FLAG = 2, 1


@dataclass(frozen=True)
class ExchangeFolder:
    """What a folder of the exchange format holds.

    Attributes
    ----------
    path : Path
    headers : tuple of (str, str)
        Name and text of each header file.
    comparators : dict of str to Comparator
    """

    path: Path
    headers: tuple[tuple[str, str], ...]
    comparators: dict[str, Comparator]

    def data_files(self, comparator: str) -> list[Path]:
        """Data files of a comparator in the order of time; empty if it has none."""
        folder = self.path / comparator
        if not folder.is_dir():
            return []
        return sorted(
            path for path in folder.iterdir() if path.is_file() and not path.name.startswith(".")
        )


def read_exchange(path: str | Path) -> ExchangeFolder:
    """Read the headers of a folder; data are read by `read_output`.

    Raises
    ------
    DataError
        If there is no header, one is not YAML, an entry is wrong, or two contradict each other.
    """
    folder = Path(path)
    files = sorted(folder.glob(HEADERS))
    if not folder.is_dir():
        raise DataError(
            "the folder of the exchange format does not exist",
            value=folder,
            advice="Its name is relative to the document; clockgeo simulate draws one from [truth]",
        )
    if not files:
        raise DataError(
            "no header of the exchange format",
            value=folder,
            allowed=f"Files {HEADERS} in the folder",
        )
    headers, comparators = [], []
    for file in files:
        try:
            text = file.read_bytes().decode("utf-8")
        except UnicodeDecodeError:
            raise DataError("the header is not text in UTF-8", where=file.name) from None
        headers.append((file.name, text))
        comparators += [
            comparator_from(entry, where=file.name) for entry in _entries(text, file.name)
        ]
    refuse_contradictions(comparators)
    return ExchangeFolder(folder, tuple(headers), {one.name: one for one in comparators})


def _entries(text: str, where: str) -> list[dict[str, str]]:
    """Entries of a header with every value as text, quoted or bare."""
    import yaml

    try:
        found = yaml.load(text, Loader=yaml.BaseLoader)
    except yaml.YAMLError as error:
        raise DataError(
            "the header is not YAML", value=str(error).split("\n")[0], where=where
        ) from None
    if not isinstance(found, list) or not all(isinstance(entry, dict) for entry in found):
        raise DataError("the header is not a list of comparators", where=where)
    for entry in found:
        for key, value in entry.items():
            if not isinstance(value, str):
                raise DataError("a key holds more than one value", value=key, where=where)
    return found


def read_output(
    folder: ExchangeFolder, name: str, *, experimental: bool = False, skip_bad_rows: bool = False
) -> Record:
    """Read all data files of a comparator as one record of its output.

    Parameters
    ----------
    folder : ExchangeFolder
    name : str
        Of the comparator.
    experimental : bool
        Whether rows flagged 1, valid but experimental, count; those flagged 2 do, those flagged 0
        never.
    skip_bad_rows : bool
        See `read_record`.

    Returns
    -------
    Record
        `y` is the output Δ, epochs are starts of gates. A systematic uncertainty in the fourth
        column is not taken: it often repeats that of the header, and would count twice.

    Raises
    ------
    DataError
        If the comparator is unknown or has no data, or as `read_record`.
    """
    comparator = folder.comparators.get(name)
    if comparator is None:
        raise DataError(
            "there is no such comparator", value=name, allowed=f"{', '.join(folder.comparators)}"
        )
    files = folder.data_files(name)
    if not files:
        raise DataError("a comparator has no data", value=name, where=str(folder.path))
    flags = (EXPERIMENTAL_FLAG, VALID_FLAG) if experimental else (VALID_FLAG,)
    layout = RecordLayout(
        file=tuple(f"{name}/{file.name}" for file in files),
        format="text",
        time_column=MJD_COLUMN,
        value_column=OUTPUT_COLUMN,
        flag_column=FLAG_COLUMN,
        valid_flags=flags,
        interval=comparator.interval,
    )
    record = read_record(layout, base=folder.path, name=name, skip_bad_rows=skip_bad_rows)
    lag_ns = round(comparator.lag * record.interval * SECOND_NS)
    return Record(
        name=record.name,
        tai_ns=record.tai_ns - lag_ns,
        y=record.y,
        usable=record.usable,
        interval=record.interval,
        tick=record.tick,
        sources=record.sources,
        notes=record.notes,
        weighting=comparator.weighting,  # type: ignore[arg-type]
    )


def read_outputs(
    folder: ExchangeFolder,
    names: Iterable[str],
    *,
    experimental: bool = False,
    skip_bad_rows: bool = False,
) -> dict[str, Record]:
    """Read the outputs of several comparators; otherwise as `read_output`."""
    return {
        name: read_output(folder, name, experimental=experimental, skip_bad_rows=skip_bad_rows)
        for name in names
    }


def rows_state_u(folder: ExchangeFolder, name: str) -> bool:
    """Whether the rows of a comparator have a fourth column, their systematic uncertainty."""
    for file in folder.data_files(name):
        with file.open(encoding="utf-8", errors="replace") as lines:
            for line in lines:
                if line.strip() and not line.lstrip().startswith("#"):
                    return len(_SEPARATORS.split(line.strip())) >= U_COLUMN
    return False
