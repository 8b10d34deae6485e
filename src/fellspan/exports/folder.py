"""The report folder: pages and exports, written whole or not at all; knows nothing of what the files hold.

A run first writes every file into a staging folder inside the target. Only when all are there does it move them into place,
and puts the old ones back if that fails. `results.json` leaves first and returns last: where it stands, the report is
whole. The folder is locked meanwhile. A list of what Fellspan wrote lies beside the files: only those are ever replaced or
removed.
"""

import json
import os
import re
import shutil
from collections.abc import Callable, Iterable
from pathlib import Path
from typing import Final

from filelock import FileLock, Timeout

from fellspan.errors import OutputError
from fellspan.exports.coordination import coordination_csv
from fellspan.exports.geo import links_geojson
from fellspan.exports.kml import links_kml
from fellspan.exports.results_json import results_text
from fellspan.exports.survey import survey_csv, survey_gpx, survey_points
from fellspan.exports.tables import links_csv, profile_csv, profile_name
from fellspan.exports.text import utf8
from fellspan.planning.plan import StudyPlan
from fellspan.planning.relay_result import RelayResult
from fellspan.report.naming import crew_name, page_name

Progress = Callable[[int, int, str], None]
"""Called with the number of files done, the number of all, and the name of the one in hand."""

RESULTS: Final = "results.json"
LOCK_NAME: Final = ".fellspan.lock"
LIST_NAME: Final = ".fellspan-files.json"
STAGING_NAME: Final = ".fellspan-new"
ASIDE_NAME: Final = ".fellspan-old"
LOCK_WAIT_S: Final = 5.0
_TABLES: Final = ("links.csv", "links.geojson", "links.kml", "survey.csv", "survey.gpx", "coordination.csv")

_PLAIN_NAME = re.compile(r"[A-Za-z0-9][A-Za-z0-9._-]*")


def write_folder(
    plan: StudyPlan, out_dir: str | Path, *, progress: Progress | None = None, processes: int = 1
) -> tuple[str, ...]:
    """Write the report of a plan into a folder, which is made where it does not exist.

    Returns
    -------
    names
        Names of the files in the folder, `results.json` last.

    Raises
    ------
    OutputError
        The target is a file, cannot be written, is being written by another run, or holds a file of the same name that
        Fellspan did not write. An old report is then still there, unchanged.
    """
    folder = Path(out_dir)
    texts = report_files(plan, progress=progress, processes=processes)
    write_files(texts, folder)
    return tuple(texts)


def report_files(
    plan: StudyPlan, *, progress: Progress | None = None, relays: RelayResult | None = None, processes: int = 1
) -> dict[str, str]:
    """File names and texts of the whole report, `results.json` last; the rest as `report.pages.render_pages` takes it."""
    from fellspan.report.drawing_files import drawing_files
    from fellspan.report.pages import render_pages

    points = survey_points(plan)
    makers: dict[str, Callable[[], str]] = {
        "links.csv": lambda: links_csv(plan),
        "links.geojson": lambda: links_geojson(plan),
        "links.kml": lambda: links_kml(plan),
        "survey.csv": lambda: survey_csv(points),
        "survey.gpx": lambda: survey_gpx(points, title=plan.study.title, growth_years=plan.study.growth_years),
    }
    for index, linked in enumerate(plan.links):
        makers[profile_name(index, linked.result.name)] = lambda linked=linked: profile_csv(linked)  # type: ignore[misc]
    coordination = coordination_csv(plan)
    if coordination is not None:
        makers["coordination.csv"] = lambda: coordination
    makers[RESULTS] = lambda: results_text(plan)
    pages = len(plan.links) + 1
    total = pages + len(makers)

    def tell(done: int, name: str) -> None:
        if progress is not None:
            progress(done, total, name)

    texts = render_pages(
        plan, progress=lambda done, _, name: tell(min(done, pages), name), relays=relays, processes=processes
    )
    for page, text in list(texts.items()):
        if page.startswith("link-"):
            texts |= drawing_files(page, text)
    for done, (name, make) in enumerate(makers.items(), start=pages):
        tell(done, name)
        texts[name] = make()
    tell(total, "")
    return texts


def write_files(texts: dict[str, str], folder: Path) -> None:
    """Put files, `results.json` among them, into a folder: all or none; see `write_folder` for the errors."""
    wrong = [name for name in texts if not _PLAIN_NAME.fullmatch(name)]
    if wrong or RESULTS not in texts:
        raise ValueError(f"not a report: {wrong or RESULTS!r}")
    check_target(folder)
    try:
        if not (folder / ASIDE_NAME).exists():
            # Before the lock: a folder that is refused gets no file of ours, the lock included.
            _refuse_foreign(texts, folder, _ours(texts, folder))
        folder.mkdir(parents=True, exist_ok=True)
        with FileLock(folder / LOCK_NAME, timeout=LOCK_WAIT_S):
            _recover(folder)
            ours = _ours(texts, folder)
            _refuse_foreign(texts, folder, ours)
            _stage(texts, folder)
            _swap(texts, folder, ours)
    except Timeout:
        raise OutputError(
            f"'{folder}' is being written by another run of Fellspan (waited {LOCK_WAIT_S:g} s)",
            "wait until it has finished, or give another folder",
        ) from None
    except OutputError:
        raise
    except OSError as error:
        raise OutputError(
            f"the report cannot be written to '{folder}': {error.strerror or error}",
            "check that the disk has room and that you may write there; an earlier report there is unchanged",
        ) from error


def check_folder(plan: StudyPlan, out_dir: str | Path) -> tuple[str, ...]:
    """See that a report of this plan may go into a folder, before anything is printed or written; writes nothing.

    Returns
    -------
    lost
        Names of links of which the report that stands there has pages, and this one will not.

    Raises
    ------
    OutputError
        As `write_folder`.
    """
    folder = Path(out_dir)
    check_files(report_names(plan), folder)
    kept = {linked.result.name for linked in plan.links}
    return tuple(name for name in links_in(folder) if name not in kept)


def check_files(names: Iterable[str], folder: Path) -> None:
    """See that files of these names may go into a folder: an OutputError where one is there that Fellspan did not write."""
    check_target(folder)
    listed = tuple(names)
    if not (folder / ASIDE_NAME).exists():
        _refuse_foreign(listed, folder, _ours(listed, folder))


def check_target(folder: Path) -> None:
    """See that a folder can be made or written to; an OutputError otherwise."""
    if folder.exists() and not folder.is_dir():
        raise OutputError(f"'{folder}' is a file, not a folder", "give a folder for the report, or a name that is free")
    nearest = next((path for path in (folder, *folder.absolute().parents) if path.exists()), folder)
    if not nearest.is_dir():
        raise OutputError(f"the report cannot be written to '{folder}': '{nearest}' is a file", "give another folder")
    if not os.access(nearest, os.W_OK):
        raise OutputError(f"the report cannot be written to '{folder}': no permission", "give another folder")


def report_names(plan: StudyPlan) -> tuple[str, ...]:
    """Names of the files that the report of a plan may have."""
    from fellspan.report.drawing_files import drawing_names

    links = [linked.result.name for linked in plan.links]
    pages = [page_name(index, name) for index, name in enumerate(links)]
    crews = [crew_name(index, name, end) for index, name in enumerate(links) for end in ("a", "b")]
    profiles = [profile_name(index, name) for index, name in enumerate(links)]
    drawings = [name for page in pages for name in drawing_names(page)]
    return ("index.html", *pages, *crews, *drawings, *_TABLES, *profiles, RESULTS)


def links_in(folder: Path) -> tuple[str, ...]:
    """Names of the links that the report in a folder holds; none where there is no report of ours."""
    try:
        found = json.loads((folder / RESULTS).read_text(encoding="utf-8"))
        return tuple(str(link["name"]) for link in (*found["links"], *found["failures"]) if "fellspan" in found)
    except (OSError, ValueError, KeyError, TypeError, RecursionError):
        return ()


def _ours(texts: Iterable[str], folder: Path) -> set[str]:
    """Names in the folder that earlier runs wrote.

    Where the list of them is lost, as when a report was copied without hidden files, but `results.json` is one of ours, the
    files of this run's names count as ours, and no other is touched.
    """
    listed = _listed(folder)
    if listed:
        return listed
    try:
        found = json.loads((folder / RESULTS).read_text(encoding="utf-8"))
    except (OSError, ValueError, RecursionError):
        return set()
    return set(texts) if isinstance(found, dict) and {"schema", "fellspan", "links"} <= found.keys() else set()


def _listed(folder: Path) -> set[str]:
    try:
        names = json.loads((folder / LIST_NAME).read_text(encoding="utf-8"))["files"]
    except (OSError, ValueError, KeyError, TypeError, RecursionError):
        return set()
    if not isinstance(names, list):
        return set()
    return {name for name in names if isinstance(name, str) and _PLAIN_NAME.fullmatch(name)}


def _refuse_foreign(texts: Iterable[str], folder: Path, ours: set[str]) -> None:
    for name in texts:
        target = folder / name
        if target.is_dir() and not target.is_symlink():
            raise OutputError(
                f"'{target}' is a folder, and the report needs a file of that name", "give another folder"
            )
        if name not in ours and os.path.lexists(target):
            raise OutputError(
                f"'{target}' is there already and was not written by Fellspan",
                "give another folder for the report, or move that file away",
            )


def _write_text(path: Path, text: str) -> None:
    with path.open("w", encoding="utf-8", newline="\n") as file:
        file.write(utf8(text))
        file.flush()
        os.fsync(file.fileno())


def _stage(texts: dict[str, str], folder: Path) -> None:
    staging = folder / STAGING_NAME
    shutil.rmtree(staging, ignore_errors=True)
    staging.mkdir()
    try:
        for name, text in texts.items():
            _write_text(staging / name, text)
        _write_text(staging / LIST_NAME, _list_text(texts))
    except BaseException:
        shutil.rmtree(staging, ignore_errors=True)
        raise


def _list_text(names: dict[str, str]) -> str:
    return json.dumps({"written_by": "Fellspan", "files": sorted(names)}, indent=1) + "\n"


def _swap(texts: dict[str, str], folder: Path, ours: set[str]) -> None:
    """Move the old files aside, `results.json` first, and the new ones in, `results.json` last."""
    staging, aside = folder / STAGING_NAME, folder / ASIDE_NAME
    try:
        aside.mkdir()
        for name in [RESULTS, *sorted(ours - {RESULTS}), LIST_NAME]:
            if os.path.lexists(folder / name):
                _move(folder / name, aside / name)
        for name in [LIST_NAME, *(name for name in texts if name != RESULTS), RESULTS]:
            _move(staging / name, folder / name)
    except BaseException:
        _recover(folder)
        shutil.rmtree(staging, ignore_errors=True)
        raise
    _clear_up(folder)


def _move(source: Path, target: Path) -> None:
    source.replace(target)


def _clear_up(folder: Path) -> None:
    """Drop what is left beside a whole report; `results.json` of the new one is out of the staging folder by then."""
    shutil.rmtree(folder / STAGING_NAME, ignore_errors=True)
    shutil.rmtree(folder / ASIDE_NAME, ignore_errors=True)


def _recover(folder: Path) -> None:
    """After a run that stopped while moving: finish it if all was in place, else put the old report back.

    May itself be stopped at any step and run again. New files return to the staging folder, their list last: while it is
    there, nothing new is left in the folder.
    """
    staging, aside = folder / STAGING_NAME, folder / ASIDE_NAME
    if not aside.is_dir():
        return
    if not (staging / RESULTS).exists():
        _clear_up(folder)
        return
    if not (staging / LIST_NAME).exists():
        for name in sorted(_listed(folder)):
            if not (staging / name).exists() and os.path.lexists(folder / name):
                (folder / name).replace(staging / name)
        (folder / LIST_NAME).replace(staging / LIST_NAME)
    for entry in sorted(aside.iterdir(), key=lambda entry: (entry.name == RESULTS, entry.name)):
        entry.replace(folder / entry.name)
    aside.rmdir()
