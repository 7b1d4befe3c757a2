"""Maps of all sorts of CRS: eastings and northings in metres, grid north, and what is refused."""

from __future__ import annotations

import pickle

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from pyproj import CRS, Proj, Transformer
from pyproj.database import CRSInfo, query_crs_info
from pyproj.enums import PJType

from adjust.frames import EllipsoidFrame

PLACES = {
    "EPSG:25832": (8.2, 50.1),  # UTM
    "EPSG:2193": (175.3, -40.2),  # New Zealand, northing before easting
    "EPSG:28355": (147.9, -42.7),  # UTM south
    "EPSG:32760": (179.98, -17.0),  # beside the antimeridian
    "EPSG:2056": (7.9, 46.7),  # oblique Mercator
    "EPSG:2154": (2.1, 47.3),  # Lambert conic
    "EPSG:31257": (10.9, 47.2),  # Austria, on the Bessel ellipsoid
    "EPSG:3395": (30.0, 10.0),  # Mercator
    "EPSG:3035": (15.0, 60.0),  # equal-area: not conformal
    "EPSG:5514": (15.2, 49.9),  # Krovak, axes east and north
    "EPSG:32161": (-66.3, 18.2),  # Puerto Rico
    "EPSG:5041": (40.0, 86.0),  # UPS north, easting first
    "EPSG:32661": (-150.0, 88.0),  # UPS north, northing first
    "EPSG:5042": (120.0, -85.0),  # UPS south
    "EPSG:7405": (-1.5, 53.0),  # compound: national grid and heights
    "EPSG:9895": (6.1, 49.7),  # three-dimensional projected
}
FEET = {"EPSG:2263": 1200 / 3937, "EPSG:2222": 0.3048}
FEET_PLACES = {"EPSG:2263": (-73.9, 40.7), "EPSG:2222": (-110.1, 33.3)}
MICROMETRE = 1e-6


def mark(longitude: float, latitude: float) -> np.ndarray:
    return np.array([[np.radians(longitude), np.radians(latitude), 0.0]])


@pytest.mark.parametrize("crs", PLACES)
def test_metres_are_those_of_proj_in_x_y_order(crs: str) -> None:
    base = CRS(crs).geodetic_crs.to_2d()
    expected = Transformer.from_crs(base, CRS(crs).to_2d(), always_xy=True).transform(*PLACES[crs])
    grid = EllipsoidFrame(crs).grid_coordinates(mark(*PLACES[crs]))[0]
    np.testing.assert_allclose(grid, expected, rtol=0, atol=MICROMETRE)


@pytest.mark.parametrize("crs", FEET)
def test_feet_become_metres(crs: str) -> None:
    expected = Transformer.from_crs(CRS(crs).geodetic_crs, crs, always_xy=True).transform(*FEET_PLACES[crs])
    grid = EllipsoidFrame(crs).grid_coordinates(mark(*FEET_PLACES[crs]))[0]
    np.testing.assert_allclose(grid, np.array(expected) * FEET[crs], rtol=0, atol=MICROMETRE)


@pytest.mark.parametrize("crs", PLACES | FEET_PLACES)
def test_grid_and_back(crs: str) -> None:
    """EPSG:3035 and its like come back from PROJ's own inverse a millimetre off."""
    frame, place = EllipsoidFrame(crs), mark(*(PLACES | FEET_PLACES)[crs])
    back = np.column_stack([frame.from_grid(frame.grid_coordinates(place)), [0.0]])
    np.testing.assert_allclose(frame.displacement(place, back), 0.0, rtol=0, atol=2e-8)  # m


@pytest.mark.parametrize("crs", PLACES | FEET_PLACES)
def test_grid_rotation_is_the_azimuth_of_a_step_along_grid_north(crs: str) -> None:
    """A metre north on the grid, carried back to the ground, by a central difference over 20 m."""
    frame, place = EllipsoidFrame(crs), mark(*(PLACES | FEET_PLACES)[crs])
    grid = frame.grid_coordinates(place)
    ends = [np.column_stack([frame.from_grid(grid + np.array([0.0, step])), [0.0]]) for step in (-10.0, 10.0)]
    east, north, _ = (frame.displacement(place, ends[1]) - frame.displacement(place, ends[0]))[0]
    assert frame.grid_rotation(place)[0] == pytest.approx(
        np.arctan2(east, north), rel=0, abs=2e-9
    )  # rad: 20 nm in 20 m


@pytest.mark.parametrize("crs", ["EPSG:25832", "EPSG:28355", "EPSG:2154", "EPSG:32661", "EPSG:3395"])
def test_on_a_conformal_map_grid_rotation_is_the_meridian_convergence_of_proj(crs: str) -> None:
    factors = Proj(crs).get_factors(*PLACES[crs])
    rotation = EllipsoidFrame(crs).grid_rotation(mark(*PLACES[crs]))[0]
    assert rotation == pytest.approx(np.radians(factors.meridian_convergence), rel=0, abs=1e-9)  # rad: 0.0002″


@pytest.mark.parametrize("longitude", [-180.0, 180.0, 179.9999, -179.9999])
def test_at_the_edge_of_a_world_map_grid_north_is_north(longitude: float) -> None:
    """Mercator's map is cut along the antimeridian; its grid north is true north on both sides."""
    rotation = EllipsoidFrame("EPSG:3395").grid_rotation(mark(longitude, -17.0))
    np.testing.assert_allclose(rotation, 0.0, rtol=0, atol=1e-9)  # rad


def test_grid_north_lies_east_of_true_north_in_the_north_east_of_a_zone() -> None:
    frame = EllipsoidFrame("EPSG:25832")
    east, west = frame.grid_rotation(np.vstack([mark(11.0, 50.0), mark(7.0, 50.0)]))
    assert east > 0 > west
    assert east == pytest.approx(
        np.radians(2.0) * np.sin(np.radians(50.0)), rel=0, abs=3e-5
    )  # rad: first-order formula


@given(longitude=st.floats(6.0, 12.0), latitude=st.floats(-79.0, 84.0))
def test_zone_of_the_usual_map_goes_to_and_fro_everywhere(longitude: float, latitude: float) -> None:
    frame, place = EllipsoidFrame("EPSG:32632"), mark(longitude, latitude)
    back = np.column_stack([frame.from_grid(frame.grid_coordinates(place)), [0.0]])
    np.testing.assert_allclose(frame.displacement(place, back), 0.0, rtol=0, atol=2e-8)  # m


@pytest.mark.parametrize(
    ("crs", "place", "axes"),
    [
        ("EPSG:2048", (19.2, -33.0), ("Y", "X")),  # South Africa: westing first, then southing
        ("EPSG:5513", (15.2, 49.9), ("X", "Y")),  # Krovak: southing first, then westing
    ],
)
def test_westings_and_southings_become_eastings_and_northings(crs: str, place, axes) -> None:
    """The signs change and east comes first, as in EPSG:5514, which is EPSG:5513 written so."""
    assert tuple(axis.abbrev for axis in CRS(crs).axis_info) == axes
    own = Transformer.from_crs(CRS(crs).geodetic_crs, crs).transform(*reversed(place))
    westing_first = CRS(crs).axis_info[0].direction == "west"
    expected = -np.array(own if westing_first else own[::-1])
    frame = EllipsoidFrame(crs)
    grid = frame.grid_coordinates(mark(*place))
    np.testing.assert_allclose(grid[0], expected, rtol=0, atol=MICROMETRE)
    north = frame.grid_coordinates(mark(place[0], place[1] + 0.01))
    assert north[0, 1] > grid[0, 1]
    np.testing.assert_allclose(np.degrees(frame.from_grid(grid)[0]), place, rtol=0, atol=1e-12)  # °


def test_longitudes_are_from_greenwich_whatever_the_prime_meridian() -> None:
    """NTF (Paris) / Lambert north: the meridian of Paris, 2.5969213 gon east (EPSG), has the false easting."""
    frame = EllipsoidFrame("EPSG:27561")
    grid = frame.grid_coordinates(mark(2.5969213 * 0.9, 49.5))
    assert grid[0, 0] == pytest.approx(600_000.0, rel=0, abs=1e-5)  # m


def test_geographic_and_geocentric_crs_have_no_grid() -> None:
    place = mark(10.0, 50.0)
    for crs in ("EPSG:4326", "EPSG:4979", "EPSG:4978", "EPSG:4258"):
        frame = EllipsoidFrame(crs)
        assert frame.is_geographic
        assert np.isnan(frame.grid_coordinates(place)).all()
        assert np.isnan(frame.from_grid(np.zeros((1, 2)))).all()
        np.testing.assert_array_equal(frame.grid_rotation(place), [0.0])
        np.testing.assert_array_equal(frame.geographic(place), place[:, :2])
    assert not EllipsoidFrame("EPSG:25832").is_geographic


def test_where_the_map_ends_there_is_no_grid_and_other_marks_keep_theirs() -> None:
    frame = EllipsoidFrame("EPSG:25832")  # central meridian 9°: the equator a quarter round lies at infinity
    grid = frame.grid_coordinates(np.vstack([mark(99.0, 0.0), mark(10.0, 50.0)]))
    np.testing.assert_array_equal(np.isnan(grid[:, 0]), [True, False])


def test_well_known_text_and_proj_strings_do_too() -> None:
    place, code = mark(8.2, 50.1), EllipsoidFrame("EPSG:25832")
    for crs in (CRS("EPSG:25832").to_wkt(), "+proj=utm +zone=32 +ellps=GRS80 +type=crs"):
        frame = EllipsoidFrame(crs)
        np.testing.assert_allclose(frame.grid_coordinates(place), code.grid_coordinates(place), rtol=0, atol=MICROMETRE)


@pytest.mark.parametrize(
    ("crs", "message"),
    [
        ("EPSG:99999999", "no coordinate reference system that PROJ knows"),
        ("", "no coordinate reference system that PROJ knows"),
        ("UTM zone 32", "no coordinate reference system that PROJ knows"),
        ("EPSG:5773", "of type Vertical CRS"),
        ('LOCAL_CS["site",UNIT["metre",1]]', "of type Engineering CRS"),
        ("+proj=ob_tran +o_proj=longlat +o_lon_p=-162 +o_lat_p=39.25 +ellps=GRS80 +type=crs", "of type Derived"),
        ("EPSG:3053", "cannot compute its map projection"),
    ],
)
def test_an_unusable_crs_is_refused_in_words(crs: str, message: str) -> None:
    with pytest.raises(ValueError, match=message):
        EllipsoidFrame(crs)


def area_centre(info: CRSInfo) -> np.ndarray:
    """A place inside the area of use, off its middle."""
    west, south, east, north = info.area_of_use.bounds
    width = (east - west) % 360.0
    return mark((west + 0.6 * width + 180.0) % 360.0 - 180.0, np.clip(south + 0.63 * (north - south), -88.0, 88.0))


def test_every_fortieth_projected_crs_of_epsg() -> None:
    """Grid and back inside the area of use; the few CRS whose map PROJ lacks are refused in words."""
    registry = query_crs_info(auth_name="EPSG", pj_types=[PJType.PROJECTED_CRS])[::40]
    refusals = []
    for info in registry:
        try:
            frame = EllipsoidFrame(f"EPSG:{info.code}")
        except ValueError as error:
            refusals.append(str(error))
            continue
        place = area_centre(info)
        back = np.column_stack([frame.from_grid(frame.grid_coordinates(place)), [0.0]])
        displacement = frame.displacement(place, back)
        np.testing.assert_allclose(displacement, 0, rtol=0, atol=2e-8, err_msg=info.name)  # m
    assert all("cannot compute its map projection" in refusal for refusal in refusals)
    assert len(refusals) < 0.02 * len(registry)


def test_frames_of_one_crs_are_equal_and_can_be_sent_to_another_process() -> None:
    frame = EllipsoidFrame("EPSG:25832")
    sent = pickle.loads(pickle.dumps(frame))
    assert sent == frame == EllipsoidFrame("EPSG:25832") != EllipsoidFrame("EPSG:25833")
    np.testing.assert_array_equal(sent.grid_coordinates(mark(8.2, 50.1)), frame.grid_coordinates(mark(8.2, 50.1)))
