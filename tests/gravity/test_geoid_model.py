"""The model: scalars and arrays, u, rates, hybrid models, the estimated interpolation error."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from clockgeo.errors import ConventionError, DataError
from clockgeo.gravity import (
    ErrorModel,
    GeoidModel,
    GridTile,
    TideSystem,
    require_independent_geoid,
    zero_level,
)

PHI, LAM = np.meshgrid(46.0 + 0.1 * np.arange(21), 10.0 + 0.1 * np.arange(31), indexing="ij")


def plane(phi, lam):
    return 40.0 + 2.0 * (phi - 46.0) - 0.5 * (lam - 10.0)


def model(values=None, u=None, rate=None, **options):
    tile = GridTile(46.0, 10.0, 0.1, 0.1, plane(PHI, LAM) if values is None else values, u, rate)
    given = {
        "name": "invented.nc",
        "tiles": (tile,),
        "quantity": "height_anomaly",
        "tide_system": TideSystem.ZERO_TIDE,
        "zero_level": zero_level("height_reference"),
        "ellipsoid": "grs80",
    }
    return GeoidModel(**(given | options))


@pytest.mark.parametrize(
    "shape",
    [(), (1,), (7,), (3, 4), (0,)],
    ids=str,
)
def test_the_shape_that_goes_in_comes_out(shape, rng):
    latitude, longitude = rng.uniform(46.0, 48.0, shape), rng.uniform(10.0, 13.0, shape)
    values = model().sample(latitude, longitude)
    assert np.shape(values) == shape
    assert isinstance(values, float) == (shape == ())
    assert np.allclose(values, plane(latitude, longitude), atol=1e-12)


def test_coordinates_are_broadcast_together():
    values = model().sample([[46.0], [47.0]], [10.0, 11.0, 12.0])
    assert values.shape == (2, 3)
    assert values[1, 2] == pytest.approx(plane(47.0, 12.0))
    assert model(errors=ErrorModel(0.02)).u([[46.0], [47.0]], [10.0, 11.0, 12.0]).shape == (2, 3)


def test_a_million_points_are_as_one(rng):
    """Blocks leave no seam."""
    latitude, longitude = rng.uniform(46.0, 48.0, 40_000), rng.uniform(10.0, 13.0, 40_000)
    whole = model(rng.normal(size=PHI.shape))
    values = whole.sample(latitude, longitude, interpolation="bicubic")
    picked = rng.integers(0, 40_000, 50)
    alone = [whole.sample(latitude[i], longitude[i], interpolation="bicubic") for i in picked]
    assert np.array_equal(values[picked], alone)


@pytest.mark.parametrize(
    ("place", "message"),
    [
        ((95.0, 11.0), "latitude out of range: 95.*swapped"),
        ((47.0, 400.0), "longitude out of range: 400"),
        ((np.nan, 11.0), "latitude out of range: nan"),
        ((11.0, 47.0), r"lies outside the grid.*latitude 11\.0.*invented\.nc.*Latitudes 46\.\.48"),
    ],
)
def test_places_that_are_none(place, message):
    with pytest.raises(DataError, match=message):
        model().sample(*place)


def test_outside_may_be_nan_but_only_in_that_word():
    assert np.isnan(model().sample(11.0, 47.0, outside="nan"))
    with pytest.raises(ConventionError, match=r"outside the grid: 'skip'. One of error, nan"):
        model().sample(47.0, 11.0, outside="skip")
    with pytest.raises(ConventionError, match="unknown interpolation: 'spline'"):
        model().sample(47.0, 11.0, interpolation="spline")


def test_u_as_a_number_as_a_field_or_missing():
    assert model(errors=ErrorModel(0.02)).u(47.0, 11.0) == 0.02
    field = 0.01 * (PHI - 45.0)
    assert model(u=field).u(47.05, 11.0) == pytest.approx(0.0205)
    with pytest.raises(ConventionError, match=r"states no uncertainty \(field u\).*invented\.nc"):
        model().u(47.0, 11.0)


def test_covariance_takes_the_u_of_each_place():
    field = 0.01 * (PHI - 45.0)
    whole = model(u=field, errors=ErrorModel(0.02, 60_000.0))
    places = [46.0, 48.0, 46.0], [11.0, 11.0, 11.0]
    found = whole.covariance(*places)
    assert np.allclose(np.sqrt(np.diag(found)), [0.01, 0.03, 0.01])
    rho = ErrorModel(1.0, 60_000.0).correlation(*places)
    assert np.allclose(found, np.outer([0.01, 0.03, 0.01], [0.01, 0.03, 0.01]) * rho)
    assert whole.difference_covariance(*places, [(0, 2)])[0, 0] == pytest.approx(0.0, abs=1e-18)
    with pytest.raises(ConventionError, match=r"correlation length .*invented\.nc.*State corr"):
        model(errors=ErrorModel(0.02)).covariance([46.0, 47.0], [11.0, 11.0])


def test_a_rate_brings_the_values_to_an_epoch():
    moving = model(rate=np.full(PHI.shape, 0.002), epoch=2020.0)
    still = moving.sample(47.0, 11.0)
    assert moving.sample(47.0, 11.0, epoch=2027.5) == pytest.approx(still + 0.015)
    assert moving.sample(47.0, 11.0, epoch=2020.0) == still
    for without in (model(epoch=2020.0), replace(moving, epoch=None)):
        with pytest.raises(
            ConventionError, match=r"holds for no other epoch \(fields epoch and rate"
        ):
            without.sample(47.0, 11.0, epoch=2025.0)


def test_a_hybrid_model_is_no_check_of_its_levelling():
    hybrid = model(hybrid=True, fitted_to="old harbour")
    assert hybrid.conventions["model_type"] == "hybrid"
    with pytest.raises(ConventionError, match=r"invented\.nc was fitted to Old Harbour"):
        require_independent_geoid(
            geoid=hybrid.name, fitted_to=hybrid.fitted_to, levelling="Old Harbour"
        )


@pytest.mark.parametrize("method", ["bilinear", "biquadratic", "bicubic"])
def test_the_estimated_interpolation_error_is_of_the_true_size(method, rng):
    """Root mean square of estimate and truth of a smooth field, within a factor of 2.5."""

    def wave(phi, lam):
        return 5.0 * np.sin(6.0 * (phi - 46.0)) * np.cos(5.0 * (lam - 10.0))

    smooth = model(wave(PHI, LAM), interpolation=method)
    latitude, longitude = rng.uniform(46.3, 47.7, 3000), rng.uniform(10.3, 12.7, 3000)
    true = smooth.sample(latitude, longitude) - wave(latitude, longitude)
    estimate = smooth.interpolation_error(latitude, longitude)
    ratio = np.sqrt(np.mean(estimate**2) / np.mean(true**2))
    assert 0.4 < ratio < 2.5
    assert isinstance(smooth.interpolation_error(47.0, 11.0), float)


def test_where_a_model_reaches():
    assert model().extent == "Latitudes 46..48, longitudes 10..13"
    around = GridTile(-90.0, 0.0, 10.0, 10.0, np.zeros((19, 36)))
    assert model(tiles=(around,)).extent == "Latitudes -90..90, all longitudes"
