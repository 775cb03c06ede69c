"""The gravity wing: potentials, heights, tide systems, tides and geoid grids.

The names below are imported from their modules on first use, so that importing this package costs
next to nothing.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

from clockgeo.faces import lazy_face

if TYPE_CHECKING:
    from clockgeo.gravity.caution import CAUTION
    from clockgeo.gravity.geoid_covariance import ErrorModel, covariance_of_differences
    from clockgeo.gravity.geoid_model import GeoidModel
    from clockgeo.gravity.geoid_reading import missing_conventions, open_geoid, read_grid
    from clockgeo.gravity.geoid_writing import geoid_dataset, write_geoid
    from clockgeo.gravity.geopotential import (
        GeopotentialNumber,
        Height,
        HeightKind,
        height_of,
        heights_of,
        number_of,
    )
    from clockgeo.gravity.grid_content import GridContent
    from clockgeo.gravity.grid_tile import GridTile
    from clockgeo.gravity.heights import (
        dynamic_height,
        normal_height,
        number_of_dynamic_height,
        number_of_normal_height,
        number_of_orthometric_height,
        number_of_rigorous_height,
        orthometric_height,
        rigorous_orthometric_height,
    )
    from clockgeo.gravity.loading import (
        Constituent,
        LoadTable,
        doodson_argument,
        read_load_table,
        uplift_difference,
        write_load_table,
    )
    from clockgeo.gravity.normal_field import (
        normal_geopotential_number,
        normal_gravity,
        normal_potential,
        reference_ellipsoid,
    )
    from clockgeo.gravity.places import (
        Place,
    )
    from clockgeo.gravity.polar_motion import (
        PoleCoordinates,
        pole_tide,
        read_pole_coordinates,
    )
    from clockgeo.gravity.separation import (
        Separation,
        number_from_ellipsoidal_height,
        require_independent_geoid,
    )
    from clockgeo.gravity.site_transfer import (
        RockLayer,
        SiteTransfer,
        marker_to_atoms,
        normal_field_transfer,
        shaft_transfer,
    )
    from clockgeo.gravity.tide_curves import (
        TideSeries,
        tide_series,
        write_tide_series,
    )
    from clockgeo.gravity.tide_model import (
        SiteTide,
        TideInterpolator,
        TideMean,
    )
    from clockgeo.gravity.tide_systems import (
        TidalQuantity,
        TideSystem,
        convert_tide_system,
        mean_tide_height_evrf2019,
        permanent_tide_potential,
        require_same_tide_system,
        tide_system,
        tide_system_shift,
        zero_tide_height_evrf2019,
    )
    from clockgeo.gravity.tides import (
        LOVE_NUMBERS,
        LoveNumbers,
        SkyPositions,
        TidalPotential,
        permanent_tide_on_crust,
        sky_positions,
        tidal_potential,
        tidal_potential_from,
    )
    from clockgeo.gravity.zero_levels import (
        ZeroLevel,
        convert_zero_level,
        named_zero_levels,
        require_same_zero_level,
        zero_level,
        zero_level_shift,
    )

__all__ = [
    "CAUTION",
    "Constituent",
    "ErrorModel",
    "GeoidModel",
    "GeopotentialNumber",
    "GridContent",
    "GridTile",
    "Height",
    "HeightKind",
    "LOVE_NUMBERS",
    "LoadTable",
    "LoveNumbers",
    "Place",
    "PoleCoordinates",
    "RockLayer",
    "Separation",
    "SiteTide",
    "SiteTransfer",
    "SkyPositions",
    "TidalPotential",
    "TidalQuantity",
    "TideInterpolator",
    "TideMean",
    "TideSeries",
    "TideSystem",
    "ZeroLevel",
    "convert_tide_system",
    "convert_zero_level",
    "covariance_of_differences",
    "doodson_argument",
    "dynamic_height",
    "geoid_dataset",
    "height_of",
    "heights_of",
    "marker_to_atoms",
    "mean_tide_height_evrf2019",
    "missing_conventions",
    "named_zero_levels",
    "normal_field_transfer",
    "normal_geopotential_number",
    "normal_gravity",
    "normal_height",
    "normal_potential",
    "number_from_ellipsoidal_height",
    "number_of",
    "number_of_dynamic_height",
    "number_of_normal_height",
    "number_of_orthometric_height",
    "number_of_rigorous_height",
    "open_geoid",
    "orthometric_height",
    "permanent_tide_on_crust",
    "permanent_tide_potential",
    "pole_tide",
    "read_grid",
    "read_load_table",
    "read_pole_coordinates",
    "reference_ellipsoid",
    "require_independent_geoid",
    "require_same_tide_system",
    "require_same_zero_level",
    "rigorous_orthometric_height",
    "shaft_transfer",
    "sky_positions",
    "tidal_potential",
    "tidal_potential_from",
    "tide_series",
    "tide_system",
    "tide_system_shift",
    "uplift_difference",
    "write_geoid",
    "write_load_table",
    "write_tide_series",
    "zero_level",
    "zero_level_shift",
    "zero_tide_height_evrf2019",
]

_HOME = {
    "CAUTION": "caution",
    "ErrorModel": "geoid_covariance",
    "covariance_of_differences": "geoid_covariance",
    "GeoidModel": "geoid_model",
    "missing_conventions": "geoid_reading",
    "open_geoid": "geoid_reading",
    "read_grid": "geoid_reading",
    "geoid_dataset": "geoid_writing",
    "write_geoid": "geoid_writing",
    "GeopotentialNumber": "geopotential",
    "Height": "geopotential",
    "HeightKind": "geopotential",
    "height_of": "geopotential",
    "heights_of": "geopotential",
    "number_of": "geopotential",
    "GridContent": "grid_content",
    "GridTile": "grid_tile",
    "dynamic_height": "heights",
    "normal_height": "heights",
    "number_of_dynamic_height": "heights",
    "number_of_normal_height": "heights",
    "number_of_orthometric_height": "heights",
    "number_of_rigorous_height": "heights",
    "orthometric_height": "heights",
    "rigorous_orthometric_height": "heights",
    "Constituent": "loading",
    "LoadTable": "loading",
    "doodson_argument": "loading",
    "read_load_table": "loading",
    "uplift_difference": "loading",
    "write_load_table": "loading",
    "normal_geopotential_number": "normal_field",
    "normal_gravity": "normal_field",
    "normal_potential": "normal_field",
    "reference_ellipsoid": "normal_field",
    "Place": "places",
    "PoleCoordinates": "polar_motion",
    "pole_tide": "polar_motion",
    "read_pole_coordinates": "polar_motion",
    "Separation": "separation",
    "number_from_ellipsoidal_height": "separation",
    "require_independent_geoid": "separation",
    "RockLayer": "site_transfer",
    "SiteTransfer": "site_transfer",
    "marker_to_atoms": "site_transfer",
    "normal_field_transfer": "site_transfer",
    "shaft_transfer": "site_transfer",
    "TideSeries": "tide_curves",
    "tide_series": "tide_curves",
    "write_tide_series": "tide_curves",
    "SiteTide": "tide_model",
    "TideInterpolator": "tide_model",
    "TideMean": "tide_model",
    "TidalQuantity": "tide_systems",
    "TideSystem": "tide_systems",
    "convert_tide_system": "tide_systems",
    "mean_tide_height_evrf2019": "tide_systems",
    "permanent_tide_potential": "tide_systems",
    "require_same_tide_system": "tide_systems",
    "tide_system": "tide_systems",
    "tide_system_shift": "tide_systems",
    "zero_tide_height_evrf2019": "tide_systems",
    "LOVE_NUMBERS": "tides",
    "LoveNumbers": "tides",
    "SkyPositions": "tides",
    "TidalPotential": "tides",
    "permanent_tide_on_crust": "tides",
    "sky_positions": "tides",
    "tidal_potential": "tides",
    "tidal_potential_from": "tides",
    "ZeroLevel": "zero_levels",
    "convert_zero_level": "zero_levels",
    "named_zero_levels": "zero_levels",
    "require_same_zero_level": "zero_levels",
    "zero_level": "zero_levels",
    "zero_level_shift": "zero_levels",
}
"""Public name -> module of this package that defines it."""

__getattr__, __dir__ = lazy_face(__name__, _HOME)
