"""The frequency wing: records, screening, stability, noise and the uncertainty of a mean.

Names are imported when first used, so that a command pays only for what it needs.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

from clockgeo.faces import lazy_face

if TYPE_CHECKING:
    from clockgeo.frequency.dead_time import dead_time_variance, uptime_windows
    from clockgeo.frequency.deviations import StabilityCurve, stability_curve
    from clockgeo.frequency.diagnosis import Finding, diagnose
    from clockgeo.frequency.generator import draw_noise
    from clockgeo.frequency.layout import RecordLayout
    from clockgeo.frequency.mean import TickSeries, mean_covariance
    from clockgeo.frequency.noise import NoiseModel
    from clockgeo.frequency.noise_fit import NoiseFit, fit_noise
    from clockgeo.frequency.phase_deviations import phase_stability_curve
    from clockgeo.frequency.power_law_fit import PowerLawFit, fit_power_laws
    from clockgeo.frequency.ratio import exact_number, fractional_frequency, ratio_text
    from clockgeo.frequency.reading import read_record
    from clockgeo.frequency.record import Record, Source
    from clockgeo.frequency.sampling import Sampling, estimate_interval, sample_ticks
    from clockgeo.frequency.scatter import ExcessScatter, excess_scatter
    from clockgeo.frequency.screening import Mask, Reason, Screening, ScreeningRules, screen
    from clockgeo.frequency.stability import RecordStability, assess_stability
    from clockgeo.frequency.transitions import RECOMMENDED_FREQUENCIES, Transition, find_transition
    from clockgeo.frequency.writing import write_record

_HOMES = {
    # noise
    "ExcessScatter": "scatter",
    "excess_scatter": "scatter",
    "RecordStability": "stability",
    "dead_time_variance": "dead_time",
    "uptime_windows": "dead_time",
    "StabilityCurve": "deviations",
    "stability_curve": "deviations",
    "phase_stability_curve": "phase_deviations",
    "assess_stability": "stability",
    "NoiseFit": "noise_fit",
    "NoiseModel": "noise",
    "TickSeries": "mean",
    "draw_noise": "generator",
    "fit_noise": "noise_fit",
    "PowerLawFit": "power_law_fit",
    "fit_power_laws": "power_law_fit",
    "mean_covariance": "mean",
    # records
    "Finding": "diagnosis",
    "Mask": "screening",
    "RECOMMENDED_FREQUENCIES": "transitions",
    "Reason": "screening",
    "Record": "record",
    "RecordLayout": "layout",
    "Sampling": "sampling",
    "Screening": "screening",
    "ScreeningRules": "screening",
    "Source": "record",
    "Transition": "transitions",
    "diagnose": "diagnosis",
    "estimate_interval": "sampling",
    "exact_number": "ratio",
    "find_transition": "transitions",
    "fractional_frequency": "ratio",
    "ratio_text": "ratio",
    "read_record": "reading",
    "sample_ticks": "sampling",
    "screen": "screening",
    "write_record": "writing",
}
"""Public name -> module of this package that holds it. No name may equal a module's."""

__all__ = [
    "ExcessScatter",
    "excess_scatter",
    "RecordStability",
    "StabilityCurve",
    "dead_time_variance",
    "uptime_windows",
    "stability_curve",
    "phase_stability_curve",
    "assess_stability",
    "NoiseFit",
    "NoiseModel",
    "PowerLawFit",
    "TickSeries",
    "draw_noise",
    "fit_noise",
    "fit_power_laws",
    "mean_covariance",
    "Finding",
    "Mask",
    "RECOMMENDED_FREQUENCIES",
    "Reason",
    "Record",
    "RecordLayout",
    "Sampling",
    "Screening",
    "ScreeningRules",
    "Source",
    "Transition",
    "diagnose",
    "estimate_interval",
    "exact_number",
    "find_transition",
    "fractional_frequency",
    "ratio_text",
    "read_record",
    "sample_ticks",
    "screen",
    "write_record",
]

__getattr__, __dir__ = lazy_face(__name__, _HOMES)
