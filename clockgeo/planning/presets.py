"""Starting points for clocks and links of a plan, by class: published figures, rounded.

They stand for what was published of a class, not for any one instrument; your own budget replaces
them. Where a source gives a total u only, the preset splits it into one effect that is new at each
stay and one that is not, half of the variance each: a choice of this module, no published fact.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

from clockgeo.errors import DataError
from clockgeo.frequency import NoiseModel

__all__ = ["PRESETS", "Preset", "find_preset", "preset_toml"]


@dataclass(frozen=True)
class Preset:
    """A class of clock or link.

    Attributes
    ----------
    name : str
    kind : "clock" or "link"
    text : str
        What it is, for people.
    instability : NoiseModel
    u : float
        Total systematic standard uncertainty, fractional.
    transition : str or None
        Of a clock, where the class implies one.
    source : str
        Where the figures come from.
    """

    name: str
    kind: Literal["clock", "link"]
    text: str
    instability: NoiseModel
    u: float
    source: str
    transition: str | None = None


PRESETS: dict[str, Preset] = {
    preset.name: preset
    for preset in (
        Preset(
            "transportable-lattice",
            "clock",
            "transportable strontium lattice clock",
            NoiseModel(white_fm=5e-16),
            2.1e-18,
            "arXiv:2507.14030 (2025)",
            "87Sr",
        ),
        Preset(
            "transportable-lattice-early",
            "clock",
            "transportable strontium lattice clock, first generation",
            NoiseModel(white_fm=1.3e-15),
            7.4e-17,
            "Koller et al. 2017, Phys. Rev. Lett. 118, 073601 (arXiv:1609.06183)",
            "87Sr",
        ),
        Preset(
            "transportable-ion",
            "clock",
            "transportable calcium ion clock",
            NoiseModel(white_fm=4.8e-15),
            1.3e-17,
            "Huang et al. 2020, Phys. Rev. A 102, 050802; Liu et al. 2023",
            "40Ca+",
        ),
        Preset(
            "laboratory-lattice",
            "clock",
            "stationary strontium lattice clock",
            NoiseModel(white_fm=1e-16),
            2e-18,
            "upper end of what is published, recalled from memory",
            "87Sr",
        ),
        Preset(
            "laboratory-ytterbium",
            "clock",
            "stationary ytterbium lattice clock",
            NoiseModel(white_fm=1.5e-16, flicker_fm=3.2e-19),
            1.4e-18,
            "McGrew et al. 2018, Nature 564, 87; instability at 1 s from memory",
            "171Yb",
        ),
        Preset(
            "laboratory-ion",
            "clock",
            "stationary strontium ion clock",
            NoiseModel(white_fm=2e-15),
            7.9e-19,
            "abstract of 2025; instability at 1 s from memory",
            "88Sr+",
        ),
        Preset(
            "fibre",
            "link",
            "phase-stabilised fibre",
            NoiseModel(white_pm=3e-15, flicker_fm=1e-19),
            1e-19,
            "Grosche et al. 2009, Opt. Lett. 34, 2270 (arXiv:0904.2679), 146 km",
        ),
        Preset(
            "free-space",
            "link",
            "two-way optical link through the air",
            NoiseModel(white_pm=1e-15, flicker_fm=3e-19),
            4.3e-19,
            "Giorgetta et al. 2013 (arXiv:1211.4902), 2 km; Shen et al. 2022 (arXiv:2203.11272), "
            "113 km",
        ),
        Preset(
            "satellite",
            "link",
            "satellite two-way link, carrier phase",
            NoiseModel(white_fm=1e-13, flicker_fm=1e-16),
            1e-16,
            "Fujieda et al. 2018 (arXiv:1710.03147): mid 1e-16 after 12 h, 1e-16 at several days",
        ),
    )
}
"""Name -> preset."""


def find_preset(name: str) -> Preset:
    """Return the preset of that name.

    Raises
    ------
    DataError
        If there is none; names all.
    """
    if name not in PRESETS:
        raise DataError(
            "there is no such preset", value=name, allowed=f"Presets {', '.join(PRESETS)}"
        )
    return PRESETS[name]


def preset_toml(preset: Preset) -> str:
    """Return a preset as a table for the campaign document.

    Parameters
    ----------
    preset : Preset

    Returns
    -------
    str
        A `[[clock]]` or `[[link]]` in TOML; the source stands in a comment.
    """
    levels = {name: level for name, level in preset.instability.model_dump().items() if level}
    shown = ", ".join(f"{name} = {level!r}" for name, level in levels.items())
    lines = [
        f"# {preset.text}; {preset.source}",
        f"[[{preset.kind}]]",
        f'id = "{preset.name}"',
        f'name = "{preset.text}"',
    ]
    if preset.transition is not None:
        lines.append(f'transition = "{preset.transition}"')
    lines.append(f"instability = {{ {shown} }}")
    if preset.kind == "link":
        effects = [("offset of the link", preset.u, "never")]
    else:
        half = float(f"{preset.u / 2**0.5:.2g}")
        effects = [("what changes with a stay", half, "stay"), ("what does not change", half, "")]
    for name, u, renewed in effects:
        lines += ["", f"[[{preset.kind}.effect]]", f'name = "{name}"', f"u = {u!r}"]
        if renewed not in ("", "never"):
            lines.append(f'renewed = "{renewed}"')
    return "\n".join(lines) + "\n"
