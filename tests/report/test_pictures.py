"""Pictures: units on every axis, uncertainty visible, nothing lost, nothing crooked."""

from __future__ import annotations

import io
from types import SimpleNamespace

import numpy as np
import pytest

from clockgeo.frequency import NoiseModel
from clockgeo.report import (
    Background,
    DatumOffset,
    MapSite,
    PlanePoint,
    TimelineSession,
    alternatives_picture,
    budget_picture,
    comparison_picture,
    correlation_picture,
    datum_picture,
    observation_picture,
    plane_picture,
    reach_picture,
    record_picture,
    residual_picture,
    site_map,
    stability_picture,
    tide_picture,
    timeline_picture,
)
from clockgeo.report.pictures.stability import in_words
from clockgeo.report.style import drawing
from clockgeo.times import tai_from_iso
from invented_result import invented_record

SITES = [MapSite("Harbel", 47.2, 11.1, "C", reference=True), MapSite("Kesselin", 46.85, 11.95)]


def texts(figure) -> list[str]:
    """Every text that is drawn."""
    from matplotlib.text import Text

    with drawing():
        figure.savefig(io.BytesIO(), format="png")  # ticks get their labels when drawn
    return [t.get_text() for t in figure.findobj(Text) if t.get_visible() and t.get_text()]


def outside(figure) -> list[str]:
    """Texts that reach beyond the paper."""
    from matplotlib.axis import Axis
    from matplotlib.backends.backend_agg import FigureCanvasAgg
    from matplotlib.text import Text

    with drawing():
        canvas = FigureCanvasAgg(figure)
        canvas.draw()
        renderer = canvas.get_renderer()
        wide, high = figure.get_size_inches() * figure.dpi
        found = []
        unseen = {text for axis in figure.findobj(Axis) for text in cut(axis)}
        unseen |= {text for text in figure.findobj(Text) if text.get_clip_on()}
        for text in figure.findobj(Text):
            if text.get_visible() and text.get_text().strip() and text not in unseen:
                box = text.get_window_extent(renderer)
                if box.x0 < -2 or box.y0 < -2 or box.x1 > wide + 2 or box.y1 > high + 2:
                    found.append(text.get_text())
    return found


def cut(axis):
    """Labels of ticks that lie outside the view and are not drawn."""
    low, high = sorted(axis.get_view_interval())
    ticks = [*axis.get_major_ticks(), *axis.get_minor_ticks()]
    return [t.label1 for t in ticks if not low <= t.get_loc() <= high]


def curve(statistic="overlapping-allan", points=12):
    tau = 3.7 * 2.0 ** np.arange(points)
    deviation = 9.3e-16 / np.sqrt(tau)
    return SimpleNamespace(
        statistic=statistic,
        tau=tau,
        deviation=deviation,
        lower=deviation * 0.8,
        upper=np.append(deviation[:-1] * 1.3, np.inf),
    )


def timeline(count=6):
    first = tai_from_iso("2027-05-03T07:00:00Z")
    day = 86_400 * 10**9
    return [
        TimelineSession(
            f"session {n}",
            first + n * day,
            first + n * day + day // 3,
            ("wanderer", "anchor"),
            ("kesselin" if 1 < n < count - 2 else "harbel", "harbel"),
            0.7,
        )
        for n in range(count)
    ]


@pytest.fixture(scope="module")
def drawn(result):
    """All pictures, each once."""
    record = invented_record()
    size = np.array([[1.0, 0.6, -0.3], [0.6, 2.0, 0.2], [-0.3, 0.2, 1.5]])
    return {
        "record": record_picture(
            record.tai_ns, record.y, record.reasons, interval=record.interval, u_mean=5e-18
        ),
        "stability": stability_picture(
            [curve(), curve("modified-allan")], model=NoiseModel(white_fm=9e-16, flicker_fm=2e-18)
        ),
        "budget": budget_picture(result.effects),
        "map": site_map(SITES, [("Harbel", "Harbel"), ("Harbel", "Kesselin")]),
        "timeline": timeline_picture(timeline()),
        "comparison": comparison_picture(result.comparison),
        "residuals": residual_picture(result.sessions),
        "correlations": correlation_picture(["harbel", "kesselin", "third"], size),
        **drawn_of_networks(),
        **drawn_of_plans(),
    }


def drawn_of_networks():
    rng = np.random.default_rng(2)
    observations = [
        SimpleNamespace(
            id=f"line {n}",
            kind="levelling" if n % 3 else "gnss",
            standardised=float(value),
            redundancy=float(n / 60.0),
        )
        for n, value in enumerate(rng.standard_normal(60))
    ]
    observations[17].standardised = 5.2
    observations[0].standardised = None
    latitude, longitude = np.linspace(44.0, 48.0, 20), np.linspace(7.0, 13.0, 25)
    plane = Background(latitude, longitude, np.add.outer(latitude, longitude), "plane / m")
    points = [
        PlanePoint(f"p{n}", 45.0 + n / 9, 8.0 + n % 4, 0.01 * (n - 4), 3e-3) for n in range(9)
    ]
    datums = [DatumOffset("north", 0.42, 0.02), DatumOffset("island", None, None)]
    return {
        "observations": observation_picture(observations, limit=3.29),
        "datums": datum_picture(datums),
        "plane": plane_picture(points, plane),
    }


def drawn_of_plans():
    days, distance = np.geomspace(0.1, 60.0, 80), np.geomspace(1.0, 2000.0, 60)
    parts = {"statistics": 40.0 / np.sqrt(days), "floor": np.full(80, 14.0), "tiny": days * 1e-3}
    whole = np.sqrt(parts["statistics"] ** 2 + parts["floor"] ** 2)
    tai = tai_from_iso("2027-03-01") + np.arange(400, dtype=np.int64) * 3600 * 10**9
    wave = 1.5 * np.cos(np.arange(400) / 2.0)
    return {
        "reach": reach_picture(days, whole, parts, target_mm=30.0, planned_days=4.0),
        "alternatives": alternatives_picture(
            distance,
            {"spirit levelling": np.sqrt(distance), "GNSS and geoid": np.full(60, 20.0)},
            pairs={"harbel to kesselin": (76.0, 24.0)},
        ),
        "tide": tide_picture(tai, wave, u=0.06, per_potential=-1.112650056e-17),
    }


UNITS = {
    "record": ["time (UTC)", "y − mean / 10⁻¹⁵"],
    "stability": ["averaging time τ / s", "deviation σ(τ) / 1"],
    "budget": ["standard uncertainty of the height difference / mm"],
    "map": ["11° E", "47° N", "20 km"],
    "timeline": ["time (UTC)"],
    "comparison": ["difference from the geodetic value / m² s⁻²"],
    "residuals": ["residual / 10⁻¹⁸"],
    "observations": ["redundancy number / 1", "standardised residual / 1", "line 17"],
    "datums": ["offset of the datum / m", "not determined by the data"],
    "plane": ["plane / m", "50 km", "20 mm"],
    "reach": ["time of measurement / d", "standard uncertainty of height / mm", "target"],
    "alternatives": ["distance / km", "standard uncertainty of height difference / mm"],
    "tide": ["tidal potential / m² s⁻²", "fractional frequency / 10⁻¹⁸", "± u"],
    "correlations": ["+0.42", "−0.24", "+0.12"],  # 0.6/√2, −0.3/√1.5, 0.2/√3
}


@pytest.mark.parametrize("name", UNITS)
def test_axes_have_units(drawn, name):
    shown = texts(drawn[name])
    assert set(UNITS[name]) <= set(shown), shown


@pytest.mark.parametrize("name", UNITS)
def test_no_text_leaves_the_paper(drawn, name):
    assert outside(drawn[name]) == []


def test_no_window_is_opened(drawn):
    import sys

    assert (
        "matplotlib.pyplot" not in sys.modules or not sys.modules["matplotlib.pyplot"].get_fignums()
    )


def test_parts_of_a_plan_that_limit_nothing_are_left_out(drawn):
    assert "floor" in texts(drawn["reach"])
    assert "tiny" not in texts(drawn["reach"])


def test_observations_that_nothing_controls_are_told_apart(drawn):
    assert "gnss, uncontrolled (1)" in texts(drawn["observations"])


def test_flagged_epochs_are_counted_and_drawn_even_beyond_the_picture(drawn):
    record = invented_record()
    shown = texts(drawn["record"])
    for flag, name in ((4, "outlier"), (8, "cycle slip"), (16, "masked")):
        there = (record.reasons & flag != 0) & np.isfinite(record.y)
        assert f"{name} ({np.count_nonzero(there)})" in shown
    axes = drawn["record"].axes[0]
    markers = next(line for line in axes.lines if line.get_label().startswith("outlier"))
    low, high = axes.get_ylim()
    assert all(low <= y <= high for y in markers.get_ydata())


def test_a_record_without_valid_epochs_is_drawn():
    record = invented_record(hours=0.5)
    flags = np.full(record.y.size, 4, dtype=np.uint8)
    shown = texts(record_picture(record.tai_ns, record.y, flags, interval=record.interval))
    assert any(text.startswith("outlier") for text in shown)


def test_one_epoch_is_drawn():
    record = invented_record()
    one = record_picture(record.tai_ns[:1], record.y[:1], np.zeros(1, np.uint8), interval=3.7)
    assert "time (UTC)" in texts(one)


def test_long_records_stay_light():
    from clockgeo.report.embedding import inline_svg

    record = invented_record(hours=24.0 * 30.0, interval=5.0)
    figure = record_picture(record.tai_ns, record.y, record.reasons, interval=5.0, u_mean=1e-18)
    assert len(inline_svg(figure, "p", "t")) < 120_000


def test_intervals_without_an_end_are_drawn_as_points():
    figure = stability_picture([curve(points=3)])
    assert "overlapping Allan" in texts(figure)


def test_statistics_in_words():
    assert in_words("total") == "total"
    assert in_words("overlapping-hadamard") == "overlapping Hadamard"
    assert in_words("white_pm") == "white PM"


def test_parts_of_the_budget_that_are_not_shown_are_named():
    lines = [
        SimpleNamespace(effect=f"effect {n}", kind="effect", y=1e-18 / n, height_mm=9.0 / n)
        for n in range(1, 31)
    ]
    shown = texts(budget_picture(lines))
    assert "16 smaller parts" in shown
    whole = 9.0 * sum(1.0 / n**2 for n in range(1, 31)) ** 0.5
    assert any(text.startswith(f"{whole:.0f} mm") for text in shown)


@pytest.mark.parametrize(
    ("places", "expected"),
    [
        ([(0.0, 179.9), (0.5, -179.9)], "180° W"),
        ([(-45.0, -70.0), (-46.0, -71.0)], "46° S"),
        ([(89.5, 0.0), (89.4, 90.0)], "90° N"),
        ([(52.0, 10.0), (52.0, 10.0)], "52° N"),
    ],
    ids=["antimeridian", "south and west", "near the pole", "one place"],
)
def test_maps_of_odd_places(places, expected):
    sites = [MapSite(f"s{n}", *place) for n, place in enumerate(places)]
    figure = site_map(sites, [("s0", "s1")])
    assert expected in texts(figure)
    assert "92° N" not in texts(figure)
    low, high = figure.axes[0].get_xlim()
    assert high - low < 360.0


def test_a_field_can_lie_under_the_map():
    latitude, longitude = np.linspace(46.0, 48.0, 9), np.linspace(10.0, 13.0, 11)
    field = Background(latitude, longitude, np.add.outer(latitude, longitude), "height anomaly / m")
    assert "height anomaly / m" in texts(site_map(SITES, background=field))


def test_many_sessions_keep_the_timeline_readable():
    assert "session 3" in texts(timeline_picture(timeline(16)))
    assert "session 3" not in texts(timeline_picture(timeline(40)))


def test_dollar_signs_in_names_are_no_formulas():
    site = MapSite("$x_1$ & <b>", 47.2, 11.1)
    assert "$x_1$ & <b>" in texts(site_map([site]))
