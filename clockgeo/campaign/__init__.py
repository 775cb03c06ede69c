"""The campaign document, from reading and checking to results.

Names are imported when first used, so that a command pays only for what it needs.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

from clockgeo.faces import lazy_face

if TYPE_CHECKING:
    from clockgeo.campaign.adjust_output import adjust_files, adjusted_dataset, write_adjusted
    from clockgeo.campaign.adjust_results import AdjustResult
    from clockgeo.campaign.adjuster import Adjusted, adjust
    from clockgeo.campaign.checking import CheckReport, check_campaign
    from clockgeo.campaign.document import Document, campaign_schema, read_document
    from clockgeo.campaign.evidence import Evidence
    from clockgeo.campaign.leveller import Levelled, level, level_measured
    from clockgeo.campaign.measuring import Measured, measure, measure_record
    from clockgeo.campaign.output import (
        LEVEL_FILES,
        prepare_folder,
        read_result,
        result_dataset,
        write_result,
    )
    from clockgeo.campaign.results import LevelResult
    from clockgeo.campaign.schema import Campaign

_HOMES = {
    "AdjustResult": "adjust_results",
    "Adjusted": "adjuster",
    "adjust": "adjuster",
    "adjust_files": "adjust_output",
    "adjusted_dataset": "adjust_output",
    "write_adjusted": "adjust_output",
    "Campaign": "schema",
    "CheckReport": "checking",
    "Document": "document",
    "Evidence": "evidence",
    "LevelResult": "results",
    "Levelled": "leveller",
    "Measured": "measuring",
    "campaign_schema": "document",
    "check_campaign": "checking",
    "level": "leveller",
    "level_measured": "leveller",
    "measure": "measuring",
    "measure_record": "measuring",
    "LEVEL_FILES": "output",
    "prepare_folder": "output",
    "read_document": "document",
    "read_result": "output",
    "result_dataset": "output",
    "write_result": "output",
}
"""Public name -> module of this package that defines it."""

__all__ = [
    "LEVEL_FILES",
    "AdjustResult",
    "Adjusted",
    "adjust",
    "adjust_files",
    "adjusted_dataset",
    "write_adjusted",
    "Campaign",
    "CheckReport",
    "Document",
    "Evidence",
    "LevelResult",
    "Levelled",
    "Measured",
    "campaign_schema",
    "check_campaign",
    "level",
    "level_measured",
    "measure",
    "measure_record",
    "prepare_folder",
    "read_document",
    "read_result",
    "result_dataset",
    "write_result",
]

__getattr__, __dir__ = lazy_face(__name__, _HOMES)
