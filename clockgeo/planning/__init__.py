"""Before the survey: prediction, optimal use of days, simulation.

Names are imported when first used, so that a command pays only for what it needs.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

from clockgeo.faces import lazy_face

if TYPE_CHECKING:
    from clockgeo.planning.confirmation import confirm
    from clockgeo.planning.output import PLAN_FILES, read_plan, write_plan
    from clockgeo.planning.planner import Planned, plan
    from clockgeo.planning.prediction import goals_of, plan_model
    from clockgeo.planning.requirement import averaging_time
    from clockgeo.planning.results import PlanResult
    from clockgeo.planning.simulation import SimulatedSession, simulate_records, simulate_sessions

_HOMES = {
    "PLAN_FILES": "output",
    "PlanResult": "results",
    "Planned": "planner",
    "SimulatedSession": "simulation",
    "averaging_time": "requirement",
    "confirm": "confirmation",
    "goals_of": "prediction",
    "plan": "planner",
    "plan_model": "prediction",
    "read_plan": "output",
    "simulate_records": "simulation",
    "simulate_sessions": "simulation",
    "write_plan": "output",
}
"""Public name -> module of this package that holds it."""

__all__ = [
    "PLAN_FILES",
    "PlanResult",
    "Planned",
    "SimulatedSession",
    "averaging_time",
    "confirm",
    "goals_of",
    "plan",
    "plan_model",
    "read_plan",
    "simulate_records",
    "simulate_sessions",
    "write_plan",
]

__getattr__, __dir__ = lazy_face(__name__, _HOMES)
