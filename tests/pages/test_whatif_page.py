"""What-if on the drawing, in a real browser: true to fresh runs of the engine, by pointer, finger and keyboard."""

import dataclasses
import random
import re
import shutil
import sys
import tomllib
from pathlib import Path

import pytest
from whatif_reading import FRAMES, opened, quiet, typed

from fellspan.links.assess import assess_in_full
from fellspan.links.criteria import Criterion
from fellspan.planning.planner import open_terrain, settings_of
from fellspan.report.wording import criterion_words
from fellspan.study.reading import load_study

pytestmark = pytest.mark.browser

SAMPLE = Path(__file__).parents[2] / "sample_terrain"
LINKS = (0, 1, 2, 5, 9)
"""Past a growing tree, over a ridge, across the sea, over woods with survey, past ships."""


def settings(number):
    """Four settings of one link: heights, and now k, now frequency, now trees of another age, now all of them."""
    chosen = random.Random(4200 + number)
    for more in ({}, {"k": chosen.choice(["0.7", "1", "5/3"])}, {"frequency": chosen.choice(["2.4", "11", "0.9"])},
                 {"k": "0,8", "frequency": "18", "trees": "20"}):  # fmt: skip
        yield (
            {"a": round(chosen.uniform(0.5, 30.0), 1), "b": round(chosen.uniform(0.5, 30.0), 1)}
            | ({"trees": str(chosen.choice([0, 12]))} if "k" not in more else {})
            | more
        )


def engine(study, plan, wanted, *, grows):
    """A fresh run of the engine at the same setting: terrain opened anew, the path sampled and looked closer at anew."""
    link, drawn = plan.link, plan.result.clearance[plan.result.governing]
    radio = link.radio
    if "frequency" in wanted:
        radio = dataclasses.replace(
            radio,
            frequency_hz=float(wanted["frequency"]) * 1e9,
            duplex="time",
            frequency_a_hz=None,
            frequency_b_hz=None,
        )
    a, b = (dataclasses.replace(getattr(link, end), height_m=wanted[end]) for end in ("a", "b"))
    link = dataclasses.replace(link, radio=radio, a=a, b=b)
    if "trees" in wanted and grows:
        study = dataclasses.replace(study, growth_years=float(wanted["trees"]))
    if "k" in wanted:
        over, under = (wanted["k"].replace(",", ".") + "/1").split("/")[:2]
        rule = Criterion(
            name=drawn.criterion, k=float(over) / float(under), fraction=drawn.required_fraction, source="typed"
        )
        study = dataclasses.replace(study, criteria=(rule,))
    with open_terrain(study) as terrain:
        result = assess_in_full(link, terrain=terrain, settings=settings_of(study)).result
    return result.clearance[result.governing]


@pytest.mark.parametrize("number", LINKS)
def test_the_page_says_what_fresh_runs_of_the_engine_say(watch, sample, number, capsys):
    watched = opened(watch, sample, number)
    page, plan = watched.page, sample.plan.links[number]
    grows = page.evaluate("() => fellspanWhatIf.data.growth.grows")
    spent = []
    for wanted in settings(number):
        page.click("[data-what-if=reset]", force=True)
        page.evaluate(FRAMES)
        values = dict(wanted)
        if not grows:
            values.pop("trees", None)
        said = typed(page, **values)
        spent.append(page.evaluate("() => fellspanWhatIf.milliseconds"))
        true = engine(sample.plan.study, plan, values, grows=grows)
        assert said["name"] == true.criterion, wanted
        assert said["rule"] == criterion_words(true), wanted
        assert said["fraction"] == pytest.approx(true.worst_fraction, abs=0.005), wanted
        assert said["met"] == true.met, wanted
        for end in ("a", "b", "both"):
            extra, wants = said["extra"][end], getattr(true.extra_height_m, end)
            # "Cannot" is None in the engine; more than 100 m is "not practical" on both, whatever the number.
            extra, wants = (100.0 if value is None else min(value, 100.0) for value in (extra, wants))
            assert extra == pytest.approx(wants, abs=0.05), (wanted, end)
        shown = float(re.match(r"(?:Least share of the zone: )?([\d.]+) m", said["callout"])[1])
        assert abs(shown - abs(true.clearance_m - true.required_m if true.met else said["spare"])) <= 0.15, (
            wanted,
            said,
        )
        assert "What-if: not the plan" in said["sentence"]
        assert said["rule"] in said["sentence"]
    quiet(watched)
    with capsys.disabled():
        sys.stdout.write(f"\n  {plan.link.name}: updates of {', '.join(f'{value:.1f}' for value in spent)} ms")


def test_the_worst_link_is_answered_well_within_a_frame(watch, sample, capsys):
    # Time is told, not asserted: what is counted is the work that one answer takes.
    told = []
    for number in LINKS:
        page = opened(watch, sample, number).page
        points, arithmetic, whole = page.evaluate(
            """() => {
              const tool = fellspanWhatIf, length = tool.points.x.length, times = [], all = [];
              for (let i = 0; i < 60; i += 1) {
                const setting = {a: tool.data.a.base + 5 + i / 3, b: tool.data.b.base + 9, frequency: 6e9, k: null,
                                 fraction: 0.6, years: tool.plan.years, taller: i / 30};
                let start = performance.now();
                fellspanNeed.answer(tool.data, tool.points, setting);
                times.push(performance.now() - start);
                tool.set({a: tool.plan.a + i / 3, taller: i / 30});
                all.push(tool.milliseconds);
              }
              const middle = list => list.sort((one, other) => one - other)[list.length >> 1];
              return [length, middle(times), middle(all)];
            }"""
        )
        told.append((points, arithmetic, whole))
        assert points < 3000
    with capsys.disabled():
        worst = max(told, key=lambda item: item[2])
        sys.stdout.write(
            f"\n  worst: {worst[0]} points, arithmetic {worst[1]:.2f} ms, with the drawing {worst[2]:.1f} ms"
        )


def test_a_ring_is_dragged_and_the_whole_drawing_follows(watch, sample):
    watched = opened(watch, sample, 1)
    page = watched.page
    ring = page.locator(".only-wide .height-handle.of-a")
    ring.scroll_into_view_if_needed()
    box = ring.bounding_box()
    x, y = box["x"] + box["width"] / 2, box["y"] + box["height"] / 2
    metres = page.evaluate(
        """() => { const sketch = fellspanWhatIf.sheets[0].sketch;
                   return sketch.metresPerUnit() * sketch.width / sketch.svg.getBoundingClientRect().width; }"""
    )
    page.mouse.move(x, y)
    page.mouse.down()
    page.mouse.move(x, y - 20, steps=4)
    page.mouse.move(x, y - 40, steps=4)
    page.mouse.up()
    page.evaluate(FRAMES)
    state = page.evaluate("() => fellspanWhatIf.state()")
    plan = sample.plan.links[1]
    assert state["a"] == pytest.approx(plan.link.a.height_m + 40 * metres, abs=0.11)
    assert state["b"] == plan.link.b.height_m
    assert page.input_value("[data-box=a]") == f"{state['a']:g}"
    assert page.locator(".only-wide .stamp-what-if").text_content() == "What-if: not the plan"
    drawn = page.locator(".only-wide .what-if-a .dim-text").last.text_content()
    assert drawn == f"mast {state['a']:.1f} m"
    level = plan.result.ends.a.antenna_amsl_m + state["a"] - plan.link.a.height_m
    assert f"antenna {level:.1f} m above sea level" in page.locator(".only-wide .site-more").first.text_content()
    assert not page.locator(".only-wide .end-a").is_visible()
    sight = page.locator(".only-wide .what-if-layer .sight-line").bounding_box()
    after = ring.bounding_box()
    assert sight["y"] <= after["y"] + after["height"] / 2 <= sight["y"] + sight["height"] + 1.5
    quiet(watched)


def test_a_finger_drags_the_ring_on_a_phone(watch, sample):
    watched = opened(watch, sample, 1, width=390, height=844)
    page = watched.page
    touch = page.context.new_cdp_session(page)
    touch.send("Emulation.setTouchEmulationEnabled", {"enabled": True})
    ring = page.locator(".only-narrow .height-handle.of-b")
    ring.scroll_into_view_if_needed()
    box = ring.bounding_box()
    assert min(box["width"], box["height"]) >= 44
    x, y = box["x"] + box["width"] / 2, box["y"] + box["height"] / 2
    scroll = page.evaluate("() => window.scrollY")
    touch.send("Input.dispatchTouchEvent", {"type": "touchStart", "touchPoints": [{"x": x, "y": y}]})
    for step in (8, 16, 24):
        touch.send("Input.dispatchTouchEvent", {"type": "touchMove", "touchPoints": [{"x": x, "y": y - step}]})
    touch.send("Input.dispatchTouchEvent", {"type": "touchEnd", "touchPoints": []})
    page.evaluate(FRAMES)
    assert page.evaluate("() => fellspanWhatIf.state().b") > sample.plan.links[1].link.b.height_m + 1.0
    assert page.evaluate("() => window.scrollY") == scroll
    assert page.evaluate("() => document.documentElement.scrollWidth") == 390
    quiet(watched)


def test_heights_are_stepped_with_the_keys(watch, sample):
    watched = opened(watch, sample, 1)
    page, height = watched.page, sample.plan.links[1].link.b.height_m
    ring = page.locator(".only-wide .height-handle.of-b")
    ring.focus()
    for keys, wanted in (
        (["ArrowUp"], height + 0.1), (["Shift+ArrowUp"], height + 1.1), (["ArrowDown"], height + 1.0),
        (["PageUp"], height + 6.0), (["PageDown", "PageDown"], height - 4.0), (["Home"], 0.0), (["Escape"], height),
    ):  # fmt: skip
        for key in keys:
            page.keyboard.press(key)
        page.evaluate(FRAMES)
        assert page.evaluate("() => fellspanWhatIf.state().b") == pytest.approx(wanted), keys
        assert float(ring.get_attribute("aria-valuenow")) == pytest.approx(wanted)
        assert ring.get_attribute("aria-valuetext") == f"{wanted:g} m above ground"
    assert ring.get_attribute("role") == "slider"
    assert not page.locator(".stamp-what-if").count()
    quiet(watched)


def test_one_button_returns_to_the_plan_to_the_letter(watch, sample):
    watched = opened(watch, sample, 5)
    page = watched.page
    reset = page.locator("[data-what-if=reset]")
    assert reset.is_disabled()
    parts = "figure.drawing svg.path-profile, .title-block dl"
    state = f"() => [...document.querySelectorAll('{parts}')].map(part => part.outerHTML)"
    before = page.evaluate(state)
    boxes = page.evaluate("() => [...document.querySelectorAll('[data-box]')].map(box => box.value)")
    typed(page, a=60, b=80, k="0.6", frequency=2.4, trees=20)
    changed = page.evaluate(state)
    assert changed != before
    assert "tried" in changed[-1]
    reset.click()
    page.evaluate(FRAMES)
    assert [text.replace(' class=""', "") for text in page.evaluate(state)] == before
    assert page.evaluate("() => [...document.querySelectorAll('[data-box]')].map(box => box.value)") == boxes
    assert "not the plan" not in page.inner_text("figure.drawing")
    quiet(watched)


def test_the_copied_lines_make_the_same_change_in_the_study_file(watch, sample, tmp_path):
    watched = opened(watch, sample, 1)
    page, name = watched.page, sample.plan.links[1].link.name
    page.context.grant_permissions(["clipboard-read", "clipboard-write"])
    said = typed(page, a=13.5, b=21, k="0.9", frequency=5.2)
    page.click("[data-what-if=copy]")
    page.wait_for_function("() => document.querySelector('[data-what-if=copy]').textContent === 'Copied'")
    copied = page.evaluate("() => navigator.clipboard.readText()").splitlines()
    assert copied == page.evaluate(
        "() => [...document.querySelectorAll('.what-if-lines code')].map(line => line.textContent)"
    )
    keys = {key: line for line in copied for key in tomllib.loads(line)}
    assert list(keys) == ["height_a", "height_b", "frequency", "rules"]
    assert tomllib.loads(keys["height_a"]) == {"height_a": "13.5 m above roof"}
    for key in ("height_a", "height_b", "frequency"):
        assert keys[key].endswith(f"# [[link]] {name}")
    text = (SAMPLE / "tolmera.toml").read_text(encoding="utf-8")
    head, tail = text.split(f'name = "{name}"\n')
    tail = re.sub(r'^frequency = "5.775 GHz"\n', "", tail, count=1, flags=re.MULTILINE)
    text = (
        f'{head}name = "{name}"\n' + "".join(keys[key] + "\n" for key in ("height_a", "height_b", "frequency")) + tail
    )
    text = text.replace('preset = "p530-temperate"\n', keys["rules"] + "\n")
    for file in SAMPLE.iterdir():
        if file.is_file() and file.suffix != ".toml":
            shutil.copy(file, tmp_path)
    (tmp_path / "tried.toml").write_text(text, encoding="utf-8")
    study = load_study(tmp_path / "tried.toml")
    with open_terrain(study) as terrain:
        result = assess_in_full(study.links[1], terrain=terrain, settings=settings_of(study)).result
    assert result.clearance[0].worst_fraction == pytest.approx(said["fraction"], abs=0.005)
    assert result.clearance[0].extra_height_m.both == pytest.approx(said["extra"]["both"], abs=0.05)
    typed(page, a=5, b=10, frequency=5.775, k="")
    assert page.locator(".what-if-lines code").count() == 0
    quiet(watched)


def test_growth_is_one_line_of_the_study_table(watch, sample):
    page = opened(watch, sample, 0).page
    typed(page, trees=12)
    assert page.inner_text(".what-if-lines") == "growth_years = 12  # [study], for every link"
    page.select_option("[data-box=unit]", "m")
    page.evaluate(FRAMES)
    typed(page, trees="1.5")
    assert tomllib.loads(page.inner_text(".what-if-lines")) == {}
    state = page.evaluate("() => fellspanWhatIf.state()")
    assert (state["taller"], state["years"]) == (1.5, sample.plan.study.growth_years)


def test_trees_some_metres_taller_are_the_plans_trees_raised(watch, sample):
    # The lime tree of the first link governs: 1.5 m on top of it take 1.5 m from what is to spare there.
    page, plan = opened(watch, sample, 0).page, sample.plan.links[0]
    drawn = plan.result.clearance[plan.result.governing]
    assert "lime" in drawn.cause
    page.select_option("[data-box=unit]", "m")
    said = typed(page, trees="1.5")
    assert said["spare"] == pytest.approx(drawn.clearance_m - drawn.required_m - 1.5, abs=0.02)


def test_what_is_typed_wrong_is_marked_and_changes_nothing(watch, sample):
    watched = opened(watch, sample, 1)
    page = watched.page
    for box, text in (
        ("a", "-1"),
        ("a", "tall"),
        ("k", "0"),
        ("frequency", "900"),
        ("b", "1e9"),
        ("k", "4/0"),
        ("a", ""),
    ):
        page.fill(f"[data-box={box}]", text)
        page.evaluate(FRAMES)
        assert page.get_attribute(f"[data-box={box}]", "aria-invalid") == "true", (box, text)
        assert page.evaluate("() => JSON.stringify(fellspanWhatIf.state()) === JSON.stringify(fellspanWhatIf.plan)")
        assert re.fullmatch(r"[\d.]+ to [\d.]+", page.inner_text(f"label:has([data-box={box}]) > span")), box
        page.locator(f"[data-box={box}]").blur()
        page.evaluate(FRAMES)
        assert page.get_attribute(f"[data-box={box}]", "aria-invalid") is None
    quiet(watched)


def test_units_may_be_typed_with_the_numbers(watch, sample):
    page = opened(watch, sample, 1).page
    typed(page, a="40 ft", b="12 m", frequency="900 MHz", k="2/3")
    state = page.evaluate("() => fellspanWhatIf.state()")
    assert (state["a"], state["b"], state["frequency"]) == pytest.approx((12.192, 12.0, 9e8))
    assert state["k"] == pytest.approx(2 / 3)
    assert page.locator("[aria-invalid]").count() == 0


def test_without_a_script_the_page_reads_as_before(browser, sample):
    context = browser.new_context(java_script_enabled=False, viewport={"width": 1280, "height": 900})
    page = context.new_page()
    page.goto(sample.link_pages[1].as_uri())
    seen = page.inner_text("figure.drawing")
    assert "What-if" not in seen
    assert "Back to the plan" not in seen
    assert page.locator(".only-wide svg.path-profile").is_visible()
    assert not any(page.locator(part).first.is_visible() for part in (".what-if", ".spot"))
    context.close()


def test_paper_shows_no_controls_but_says_what_if_where_it_is_one(watch, sample):
    watched = opened(watch, sample, 1, width=390, height=844)
    page = watched.page
    page.emulate_media(media="print")
    page.evaluate(FRAMES)
    assert "What-if" not in page.inner_text("figure.drawing")
    assert not page.locator(".only-wide .height-handle").first.is_visible()
    page.emulate_media(media="screen")
    typed(page, a=20)
    page.emulate_media(media="print")
    page.evaluate(FRAMES)
    assert page.locator(".only-wide .stamp-what-if").is_visible()
    assert "What-if: not the plan" in page.inner_text(".what-if-answer")
    for part in (".what-if-boxes", ".what-if-copy", ".only-wide .height-handle", ".only-wide .spot-cursor", ".spot"):
        assert not page.locator(part).first.is_visible(), part
    quiet(watched)


@pytest.mark.parametrize("scheme", ["light", "dark"])
def test_nothing_scrolls_sideways_on_a_phone(watch, sample, scheme):
    watched = opened(watch, sample, 2, width=390, height=844)
    page = watched.page
    page.emulate_media(color_scheme=scheme)
    typed(page, a=40, b=50, k="0.55", frequency=23)
    page.locator(".only-narrow .spot-cursor").focus()
    page.keyboard.press("Shift+ArrowRight")
    page.evaluate(FRAMES)
    assert page.evaluate("() => document.documentElement.scrollWidth") == 390
    assert page.locator(".only-narrow .stamp-what-if").is_visible()
    beyond = page.evaluate(
        """() => [...document.querySelectorAll("figure.drawing .what-if *, figure.drawing .spot *")]
                   .filter(part => part.getClientRects().length && part.getBoundingClientRect().right > 391)
                   .map(part => part.className || part.nodeName)"""
    )
    assert beyond == ["unseen"] or beyond == []
    quiet(watched)


def test_hostile_names_stay_text(watch, hostile):
    for number in (0, 2):
        watched = opened(watch, hostile, number)
        page = watched.page
        said = typed(page, a=41, b=9)
        assert page.title() != "owned"
        assert page.locator("figure.drawing img:not(.leaflet-image-layer)").count() == 0
        assert "What-if: not the plan" in said["sentence"]
        for line in page.evaluate(
            "() => [...document.querySelectorAll('.what-if-lines code')].map(line => line.textContent)"
        ):
            assert len(line.splitlines()) == 1
            assert set(tomllib.loads(line)) <= {"height_a", "height_b"}
        quiet(watched)
