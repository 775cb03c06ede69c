"""From optical clock comparisons to geopotential differences, heights and datums.

The whole job is at hand under this name: documents and records are read, records screened and
assessed, campaigns planned, simulated, levelled and adjusted, results drawn. Names are imported
when first used.

    import clockgeo

    document = clockgeo.read_document("campaign.toml")
    levelled = clockgeo.level(document)
    print(levelled.result.differences)
"""

from __future__ import annotations

from typing import TYPE_CHECKING

from clockgeo.faces import lazy_face
from clockgeo.version import __version__

if TYPE_CHECKING:
    from clockgeo.campaign import (
        adjust,
        adjusted_dataset,
        check_campaign,
        level,
        read_document,
        read_result,
        result_dataset,
        write_result,
    )
    from clockgeo.frequency import (
        NoiseModel,
        RecordLayout,
        assess_stability,
        read_record,
        screen,
        stability_curve,
    )
    from clockgeo.gravity import heights_of, open_geoid, tide_series
    from clockgeo.planning import plan, read_plan, simulate_records, write_plan
    from clockgeo.report import (
        adjust_page,
        level_page,
        record_picture,
        save_picture,
        stability_picture,
        write_page,
    )

_HOMES = {
    # campaigns
    "read_document": "campaign",
    "check_campaign": "campaign",
    "level": "campaign",
    "adjust": "campaign",
    "plan": "planning",
    "simulate_records": "planning",
    # results
    "read_result": "campaign",
    "read_plan": "planning",
    "write_plan": "planning",
    "write_result": "campaign",
    "result_dataset": "campaign",
    "adjusted_dataset": "campaign",
    # records
    "RecordLayout": "frequency",
    "NoiseModel": "frequency",
    "read_record": "frequency",
    "screen": "frequency",
    "assess_stability": "frequency",
    "stability_curve": "frequency",
    # places
    "heights_of": "gravity",
    "open_geoid": "gravity",
    "tide_series": "gravity",
    # pictures and pages
    "record_picture": "report",
    "stability_picture": "report",
    "save_picture": "report",
    "level_page": "report",
    "adjust_page": "report",
    "write_page": "report",
}
"""Public name -> package that holds it."""

__all__ = [
    "__version__",
    "read_document",
    "check_campaign",
    "level",
    "adjust",
    "plan",
    "simulate_records",
    "read_result",
    "read_plan",
    "write_plan",
    "write_result",
    "result_dataset",
    "adjusted_dataset",
    "RecordLayout",
    "NoiseModel",
    "read_record",
    "screen",
    "assess_stability",
    "stability_curve",
    "heights_of",
    "open_geoid",
    "tide_series",
    "record_picture",
    "stability_picture",
    "save_picture",
    "level_page",
    "adjust_page",
    "write_page",
]

__getattr__, __dir__ = lazy_face(__name__, _HOMES)
