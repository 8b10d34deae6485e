"""What `fellspan candidates` does: reads, runs, writes, prints. Imports the engine, so the command imports it when it runs."""

import sys
import threading
import time
from dataclasses import dataclass
from pathlib import Path
from typing import Final

import typer

from fellspan.cli.candidates_page import counted, page_lines
from fellspan.cli.layout import WIDTH, Ink, colours_wanted, cut, printable
from fellspan.cli.stopping import stopping_at_signals
from fellspan.cli.telling import tell
from fellspan.errors import UsageError
from fellspan.exports.candidates import JUDGED_ALONE, summary_json
from fellspan.exports.candidates_folder import CHOSEN, NAMES, Lines, drop_parts, write_run
from fellspan.planning.planner import open_terrain
from fellspan.quantities import AntennaHeight
from fellspan.runs.inputs import files_alike, run_facts
from fellspan.runs.listing import PairList
from fellspan.runs.run import RunPlan, finish_run, locked, open_store
from fellspan.study.far_places import refuse_far_places
from fellspan.study.screening_study import Screening, Wishes, load_screening

_BAR: Final = 20
_EVERY_S: Final = 0.2


@dataclass(frozen=True, slots=True, kw_only=True)
class Asked:
    """The command line, parsed."""

    study: Path
    hubs: Path
    places: Path
    pairs: Path | None
    out: Path
    best: int
    lines: Lines
    fresh: bool
    scheduler: str | None
    chunk: int
    threads: int | None
    as_json: bool
    wishes: Wishes


def run_candidates(asked: Asked) -> None:
    """Run, or go on with, a run over pairs; then write its files and print its summary."""
    progress = _Progress()

    def stopped() -> None:
        if progress.at_work:
            drop_parts(asked.out)
        progress.clear()
        tell(f"fellspan: {progress.stopped_text(fresh=asked.fresh)}")

    with stopping_at_signals(stopped):
        _run(asked, progress)


def _run(asked: Asked, progress: "_Progress") -> None:
    screening = load_screening(
        asked.study, hubs=asked.hubs, places=asked.places, pairs=asked.pairs, wishes=asked.wishes
    )
    with open_terrain(screening.study) as terrain:  # a raster that cannot be read is told before anything is made
        refuse_far_places(screening.candidates, screening.hub_rows, screening.place_rows, terrain)
        notes = tuple(dict.fromkeys((JUDGED_ALONE, *screening.notes, *terrain.notes)))
    plan = _plan(screening, asked)
    with (
        locked(asked.out),
        open_store(asked.out, plan, fresh=asked.fresh, outputs=NAMES) as store,
        progress,
    ):
        finish_run(store, plan, watcher=progress, note=lambda note: tell(f"fellspan: {note}"))
        summary = write_run(
            asked.out, store, screening, keep=asked.best, lines=asked.lines, notes=notes, tell=progress.writing
        )
    if asked.as_json:
        typer.echo(summary_json(summary, title=screening.study.title, notes=notes), nl=False)
        return
    lines = page_lines(
        summary,
        title=screening.study.title,
        notes=notes,
        out=asked.out,
        chosen=(asked.out / CHOSEN).exists(),
        ink=Ink(colours=colours_wanted()),
    )
    typer.echo("\n".join(lines))


def _plan(screening: Screening, asked: Asked) -> RunPlan:
    candidates = screening.candidates
    pairs = PairList(
        hubs=candidates.hubs,
        places=candidates.places,
        listed=screening.pairs,
        min_distance_m=screening.min_distance_m,
        max_distance_m=screening.max_distance_m,
        chunk_pairs=asked.chunk,
    )
    count = pairs.count()
    if not count.pairs:
        raise UsageError(
            "no pair of a hub and a place is left to judge",
            f"{len(candidates.hubs.name)} hubs and {len(candidates.places.name)} places were read; look at the distances asked",
        )
    files = {"hubs": asked.hubs, "places": asked.places, **({} if asked.pairs is None else {"pairs": asked.pairs})}
    facts, _ = run_facts(
        screening.study,
        templates=screening.templates,
        files=files,
        options=_options(screening, asked),
        count=count,
    )
    return RunPlan(
        study=screening.study,
        candidates=candidates,
        pairs=pairs,
        facts=facts,
        files=files_alike(screening.study),
        scheduler=asked.scheduler,
        threads=asked.threads,
    )


def _options(screening: Screening, asked: Asked) -> dict[str, str]:
    """What was asked on the command line and shapes the results."""
    wishes = asked.wishes
    given = {
        "--radio": wishes.radio,
        "--hub-antenna": wishes.antenna_hub,
        "--place-antenna": wishes.antenna_place,
        "--hub-height": _height_words(wishes.height_hub),
        "--place-height": _height_words(wishes.height_place),
        "--crs": wishes.crs,
        "--min-distance": f"{screening.min_distance_m:g} m",
        "--max-distance": f"{screening.max_distance_m:g} m",
        "--chunk": str(asked.chunk),
    }
    return {name: value for name, value in given.items() if value is not None}


def _height_words(height: AntennaHeight | None) -> str | None:
    return None if height is None else f"{height.height_m!r} m above {height.reference}"


class _Progress:
    """A line on standard error with rate and time left; nothing where nobody watches."""

    def __init__(self) -> None:
        self._watched = sys.stderr.isatty()
        self._lock = threading.Lock()
        self._all = self._before = self._now = self._kept = 0
        self._started = self._told = 0.0
        self.at_work = False
        """Whether the folder is ours."""

    def __enter__(self) -> "_Progress":
        self.at_work = True
        return self

    def __exit__(self, *_: object) -> None:
        self.clear()

    def begin(self, pairs: int, done: int) -> None:
        """So many pairs in all, and so many of them from earlier."""
        self._all, self._before, self._kept, self._started = pairs, done, done, time.monotonic()
        self._show(self._started)

    def done(self, pairs: int) -> None:
        """So many pairs more are worked out; may be called by any thread."""
        with self._lock:
            self._now += pairs
            now = time.monotonic()
            if now - self._told >= _EVERY_S:
                self._show(now)

    def kept(self, pairs: int) -> None:
        """So many pairs more are in the store."""
        self._kept += pairs

    def writing(self, name: str) -> None:
        """A file is being written."""
        self._put(f"writing {name}")

    def stopped_text(self, *, fresh: bool) -> str:
        """What is kept of a run that is stopped now, and how to go on."""
        if not self.at_work:
            return "stopped before any pair was judged"
        again = "without --fresh it" if fresh else "the same command"
        if self._all and self._kept == self._all:
            return f"stopped; all {counted(self._all)} pairs kept; {again} writes the files"
        return f"stopped; {counted(self._kept)} of {counted(self._all)} pairs kept; {again} goes on"

    def _show(self, now: float) -> None:
        self._told = now
        self._put(progress_text(self._all, self._before, self._now, seconds=now - self._started))

    def _put(self, text: str) -> None:
        if self._watched:
            sys.stderr.write(f"\r\x1b[K{cut(printable(text), WIDTH - 1)}")
            sys.stderr.flush()

    def clear(self) -> None:
        """Take the line away."""
        if self._watched:
            sys.stderr.write("\r\x1b[K")
            sys.stderr.flush()


def progress_text(pairs: int, before: int, now: int, *, seconds: float) -> str:
    """Bar, count, rate and time left; the rate counts what this process did."""
    done = before + now
    filled = _BAR * done // max(pairs, 1)
    text = f"judging [{'#' * filled}{'.' * (_BAR - filled)}] {done}/{pairs} pairs"
    if now and seconds > 0.0:
        rate = now / seconds
        text += f", {rate:.3g}/s, {duration_words((pairs - done) / rate)} left"
    return text


def duration_words(seconds: float) -> str:
    """'40 s', '12 min', '3 h 20 min'."""
    if seconds < 90.0:
        return f"{seconds:.0f} s"
    minutes = round(seconds / 60.0)
    return f"{minutes} min" if minutes < 90 else f"{minutes // 60} h {minutes % 60:02d} min"
