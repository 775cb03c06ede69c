"""Results as pictures, tables and one page; computes nothing.

Names are imported when first used, so that a command pays only for what it needs.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

from clockgeo.faces import lazy_face

if TYPE_CHECKING:
    from clockgeo.report.adjustment_page import adjust_page, write_adjust_page
    from clockgeo.report.embedding import checked_picture, save_picture
    from clockgeo.report.levelling_page import level_page, write_level_page
    from clockgeo.report.page import prepare_figures, write_figures, write_page
    from clockgeo.report.pictures.adjustment import (
        DatumOffset,
        PlanePoint,
        datum_picture,
        observation_picture,
        plane_picture,
    )
    from clockgeo.report.pictures.budget import budget_picture
    from clockgeo.report.pictures.comparison import (
        comparison_picture,
        correlation_picture,
        residual_picture,
    )
    from clockgeo.report.pictures.net import NetPoint, net_picture
    from clockgeo.report.pictures.places import Background, MapSite, map_extent, site_map
    from clockgeo.report.pictures.planning import alternatives_picture, reach_picture
    from clockgeo.report.pictures.record import record_picture
    from clockgeo.report.pictures.stability import stability_picture
    from clockgeo.report.pictures.tide import tide_picture
    from clockgeo.report.pictures.timeline import TimelineSession, timeline_picture
    from clockgeo.report.planning_page import plan_page, write_plan_page

PAGE = "report.html"
"""File name of the page in a folder of results."""

_HOMES = {
    "Background": "pictures.places",
    "DatumOffset": "pictures.adjustment",
    "MapSite": "pictures.places",
    "NetPoint": "pictures.net",
    "PlanePoint": "pictures.adjustment",
    "TimelineSession": "pictures.timeline",
    "adjust_page": "adjustment_page",
    "alternatives_picture": "pictures.planning",
    "budget_picture": "pictures.budget",
    "checked_picture": "embedding",
    "comparison_picture": "pictures.comparison",
    "correlation_picture": "pictures.comparison",
    "datum_picture": "pictures.adjustment",
    "level_page": "levelling_page",
    "map_extent": "pictures.places",
    "net_picture": "pictures.net",
    "observation_picture": "pictures.adjustment",
    "plan_page": "planning_page",
    "plane_picture": "pictures.adjustment",
    "prepare_figures": "page",
    "reach_picture": "pictures.planning",
    "record_picture": "pictures.record",
    "residual_picture": "pictures.comparison",
    "save_picture": "embedding",
    "site_map": "pictures.places",
    "stability_picture": "pictures.stability",
    "tide_picture": "pictures.tide",
    "timeline_picture": "pictures.timeline",
    "write_adjust_page": "adjustment_page",
    "write_figures": "page",
    "write_level_page": "levelling_page",
    "write_page": "page",
    "write_plan_page": "planning_page",
}
"""Public name -> module of this package that holds it."""

__all__ = [
    "Background",
    "DatumOffset",
    "MapSite",
    "NetPoint",
    "PAGE",
    "PlanePoint",
    "TimelineSession",
    "adjust_page",
    "alternatives_picture",
    "budget_picture",
    "checked_picture",
    "comparison_picture",
    "correlation_picture",
    "datum_picture",
    "level_page",
    "map_extent",
    "net_picture",
    "observation_picture",
    "plan_page",
    "plane_picture",
    "prepare_figures",
    "reach_picture",
    "record_picture",
    "residual_picture",
    "save_picture",
    "site_map",
    "stability_picture",
    "tide_picture",
    "timeline_picture",
    "write_adjust_page",
    "write_figures",
    "write_level_page",
    "write_page",
    "write_plan_page",
]

__getattr__, __dir__ = lazy_face(__name__, _HOMES)
