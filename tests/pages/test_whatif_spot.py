"""One spot on profile and key plan at once: by pointing at either, and with the keyboard."""

import re

import numpy as np
import pytest

from fellspan.geodesy.coordinates import format_position
from fellspan.geodesy.position import Position

pytestmark = pytest.mark.browser

FRAMES = "() => new Promise(done => requestAnimationFrame(() => requestAnimationFrame(done)))"
MARK = """() => {
  let found = null;
  fellspanMap.map.eachLayer(layer => { if (layer.options.className === "map-spot") found = layer.getLatLng(); });
  return found && [found.lat, found.lng];
}"""
NOW = "() => Number(document.querySelector('.only-wide .spot-cursor').getAttribute('aria-valuenow'))"


@pytest.fixture
def seen(watch, sample):
    watched = watch(1280, 900)
    plan = sample.plan.links[5]
    watched.page.goto(sample.link_pages[5].as_uri())
    watched.page.evaluate(FRAMES)
    yield watched.page, plan
    assert watched.messages == []
    assert watched.requests == []


def position(plan, at_m):
    profile = plan.profile
    return (
        float(np.interp(at_m, profile.distance_m, profile.latitude_deg)),
        float(np.interp(at_m, profile.distance_m, profile.longitude_deg)),
    )


def test_pointing_at_the_profile_marks_the_key_plan(seen):
    page, plan = seen
    assert page.evaluate(MARK) is None
    drawing = page.locator(".only-wide svg.path-profile")
    drawing.scroll_into_view_if_needed()
    box = drawing.bounding_box()
    left, right, width = (float(drawing.get_attribute(f"data-{name}")) for name in ("left", "right")), None, None
    left, right = left
    width = float(drawing.get_attribute("viewBox").split()[2])
    for share in (0.25, 0.8):
        x = box["x"] + (left + share * (right - left)) / width * box["width"]
        page.mouse.move(x, box["y"] + box["height"] * 0.4)
        page.evaluate(FRAMES)
        at = page.evaluate(NOW)
        assert at == pytest.approx(share * plan.profile.length_m, abs=plan.profile.length_m / 150.0)
        assert page.evaluate(MARK) == pytest.approx(position(plan, at), abs=1.5e-5)
        told = page.inner_text(".spot")
        latitude, longitude = position(plan, at)
        said = re.match(r"([\d.]+) N, ([\d.]+) W", told)
        assert (float(said[1]), -float(said[2])) == pytest.approx((latitude, longitude), abs=2e-5)
        assert format_position(Position(latitude_deg=latitude, longitude_deg=longitude))[:6] == told[:6]
        index = int(np.argmin(np.abs(plan.profile.distance_m - at)))
        ground = float(re.search(r"ground ([\d.]+) m", told)[1])
        assert ground == pytest.approx(plan.profile.ground_m[index], abs=1.0)
        available = float(re.search(r"available ([\d.]+) m", told)[1])
        assert available == pytest.approx(np.interp(at, plan.levels.distance_m, plan.levels.available_m), abs=0.15)
        assert "from A" in told
        assert "from B" in told
        assert page.locator(".map-spot-words").inner_text().startswith(told.split("W")[0].strip()[:8])


def test_the_readout_tells_the_levels_of_the_profile_exactly(seen):
    page, plan = seen
    profile, levels = plan.profile, plan.levels
    row = levels.need_m[plan.result.governing]
    page.locator(".only-wide .spot-cursor").focus()
    for _ in range(12):
        page.keyboard.press("Shift+ArrowRight")
        at = page.evaluate("() => [...fellspanWhatIf.spots.x]")
        text = page.locator(".only-wide .spot-cursor").get_attribute("aria-valuetext")
        here = page.evaluate(NOW)
        spot = min(at, key=lambda value: abs(value - here))
        index = int(np.argmin(np.abs(profile.distance_m - spot)))
        assert abs(profile.distance_m[index] - spot) < 0.02
        # Told to a tenth from whole centimetres.
        ground = float(re.search(r"ground ([\d.]+) m", text)[1])
        assert ground == pytest.approx(profile.ground_m[index], abs=0.056)
        if profile.surface_m[index] > profile.ground_m[index] + 0.06:
            top = float(re.search(r"top of what stands there ([\d.]+) m", text)[1])
            assert top == pytest.approx(profile.surface_m[index], abs=0.061)
        required = float(re.search(r"level required ([\d.]+) m", text)[1])
        assert required == pytest.approx(row[index], abs=0.11)


def test_pointing_at_the_path_on_the_key_plan_marks_the_profile(seen):
    page, plan = seen
    page.locator("#key-plan").scroll_into_view_if_needed()
    for share in (0.3, 0.66):
        at = share * plan.profile.length_m
        x, y = page.evaluate(
            """([latitude, longitude]) => {
              const box = document.querySelector("#key-plan .folium-map").getBoundingClientRect();
              const point = fellspanMap.map.latLngToContainerPoint([latitude, longitude]);
              return [box.left + point.x, box.top + point.y];
            }""",
            list(position(plan, at)),
        )
        page.mouse.move(x, y)
        page.evaluate(FRAMES)
        # A pixel of the key plan is as many metres as the path is long by pixels there.
        assert page.evaluate(NOW) == pytest.approx(at, abs=plan.profile.length_m / 60.0)
        assert "is-shown" in page.get_attribute(".only-wide .spot-cursor", "class")
        cursor = page.locator(".only-wide .spot-cursor").bounding_box()
        drawing = page.locator(".only-wide svg.path-profile")
        left, right = (float(drawing.get_attribute(f"data-{name}")) for name in ("left", "right"))
        box, width = drawing.bounding_box(), float(drawing.get_attribute("viewBox").split()[2])
        place = box["x"] + (left + page.evaluate(NOW) / plan.profile.length_m * (right - left)) / width * box["width"]
        assert cursor["x"] + cursor["width"] / 2 == pytest.approx(place, abs=1.5)


def test_the_keyboard_walks_the_path(seen):
    page, plan = seen
    cursor = page.locator(".only-wide .spot-cursor")
    assert cursor.get_attribute("role") == "slider"
    cursor.focus()
    walked = []
    for key in ("Home", "ArrowRight", "Shift+ArrowRight", "ArrowLeft", "PageUp", "End", "Shift+ArrowLeft"):
        page.keyboard.press(key)
        walked.append(page.evaluate(NOW))
    assert walked[0] == 0
    assert walked[5] == round(plan.profile.length_m)
    assert walked[0] < walked[1] < walked[3] < walked[2] < walked[4] < walked[6] < walked[5]
    assert walked[2] - walked[1] > 5 * walked[1]
    assert page.evaluate(MARK) == pytest.approx(position(plan, walked[6]), abs=1.5e-5)
    assert page.locator(".spot.is-shown").is_visible()
    page.keyboard.press("Escape")
    assert page.evaluate(MARK) is None
    assert page.locator(".spot.is-shown").count() == 0


def test_the_spot_follows_a_what_if(seen):
    page, _ = seen
    page.locator(".only-wide .spot-cursor").focus()
    page.keyboard.press("ArrowRight")
    before = float(re.search(r"available ([\d.]+) m", page.inner_text(".spot"))[1])
    page.fill("[data-box=a]", "55")
    page.fill("[data-box=b]", "60")
    page.evaluate(FRAMES)
    after = float(re.search(r"available ([\d.]+) m", page.inner_text(".spot"))[1])
    assert after == pytest.approx(before + 50.0, abs=0.25)


def test_a_finger_points_on_a_phone(watch, sample):
    watched = watch(390, 844)
    page = watched.page
    page.goto(sample.link_pages[2].as_uri())
    page.evaluate(FRAMES)
    touch = page.context.new_cdp_session(page)
    touch.send("Emulation.setTouchEmulationEnabled", {"enabled": True})
    drawing = page.locator(".only-narrow svg.path-profile")
    drawing.scroll_into_view_if_needed()
    box = drawing.bounding_box()
    point = {"x": box["x"] + box["width"] * 0.5, "y": box["y"] + box["height"] * 0.45}
    touch.send("Input.dispatchTouchEvent", {"type": "touchStart", "touchPoints": [point]})
    touch.send("Input.dispatchTouchEvent", {"type": "touchEnd", "touchPoints": []})
    page.evaluate(FRAMES)
    assert page.evaluate(MARK) is not None
    assert page.locator(".spot.is-shown").is_visible()
    assert page.evaluate("() => document.documentElement.scrollWidth") == 390
    assert watched.messages == []
