"""Before the survey: prediction, optimal use of days, simulation."""

from __future__ import annotations

from clockgeo.planning.simulation import SimulatedSession, simulate_records, simulate_sessions

__all__ = ["SimulatedSession", "simulate_records", "simulate_sessions"]
