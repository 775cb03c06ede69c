"""The one family of errors and warnings.

Every message answers five questions in this order: what is wrong, which value, where, what is
allowed, what to do next. The constructor asks for them by name so that none is forgotten.
"""

from __future__ import annotations

__all__ = [
    "CampaignError",
    "ClockgeoError",
    "ClockgeoWarning",
    "ConventionError",
    "DataError",
    "OutputError",
]


class ClockgeoError(Exception):
    """Base of all errors that clockgeo raises on purpose.

    Parameters
    ----------
    what : str
        What is wrong, as a clause without a full stop.
    value : object, optional
        The offending value; shown after the clause.
    where : str, optional
        File, line, site, session or epoch where it was found.
    allowed : str, optional
        What would be accepted.
    advice : str, optional
        What to do next.
    """

    def __init__(
        self,
        what: str,
        *,
        value: object = None,
        where: str | None = None,
        allowed: str | None = None,
        advice: str | None = None,
    ) -> None:
        self.what, self.value, self.where = what, value, where
        self.allowed, self.advice = allowed, advice
        super().__init__(self._sentences())

    def _sentences(self) -> str:
        first = self.what
        if self.value is not None:
            first += f": {self.value}"
        if self.where is not None:
            first += f" (at {self.where})"
        rest = [part for part in (self.allowed, self.advice) if part]
        ended = (s if s.endswith("?") else s.rstrip(".") + "." for s in [first, *rest])
        return " ".join(ended)


class DataError(ClockgeoError):
    """A file or an array holds something that cannot be used."""


class ConventionError(ClockgeoError):
    """Tide systems, zero levels, units or signs do not fit together."""


class CampaignError(ClockgeoError):
    """The campaign document is wrong; carries every problem found.

    Parameters
    ----------
    problems : list of str
        One full message a problem, in the order of the document.
    where : str
        The document's file name.
    """

    def __init__(self, problems: list[str], *, where: str) -> None:
        self.problems = list(problems)
        count = f"{len(self.problems)} problem{'s' if len(self.problems) != 1 else ''}"
        lines = "\n".join(f"  - {problem}" for problem in self.problems)
        super().__init__(f"the campaign document has {count}", where=where)
        self.args = (f"{self.args[0]}\n{lines}",)


class OutputError(ClockgeoError):
    """A result cannot be written; nothing was changed."""


class ClockgeoWarning(UserWarning):
    """Something legal but worth a second look."""
