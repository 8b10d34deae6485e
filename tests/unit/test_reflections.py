"""Reflections over made profiles: the level on a sphere, nulls in their place, shading, rough ground, both directions."""

import math
from collections.abc import Callable

import numpy as np
import pytest
from made_profiles import link_of, mirrored, profile_of

from fellspan.antennas.dishes import dish
from fellspan.design.reflection_heights import spare_height_m
from fellspan.design.reflection_result import ReflectionResult
from fellspan.design.reflections import Water, find_reflections
from fellspan.links.assess import AssessSettings, assess_profile
from fellspan.links.criteria import worst_month_k
from fellspan.links.site import Antenna, Link
from fellspan.propagation import ground_permittivity, reflection_coefficient, specular_geometry
from fellspan.terrain.profile import PathProfile

SEA = Water(level_m=0.0)
RADIUS_M, LIGHT_M_S = 6_371_000.0, 299_792_458.0


def over(
    profile: PathProfile,
    a_m: float = 40.0,
    b_m: float = 25.0,
    *,
    water: Water = SEA,
    frequency_hz: float = 6e9,
    link: Link | None = None,
    median_k: float = 4.0 / 3.0,
) -> ReflectionResult:
    link = link or link_of(profile, a_m, b_m, frequency_hz=frequency_hz)
    done = assess_profile(link, profile, AssessSettings(median_k=median_k))
    return find_reflections(link, result=done.result, profile=done.profile, levels=done.levels, water=water)


def closed_form_db(
    length_m: float, a_m: float, b_m: float, *, k: float, frequency_hz: float, polarization: str = "vertical"
) -> float:
    """Two rays over a sphere by another way: the shortest path over the surface sought on the circle, cartesian."""
    radius = k * RADIUS_M
    total = length_m / radius

    def place(turn: np.ndarray, height: float) -> tuple[np.ndarray, np.ndarray]:
        # From the top of the circle, so that levels keep their digits.
        return (radius + height) * np.sin(turn), height * np.cos(turn) - 2.0 * radius * np.sin(0.5 * turn) ** 2

    a = place(np.array(-0.5 * total), a_m)
    b = place(np.array(0.5 * total), b_m)

    def legs(turn: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        p = place(turn, 0.0)
        return np.hypot(p[0] - a[0], p[1] - a[1]), np.hypot(p[0] - b[0], p[1] - b[1])

    low, high = -0.5 * total, 0.5 * total
    for _ in range(60):  # golden section would do; thirds are plainer
        one, two = low + (high - low) / 3.0, high - (high - low) / 3.0
        if sum(legs(np.array(one))) < sum(legs(np.array(two))):
            high = two
        else:
            low = one
    turn = 0.5 * (low + high)
    p = place(np.array(turn), 0.0)
    normal = (math.sin(turn), math.cos(turn))

    def grazing(end: tuple[np.ndarray, np.ndarray]) -> float:
        way = (float(end[0] - p[0]), float(end[1] - p[1]))
        return math.asin((way[0] * normal[0] + way[1] * normal[1]) / math.hypot(*way))

    phi = 0.5 * (grazing(a) + grazing(b))
    leg_a, leg_b = (float(leg) for leg in legs(np.array(turn)))
    direct = math.hypot(float(a[0] - b[0]), float(a[1] - b[1]))
    # Textbook divergence factor: 1/sqrt(1 + 2 d1 d2 / (ae d sin phi)).
    divergence = 1.0 / math.sqrt(1.0 + 2.0 * leg_a * leg_b / (radius * (leg_a + leg_b) * math.sin(phi)))
    eta = ground_permittivity("sea water", frequency_hz=frequency_hz)
    rho = reflection_coefficient(phi, permittivity=eta, polarization=polarization)
    lag = 2.0 * math.pi * (leg_a + leg_b - direct) * frequency_hz / LIGHT_M_S
    return 20.0 * math.log10(abs(1.0 + rho * divergence * np.exp(-1j * lag)))


@pytest.mark.parametrize(
    ("length_m", "a_m", "b_m", "frequency_hz"),
    [(20e3, 40.0, 25.0, 6e9), (30e3, 100.0, 50.0, 6e9), (8e3, 30.0, 60.0, 11e9), (40e3, 200.0, 60.0, 2.4e9)],
)
def test_level_against_height_is_the_closed_form_on_a_sphere(
    length_m: float, a_m: float, b_m: float, frequency_hz: float
) -> None:
    found = over(profile_of(length_m, n=2001), a_m, b_m, frequency_hz=frequency_hz)
    assert found.surface_material == "sea water"
    compared = 0
    for lobing in found.lobing:
        for curve in lobing.curves:
            k = 1e6 if curve.k is None else curve.k
            for height, level in list(zip(lobing.height_m, curve.level_db, strict=True))[::8]:
                if level is None:
                    continue
                ends = (height, b_m) if lobing.end == "a" else (a_m, height)
                wanted = closed_form_db(length_m, *ends, k=k, frequency_hz=frequency_hz)
                if wanted < -25.0:
                    continue  # on the floor of a null a micrometre counts
                assert level == pytest.approx(wanted, abs=0.1), (lobing.end, curve.name, height)
                compared += 1
    assert compared > 60


def test_nulls_stand_where_theory_puts_them() -> None:
    # Flat Earth: 2 h1 h2/(wavelength d) is a whole number; the phase of the sea moves it by less than 0.01 of a pitch.
    length, other, frequency = 20e3, 50.0, 6e9
    found = over(profile_of(length, n=2001), 40.0, other, frequency_hz=frequency, median_k=math.inf)
    lobing = next(item for item in found.lobing if item.end == "a")
    level = np.array(next(curve for curve in lobing.curves if curve.name == "infinite").level_db, dtype=float)
    height = np.array(lobing.height_m)
    dips = np.flatnonzero((level[1:-1] < level[:-2]) & (level[1:-1] < level[2:])) + 1
    pitch = LIGHT_M_S / frequency * length / (2.0 * other)
    assert found.spacing is not None
    assert found.spacing.pitch_a_m == pytest.approx(pitch, rel=1e-4)
    assert len(dips) >= 2
    step = height[1] - height[0]
    for at in height[dips]:
        assert abs(at / pitch - round(at / pitch)) * pitch < 0.6 * step + 0.02 * pitch


def test_the_point_is_on_the_water_and_the_sentence_names_the_stretch() -> None:
    def shore(x: np.ndarray) -> np.ndarray:
        rough = 5.0 + 3.0 * np.sin(x / 37.0)
        return np.where((x > 8_000.0) & (x < 13_000.0), 0.0, rough)

    found = over(profile_of(20e3, shore, n=4001), 60.0, 60.0)
    main = found.points[1]
    assert main.name == "median"
    assert main.surface == "water"
    assert 8_000.0 <= main.from_m < main.at_m < main.to_m <= 13_000.0
    assert 0.0 < main.partial_factor <= 1.0
    assert found.sentences[0].startswith(
        f"The water between {main.from_m / 1e3:.2f} and {main.to_m / 1e3:.1f} km from A"
    )
    narrow = over(
        profile_of(20e3, lambda x: np.where((x > 9_800.0) & (x < 10_400.0), 0.0, 5.0 + 3.0 * np.sin(x / 37.0)), n=4001),
        60.0,
        60.0,
    )
    assert narrow.points[0].partial_factor < 0.7 * main.partial_factor


def test_without_water_flat_ground_is_found_and_said() -> None:
    found = over(profile_of(10e3, lambda x: 12.0 + 0.002 * x, n=2001), water=Water())
    assert found.points[0].surface == "flat ground"
    assert found.points[0].slope_mrad == pytest.approx(2.0, abs=1e-6)
    assert found.surface_material == "wet ground"
    assert found.sentences[0].startswith("Flat ground")


def test_a_tilted_plane_mirrors_where_a_level_one_would_for_heights_above_it() -> None:
    tilted = over(profile_of(10e3, lambda x: 12.0 + 0.004 * x, n=2001), 30.0, 50.0, water=Water())
    level = over(profile_of(10e3, 12.0, n=2001), 30.0, 50.0, water=Water())
    for one, other in zip(tilted.points[:3], level.points[:3], strict=True):
        assert one.at_m == pytest.approx(other.at_m, abs=1.0)
        assert one.path_difference_wavelengths == pytest.approx(other.path_difference_wavelengths, abs=1e-3)


def test_rough_ground_does_not_reflect() -> None:
    rng = np.random.default_rng(5)
    bumps = rng.normal(0.0, 4.0, 2001)
    found = over(
        profile_of(10e3, lambda x: 20.0 + np.interp(x, np.linspace(0, 10e3, 2001), bumps), n=2001), water=Water()
    )
    assert found.points == ()
    assert not found.matters
    assert "No stretch" in found.sentences[0]


def test_trees_on_it_do_not_reflect() -> None:
    found = over(profile_of(10e3, 0.0, n=2001, cover=6.0), 60.0, 60.0)
    assert found.points == ()


def test_a_ridge_shades_a_leg() -> None:
    def islet(x: np.ndarray) -> np.ndarray:
        return np.where(np.abs(x - 1_500.0) < 200.0, 36.0, 0.0)

    open_sea, shaded = over(profile_of(20e3, n=4001), 40.0, 40.0), over(profile_of(20e3, islet, n=4001), 40.0, 40.0)
    assert open_sea.matters
    assert all(point.shaded_at_m is None for point in open_sea.points[:3])
    median = next(point for point in shaded.points if point.name == "median")
    assert median.shaded_at_m is not None
    assert abs(median.shaded_at_m - 1_500.0) <= 200.0
    assert not shaded.matters
    assert "shades the reflection" in shaded.sentences[0]
    assert shaded.lobing == ()


def test_both_directions_say_the_same() -> None:
    profile = profile_of(20e3, lambda x: np.where(x < 2_000.0, 5.0 + x / 500.0, 0.0), n=2001)
    there, back = over(profile, 40.0, 25.0), over(mirrored(profile), 25.0, 40.0)
    for one, other in zip(there.points, back.points, strict=True):
        assert one.name == other.name
        assert one.at_m == pytest.approx(20e3 - other.at_m, abs=0.5)
        for name in ("amplitude", "path_difference_wavelengths", "level_db", "partial_factor"):
            assert getattr(one, name) == pytest.approx(getattr(other, name), abs=2e-3), name
    assert there.lobing[0].height_m == back.lobing[1].height_m
    assert there.lobing[0].curves[1].level_db == pytest.approx(back.lobing[1].curves[1].level_db, abs=2e-2)


def test_heights_offered_stay_free_of_nulls_at_every_k_and_water_level() -> None:
    water = Water(level_m=0.0, low_m=-0.6, high_m=0.8)
    profile = profile_of(12e3, n=2001)
    found = over(profile, 30.0, 20.0, water=water, frequency_hz=2.4e9)
    assert found.matters
    changed = [item for item in found.heights if item.change_m is not None]
    assert changed
    for item in changed:
        assert item.change_m is not None
        ends = [30.0, 20.0]
        ends[0 if item.end == "a" else 1] += item.change_m
        for rise in np.linspace(-0.6, 0.8, 5):
            for k in (0.537, 0.7, 1.0, 4.0 / 3.0, 3.0, 1e6):
                heights = [end - rise for end in ends]
                assert closed_form_db(12e3, *heights, k=k, frequency_hz=2.4e9) > -3.1, (item.end, rise, k)
        inside = [one for one in item.ranges if one.from_m - 1e-6 <= item.planned_m + item.change_m <= one.to_m + 1e-6]
        assert inside
        assert item.planned_m + item.change_m >= item.lowest_m - 1e-6


def test_a_tide_of_more_than_a_pitch_leaves_no_height() -> None:
    found = over(
        profile_of(12e3, n=2001), 30.0, 20.0, water=Water(level_m=0.0, low_m=-8.0, high_m=8.0), frequency_hz=11e9
    )
    assert found.span_wavelengths is not None
    assert found.span_wavelengths > 1.0
    assert all(item.change_m is None for item in found.heights)
    assert any("No height" in line for line in found.sentences)


def test_lowering_to_the_lowest_height_just_meets_the_criteria() -> None:
    profile = profile_of(12e3, n=2001)
    link = link_of(profile, 60.0, 50.0)
    spare = spare_height_m(assess_profile(link, profile).levels, "b")
    assert spare > 0.0
    for more, met in ((-1e-3, True), (1e-3, False)):
        lower = link_of(profile, 60.0, 50.0 - spare - more)
        assert all(item.met for item in assess_profile(lower, profile).result.clearance) is met


def test_a_narrow_beam_holds_the_mirrored_ray_back() -> None:
    profile = profile_of(5e3, n=2001)
    plain = link_of(profile, 80.0, 80.0)
    pattern = dish(diameter_m=1.2, frequency_hz=6e9)
    antenna = Antenna(name="dish", pattern=pattern)
    beamed = Link(name=plain.name, a=plain.a, b=plain.b, radio=plain.radio, antenna_a=antenna, antenna_b=antenna)
    bare, held = over(profile, link=plain), over(profile, link=beamed)
    assert bare.points[1].discrimination_a_db == 0.0
    assert any("no pattern" in note for note in bare.notes)
    assert held.notes == ()
    assert held.points[1].discrimination_a_db > 1.0
    lost = held.points[1].discrimination_a_db + held.points[1].discrimination_b_db
    assert 20.0 * math.log10(bare.points[1].amplitude / held.points[1].amplitude) == pytest.approx(lost, abs=1e-9)


def test_near_the_horizon_doubt_is_said() -> None:
    found = over(profile_of(30e3, n=2001), 16.0, 16.0, frequency_hz=11e9)
    assert any("diffraction takes over" in note for note in found.notes)


def test_a_negative_median_k_is_no_trouble() -> None:
    found = over(profile_of(20e3, n=2001), median_k=-2.0)
    assert found.points[1].divergence > 1.0
    assert all(math.isfinite(point.amplitude) for point in found.points)


def test_a_link_takes_little_time() -> None:
    import time

    profile = profile_of(28e3, n=11_001)
    link = link_of(profile, 40.0, 30.0, frequency_hz=11e9)
    done = assess_profile(link, profile)
    best = math.inf
    for _ in range(5):
        start = time.perf_counter()
        find_reflections(link, result=done.result, profile=done.profile, levels=done.levels, water=SEA)
        best = min(best, time.perf_counter() - start)
    assert best < 0.25  # some 15 ms on an idle machine


def rough_but(at_m: float, level: Callable[[np.ndarray], np.ndarray], *, clear_m: float = 1_500.0) -> PathProfile:
    """A plane with bumps of some metres all along, but for a stretch around one place."""

    def ground(x: np.ndarray) -> np.ndarray:
        return level(x) + np.where(np.abs(x - at_m) < clear_m, 0.0, 4.0 * np.sin(x / 23.0))

    return profile_of(20e3, ground, n=4001)


@pytest.mark.parametrize("slope", [0.002, -0.002, 0.0])
def test_flat_ground_is_found_only_where_it_mirrors(slope: float) -> None:
    # Levels of the ends 80 and 30 m above the plane prolonged, so the place is that of a level one.
    where = float(specular_geometry(20e3, height_a_m=80.0, height_b_m=30.0, k=0.566).from_a_m)
    for at, is_found in ((where, True), (20e3 - where, False), (where - 4_000.0, False)):
        profile = rough_but(at, lambda x: 50.0 + slope * x)
        heights = [80.0 + 50.0 - float(profile.ground_m[0]), 30.0 + 50.0 + slope * 20e3 - float(profile.ground_m[-1])]
        found = over(profile, *heights, water=Water(), median_k=0.566)
        assert any(point.name == "median" for point in found.points) is is_found, at
    assert 1_000.0 * abs(where - 10e3) > 1.0


def test_the_amplitude_is_the_product_of_its_factors() -> None:
    rng = np.random.default_rng(3)
    bumps = rng.normal(0.0, 0.35, 2001)
    profile = profile_of(10e3, lambda x: 20.0 + np.interp(x, np.linspace(0, 10e3, 2001), bumps), n=2001)
    rough = over(profile, water=Water()).points[0]
    assert 0.3 < rough.roughness_m < 0.4
    assert rough.roughness_factor < 0.95

    def strip(x: np.ndarray) -> np.ndarray:
        return np.where(np.abs(x - 10_000.0) < 300.0, 0.0, 5.0 + 3.0 * np.sin(x / 37.0))

    part = next(one for one in over(profile_of(20e3, strip, n=4001), 60.0, 60.0).points if one.surface == "water")
    assert 0.1 < part.partial_factor < 0.9
    for one in (rough, part):
        product = one.coefficient * one.divergence * one.roughness_factor * one.partial_factor
        assert one.amplitude == pytest.approx(product, rel=1e-12)


def test_what_shades_at_low_k_need_not_shade_on_a_flat_earth() -> None:
    # The leg from A to mid-path passes 5 km at half its height; the bulge there adds to the islet at low k only.
    def islet(x: np.ndarray) -> np.ndarray:
        return np.where(np.abs(x - 5_000.0) < 200.0, 27.0, 0.0)

    found = over(profile_of(20e3, islet, n=4001), 60.0, 60.0)
    shaded = {point.name: point.shaded_at_m is not None for point in found.points}
    assert shaded == {"worst month": True, "median": False, "infinite": False}


@pytest.mark.parametrize("end", ["a", "b"])
def test_the_lowest_height_counts_the_lever_of_its_end(end: str) -> None:
    profile = profile_of(12e3, lambda x: np.where(np.abs(x - 3_000.0) < 100.0, 20.0, 0.0), n=2001)
    heights = {"a": 60.0, "b": 60.0}
    spare = spare_height_m(assess_profile(link_of(profile, **heights), profile).levels, end)  # type: ignore[arg-type]
    for more, met in ((1e-3, True), (-1e-3, False)):
        lower = link_of(profile, **(heights | {end: 60.0 - spare + more}))
        assert all(item.met for item in assess_profile(lower, profile).result.clearance) is met


def test_ranges_of_heights_end_where_a_fade_of_3_db_begins() -> None:
    profile = profile_of(12e3, n=2001)
    a_m, b_m = 30.0, 20.0
    found = over(profile, a_m, b_m, frequency_hz=2.4e9)
    edges = 0

    def worst(end: str, height: float) -> float:
        heights = (height, b_m) if end == "a" else (a_m, height)
        inverse = np.linspace(0.0, 1.0 / worst_month_k(12e3), 41)
        return min(closed_form_db(12e3, *heights, k=1.0 / max(one, 1e-6), frequency_hz=2.4e9) for one in inverse)

    for item in found.heights:
        for one in item.ranges:
            assert one.from_m >= item.lowest_m - 1e-6
            for inside, outside, limit in (
                (one.from_m, one.from_m - 0.3, item.searched.from_m),
                (one.to_m, one.to_m + 0.3, item.searched.to_m),
            ):
                assert worst(item.end, inside) > -3.1
                if abs(inside - limit) > 0.2:
                    assert worst(item.end, outside) < -2.9
                    edges += 1
    assert edges >= 2


def test_no_height_below_the_lowest_is_offered() -> None:
    found = over(profile_of(12e3, n=2001), 12.0, 12.0, frequency_hz=2.4e9)
    for item in found.heights:
        assert item.lowest_m > 12.0  # the criteria are not met as planned
        assert item.searched.from_m == item.lowest_m
        assert item.change_m is None or item.change_m > 0.0
