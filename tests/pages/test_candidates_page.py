"""The page of a run in a real browser: it draws, sorts, finds and tells, asks no network and stays within bounds."""

import os
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import Any

import made_runs
import numpy as np
import pytest
from test_accessibility import AXE, AXE_RUN

from fellspan.cli.main import run
from fellspan.report import candidates_page
from fellspan.report.candidates_page import render_candidates_page
from fellspan.runs.summary import STATE_CODES, BestHubs, HubCount, RunSummary
from fellspan.screening.pairs import BASES, SIGNAL_VERDICTS, STATUSES, Candidates, Sector, SiteColumns
from fellspan.study.reading import load_study

HOSTILE = "</script><script>alert(1)</script>\"'&<b>"


def sites(names: list[str], *, seed: int) -> SiteColumns:
    rng = np.random.default_rng(seed)
    count = len(names)
    return SiteColumns(
        name=tuple(names),
        latitude_deg=rng.uniform(36.02, 36.09, count),
        longitude_deg=rng.uniform(-45.26, -45.14, count),
        height_m=np.full(count, 6.0),
        height_reference=np.zeros(count, dtype=np.int8),
        roof_m=np.full(count, np.nan),
    )


def made_page(folder: Path, count: int, *, hubs: int = 3) -> str:
    """The page of a made-up run: every state in turn."""
    from fellspan.links.radio import Radio
    from fellspan.links.site import Antenna

    made_runs.write_ground(folder / "ground.tif")
    (folder / "study.toml").write_text(
        made_runs.STUDY + "\n[[site]]\nname = 'a'\nat = '36.09 N, 45.28 W'\nheight = '9 m above ground'\n"
        "\n[[site]]\nname = 'b'\nat = '36.09 N, 45.25 W'\nheight = '9 m above ground'\n"
        "\n[[link]]\nname = 'a - b'\na = 'a'\nb = 'b'\nradio = 'radio'\n",
        encoding="utf-8",
    )
    names = sorted([HOSTILE, *(f"place {n:06d}" for n in range(count - 1))])
    state = (np.arange(count) % len(STATE_CODES)).astype(np.int8)
    reached = state < 4
    hub_names = [HOSTILE + "hub", *(f"hub {n}" for n in range(hubs - 1))]
    best = BestHubs(
        hub=np.where(reached, np.arange(count) % hubs, -1),
        sector=np.where(reached, np.arange(count) % hubs, -1),
        state=state,
        signal=np.where(reached, np.arange(count) % 3, -1).astype(np.int8),
        margin_db=np.where(reached, np.linspace(-20.0, 20.0, count), np.nan),
        distance_m=np.where(state < 5, np.linspace(300.0, 9000.0, count), np.nan),
        extra_m=np.where(state == 3, np.inf, np.where(state == 2, 4.21, np.where(reached, 0.0, np.nan))),
        extra_sure_m=np.where(state == 3, np.inf, np.where(state == 2, 5.13, np.where(reached, 0.0, np.nan))),
        clear_hubs=np.where(state < 2, 9, 0),
        bearing_deg=np.where(reached, 154.84, np.nan),
        others=np.where((state < 2)[:, None], np.array([1, 2, -1, -1, -1]), -1),
    )
    counts = np.bincount(state, minlength=len(STATE_CODES)).tolist()
    summary = RunSummary(
        pairs=count,
        by_status=dict.fromkeys(STATUSES, 0),
        by_state={"clear": 1, "clear-bare": 2, "marginal": 3, "obstructed": 4},
        by_basis=dict.fromkeys(BASES, 1),
        by_signal=dict.fromkeys(SIGNAL_VERDICTS, 1),
        places=count,
        by_best_state=dict(zip(STATE_CODES, counts, strict=True)),
        places_served=7,
        hubs=tuple(
            HubCount(
                name=name, pairs=9, clear_and_meets=1, best_for=n,
                by_state={"clear": 1, "clear-bare": 2, "marginal": 3, "obstructed": 4},
            )
            for n, name in enumerate(hub_names)
        ),
        refusals=((HOSTILE, 3),),
        best=best,
    )  # fmt: skip
    candidates = Candidates(
        hubs=sites(hub_names, seed=1),
        places=sites(names, seed=2),
        sectors=tuple(Sector(hub=n, name="", antenna=Antenna()) for n in range(hubs)),
        place_antenna=Antenna(),
        radio=Radio(name="radio", frequency_hz=5.8e9),
    )
    return render_candidates_page(summary, load_study(folder / "study.toml"), candidates, notes=(HOSTILE,))


@contextmanager
def shown(watch: Any, path: Path, *, width: int = 1280) -> Iterator[Any]:
    """The page opened; in the end it must have asked for nothing and complained of nothing."""
    watched = watch(width=width)
    watched.page.goto(path.as_uri())
    yield watched.page
    assert watched.requests == []
    assert watched.messages == []


def written(folder: Path, text: str) -> Path:
    path = folder / "index.html"
    path.write_text(text, encoding="utf-8", newline="\n")
    return path


@pytest.fixture(scope="module")
def small(tmp_path_factory: pytest.TempPathFactory) -> Path:
    folder = tmp_path_factory.mktemp("candidates")
    return written(folder, made_page(folder, 300))


@pytest.mark.browser
@pytest.mark.parametrize("width", [1280, 390])
def test_it_opens_with_no_network_and_nothing_to_complain_of(small: Path, watch: Any, width: int) -> None:
    with shown(watch, small, width=width) as page:
        assert page.evaluate("document.documentElement.scrollWidth <= window.innerWidth")
        assert page.locator("#place-list tbody tr").count() == 200
        painted = page.evaluate(
            """() => {
              const canvas = document.querySelector('.place-canvas');
              const data = canvas.getContext('2d').getImageData(0, 0, canvas.width, canvas.height).data;
              let count = 0;
              for (let i = 3; i < data.length; i += 4) if (data[i]) count += 1;
              return count;
            }"""
        )
        assert painted > 2_000


@pytest.mark.browser
def test_states_have_shapes_of_their_own_and_words(small: Path, watch: Any) -> None:
    with shown(watch, small) as page:
        shapes = page.eval_on_selector_all(".state-key canvas", "marks => marks.map(mark => mark.toDataURL())")
        assert len(set(shapes)) == len(shapes) == 6
        words = page.locator(".state-key").inner_text()
        for word in ("Clear", "Clear on bare ground only", "Marginal", "Obstructed", "No answer", "No hub in reach"):
            assert word in words


@pytest.mark.browser
def test_lists_sort_find_and_tell(small: Path, watch: Any) -> None:
    with shown(watch, small) as page:

        def column(number: int) -> list[str]:
            return page.eval_on_selector_all(
                f"#place-list tbody tr td:nth-child({number})", "cells => cells.map(cell => cell.textContent)"
            )

        page.locator("#place-list th[data-by=margin] button").click()
        margins = [float(text.replace("−", "-")) for text in column(6) if text != "–"]
        assert margins == sorted(margins)
        page.locator("#place-list th[data-by=margin] button").click()
        assert page.locator("#place-list th[data-by=margin]").get_attribute("aria-sort") == "descending"
        falling = [float(text.replace("−", "-")) for text in column(6) if text != "–"]
        assert falling == sorted(falling, reverse=True)
        page.locator("#only").select_option(label="Obstructed")
        assert set(column(2)) == {"Obstructed"}
        assert set(column(7)) == {"none helps"}
        page.locator("#only").select_option("")
        page.locator("#find").fill("place 000007")
        assert page.locator("#place-list tbody tr").count() == 1
        page.locator("#place-list tbody tr").first.click()
        assert "place 000007" in page.locator("#told").inner_text()
        page.locator("[data-hub]").nth(0).click()
        assert "joined by lines" in page.locator("#told").inner_text()


SEEN = """() => {
  const map = document.querySelector('.map-frame').getBoundingClientRect();
  const box = document.querySelector('#told').getBoundingClientRect();
  return map.top >= -1 && map.top + 200 < innerHeight && box.top >= -1 && box.bottom <= innerHeight;
}"""


@pytest.mark.browser
@pytest.mark.parametrize("width", [1280, 390])
def test_a_row_far_down_brings_map_and_box_into_view_and_leads_back(small: Path, watch: Any, width: int) -> None:
    with shown(watch, small, width=width) as page:
        row = page.locator("#place-list tbody tr").nth(150)
        row.scroll_into_view_if_needed()
        was = page.evaluate("scrollY")
        assert was > 1_000
        row.locator("button").click()
        page.wait_for_function(SEEN)
        assert page.locator("#place-list tr.is-chosen").count() == 1
        page.locator("#told button").click()
        page.wait_for_function("was => Math.abs(scrollY - was) < innerHeight", arg=was)
        assert row.locator("button").evaluate("button => button === document.activeElement")


@pytest.mark.browser
def test_a_map_in_view_stays_where_it_is_and_the_box_tells_all(small: Path, watch: Any) -> None:
    with shown(watch, small) as page:
        page.evaluate("scrollTo(0, 60)")
        page.locator("[data-hub]").nth(0).click()
        assert page.evaluate("scrollY") == 60
        page.evaluate("fellspanPage.choosePlace(6)")  # clear, by the first hub
        told = page.locator("#told").inner_text()
        assert "bearing 154.8° from the hub" in told
        assert "Heights: 6 m above ground at the hub, 6 m above ground here" in told
        assert "Clear from these hubs too: hub 0, hub 1 and 6 more" in told


@pytest.mark.browser
def test_a_table_that_is_cut_says_so(small: Path, watch: Any) -> None:
    with shown(watch, small, width=390) as page:
        box = page.locator(".places .scroll")
        assert "is-cut" in box.get_attribute("class")
        words = box.evaluate("box => getComputedStyle(box, '::before').content")
        assert "Push sideways to see the rest" in words
        box.evaluate("box => { box.scrollLeft = 9999; }")
        page.wait_for_function("!document.querySelector('.places .scroll').classList.contains('is-cut')")
    with shown(watch, small, width=1600) as page:
        assert "goes-on" not in page.locator(".places .scroll").get_attribute("class")


@pytest.mark.browser
@pytest.mark.parametrize(("width", "scheme"), [(1280, "light"), (1280, "dark"), (390, "dark")])
def test_it_is_for_everyone(small: Path, browser: Any, width: int, scheme: str) -> None:
    if not AXE.exists() and os.environ.get("CI") != "true":
        pytest.skip(f"axe-core is not at {AXE}")
    context = browser.new_context(viewport={"width": width, "height": 900}, color_scheme=scheme)
    page = context.new_page()
    page.goto(small.as_uri())
    page.evaluate(AXE.read_text(encoding="utf-8"))
    assert page.evaluate(AXE_RUN) == []
    before = page.evaluate("document.querySelector('.state-key canvas').toDataURL()")
    page.emulate_media(color_scheme="light" if scheme == "dark" else "dark")
    # what is painted on a canvas follows the colours of the page by itself only where the script sees to it
    page.wait_for_function("was => document.querySelector('.state-key canvas').toDataURL() !== was", arg=before)
    context.close()


@pytest.mark.browser
def test_names_are_only_names(small: Path, watch: Any) -> None:
    with shown(watch, small) as page:
        page.locator("#find").fill("alert(1)")
        assert page.locator("#place-list tbody th").first.inner_text() == HOSTILE
        assert HOSTILE in page.locator(".cautions").inner_text()


@pytest.mark.browser
def test_the_page_of_very_many_places_is_bounded_and_counts_in_squares(tmp_path: Path, watch: Any) -> None:
    text = made_page(tmp_path, 60_000)
    assert len(text) < 1_000_000
    with shown(watch, written(tmp_path, text)) as page:
        squares = page.evaluate("window.fellspanPage.data.squares.counts")
        assert sum(map(sum, squares)) == 60_000
        assert len(squares) <= candidates_page.SQUARES**2
        assert page.locator("text=a square stands for all in it").count() == 1
        assert page.evaluate("document.querySelector('#more').textContent") == "Show more (1800 left)"


def test_twenty_thousand_places_still_have_a_dot_each(tmp_path: Path) -> None:
    text = made_page(tmp_path, candidates_page.MOST_DOTS)
    assert '"squares":null' in text
    assert len(text) < 2_500_000
    said = (
        "6 668 of 20 000 places have at least one clear hub, 3 334 of them on bare ground only; "
        "for 7 of the 6 668 the signal meets what is asked too."
    )
    assert said in text.replace("\u00a0", " ")


@pytest.mark.browser
@pytest.mark.slow
def test_the_page_of_a_real_run(tmp_path: Path, watch: Any, monkeypatch: pytest.MonkeyPatch) -> None:
    made_runs.write_inputs(tmp_path, places=12)
    monkeypatch.chdir(tmp_path)
    assert run(made_runs.arguments()) == 0
    with shown(watch, tmp_path / "out" / "index.html") as page:
        assert page.locator("#place-list tbody tr").count() == 12
        assert page.locator(".leaflet-image-layer").count() == 1
