"""The report folder is written whole or not at all, locked meanwhile, and never touches what is not its own."""

import errno
import json
import multiprocessing
import os
import shutil
import sys
import types
from pathlib import Path

import pytest
from exports_made_plan import made_link, made_plan
from filelock import FileLock

from fellspan.errors import OutputError
from fellspan.exports import folder as folder_module
from fellspan.exports.folder import LIST_NAME, LOCK_NAME, RESULTS, Progress, write_files, write_folder
from fellspan.planning.plan import StudyPlan

OLD = {
    "index.html": "old index",
    "link-01-a.html": "old a",
    "link-02-b.html": "old b",
    "links.csv": "old",
    RESULTS: "{}",
}
NEW = {"index.html": "new index", "link-01-a.html": "new a", "links.csv": "new", "survey.csv": "new", RESULTS: "{ }"}


def visible(folder: Path) -> dict[str, str]:
    return {path.name: path.read_text() for path in folder.iterdir() if not path.name.startswith(".")}


def hidden(folder: Path) -> set[str]:
    return {path.name for path in folder.iterdir() if path.name.startswith(".")}


@pytest.fixture(autouse=True)
def no_waiting_for_the_disk(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(os, "fsync", lambda file: None)


@pytest.fixture
def pages(monkeypatch: pytest.MonkeyPatch) -> None:
    """Stands in for the pages, which are no business of the folder's."""
    module = types.ModuleType("fellspan.report.pages")

    def render_pages(plan: StudyPlan, *, progress: Progress | None = None, **more: object) -> dict[str, str]:
        if progress is not None:
            progress(0, 1 + len(plan.links), "index.html")
        return {"index.html": "<p>", **{f"link-{i:02d}.html": "" for i, _ in enumerate(plan.links)}}

    module.render_pages = render_pages  # type: ignore[attr-defined]
    monkeypatch.setitem(sys.modules, "fellspan.report.pages", module)


@pytest.mark.usefixtures("pages")
def test_the_folder_holds_pages_and_all_exports_and_says_so(tmp_path: Path) -> None:
    told: list[tuple[int, int, str]] = []
    plan = made_plan(made_link(), made_link(name="second"))
    names = write_folder(plan, tmp_path / "new" / "report", progress=lambda *step: told.append(step))
    assert set(names) == set(visible(tmp_path / "new" / "report"))
    assert names[-1] == RESULTS
    assert set(names) == {
        "index.html",
        "link-00.html",
        "link-01.html",
        "links.csv",
        "links.geojson",
        "links.kml",
        "survey.csv",
        "survey.gpx",
        "profile-01-quay-tower.csv",
        "profile-02-second.csv",
        RESULTS,
    }
    assert json.loads((tmp_path / "new" / "report" / RESULTS).read_text())["schema"] == 1
    assert [done for done, _, _ in told] == [0, *range(3, 12)]
    assert {total for _, total, _ in told} == {len(names)}
    assert hidden(tmp_path / "new" / "report") <= {LIST_NAME, LOCK_NAME}


def test_stale_pages_go_and_foreign_files_stay(tmp_path: Path) -> None:
    write_files(OLD, tmp_path)
    (tmp_path / "notes.txt").write_text("mine")
    (tmp_path / "link-09-mine.html").write_text("mine too")
    write_files(NEW, tmp_path)
    assert visible(tmp_path) == {**NEW, "notes.txt": "mine", "link-09-mine.html": "mine too"}


def test_a_foreign_file_of_the_same_name_is_not_overwritten(tmp_path: Path) -> None:
    (tmp_path / "index.html").write_text("my home page")
    with pytest.raises(OutputError, match=r"index\.html.*not written by Fellspan"):
        write_files(NEW, tmp_path)
    assert visible(tmp_path) == {"index.html": "my home page"}


def test_a_folder_of_the_same_name_is_refused(tmp_path: Path) -> None:
    (tmp_path / "links.csv").mkdir()
    with pytest.raises(OutputError, match=r"links\.csv.*is a folder"):
        write_files(NEW, tmp_path)


def test_a_report_copied_without_its_hidden_list_can_be_written_anew(tmp_path: Path) -> None:
    results = json.dumps({"schema": 1, "fellspan": "0.1.0", "links": []})
    for name in OLD:
        (tmp_path / name).write_text(results if name == RESULTS else "copied")
    write_files(NEW, tmp_path)
    assert visible(tmp_path) == {**NEW, "link-02-b.html": "copied"}


@pytest.mark.parametrize(
    "text", ["[]", "{", '{"files": 3}', '{"files": ["../outside.txt", 4, ".hidden", "sub/x"]}', "[" * 9000]
)
def test_a_spoilt_list_removes_nothing(tmp_path: Path, text: str) -> None:
    (tmp_path / "outside.txt").write_text("mine")
    inside = tmp_path / "report"
    inside.mkdir()
    (inside / LIST_NAME).write_text(text)
    (inside / ".hidden").write_text("mine")
    write_files(NEW, inside)
    assert (tmp_path / "outside.txt").read_text() == "mine"
    assert (inside / ".hidden").read_text() == "mine"
    assert visible(inside) == NEW


@pytest.mark.parametrize("name", ["../x.html", "a/b.html", ".hidden", "", "c:\\x", "-x"])
def test_only_plain_names_are_written(tmp_path: Path, name: str) -> None:
    with pytest.raises(ValueError, match="not a report"):
        write_files({name: "x", RESULTS: "{}"}, tmp_path)
    assert not list(tmp_path.iterdir())


def test_a_target_that_is_a_file_is_refused(tmp_path: Path) -> None:
    (tmp_path / "report").write_text("a file")
    with pytest.raises(OutputError, match="is a file, not a folder") as caught:
        write_files(NEW, tmp_path / "report")
    assert caught.value.exit_code == 4
    with pytest.raises(OutputError, match="cannot be written"):
        write_files(NEW, tmp_path / "report" / "below")


def fail_at(monkeypatch: pytest.MonkeyPatch, name: str, step: int, error: BaseException) -> list[int]:
    """Make the `step`-th call of a function of the folder module raise instead of working."""
    original, calls = getattr(folder_module, name), [0]

    def counted(*arguments: object) -> None:
        calls[0] += 1
        if calls[0] == step:
            raise error
        original(*arguments)

    monkeypatch.setattr(folder_module, name, counted)
    return calls


def _raised_by_writing(folder: Path) -> BaseException | None:
    try:
        write_files(NEW, folder)
    except (OutputError, KeyboardInterrupt) as error:
        return error
    return None


@pytest.mark.parametrize("first", [{}, OLD], ids=["empty folder", "old report"])
@pytest.mark.parametrize("error", [OSError(errno.ENOSPC, "No space left on device"), KeyboardInterrupt()])
@pytest.mark.parametrize("function", ["_write_text", "_move"])
def test_a_failure_at_any_step_leaves_the_old_report_whole(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, first: dict[str, str], error: BaseException, function: str
) -> None:
    steps = 0
    for step in range(1, 40):
        folder = tmp_path / str(step)
        if first:
            write_files(first, folder)
        before = hidden(folder) if first else {LOCK_NAME}
        with monkeypatch.context() as patch:
            calls = fail_at(patch, function, step, error)
            raised = _raised_by_writing(folder)
            if calls[0] < step:
                assert raised is None
                assert visible(folder) == NEW
                break
        steps = step
        assert isinstance(raised, OutputError if isinstance(error, OSError) else KeyboardInterrupt)
        assert visible(folder) == first
        assert hidden(folder) <= before | {LOCK_NAME}
        write_files(NEW, folder)
        assert visible(folder) == NEW
    assert steps >= len(NEW)


def _write_and_die(folder: str, step: int, function: str) -> None:
    original, calls = getattr(folder_module, function), [0]

    def counted(*arguments: object) -> None:
        calls[0] += 1
        if calls[0] == step:
            os._exit(9)
        original(*arguments)

    setattr(folder_module, function, counted)
    write_files(NEW, Path(folder))


@pytest.mark.parametrize("step", [1, 2, 4, 7, 8, 10, 12])
def test_after_a_kill_results_json_stands_only_beside_a_whole_report(tmp_path: Path, step: int) -> None:
    write_files(OLD, tmp_path)
    process = multiprocessing.get_context("fork" if sys.platform == "linux" else "spawn").Process(
        target=_write_and_die, args=(str(tmp_path), step, "_move")
    )
    process.start()
    process.join()
    assert process.exitcode == 9
    found = visible(tmp_path)
    if RESULTS in found:
        assert found in (OLD, NEW)
    copied = shutil.copytree(tmp_path, tmp_path.with_name(f"killed-at-{step}"))
    write_files(NEW, copied)  # the next run needs no help
    assert visible(copied) == NEW
    assert hidden(copied) <= {LIST_NAME, LOCK_NAME}
    (tmp_path / "notes.txt").write_text("mine")
    folder_module._recover(tmp_path)
    assert visible(tmp_path) == {**OLD, "notes.txt": "mine"}
    write_files(NEW, tmp_path)
    assert visible(tmp_path) == {**NEW, "notes.txt": "mine"}
    assert hidden(tmp_path) <= {LIST_NAME, LOCK_NAME}


def test_a_kill_before_clearing_up_keeps_the_new_report(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    write_files(OLD, tmp_path)
    with monkeypatch.context() as patch:
        patch.setattr(folder_module, "_clear_up", lambda folder: None)
        write_files(NEW, tmp_path)
    folder_module._recover(tmp_path)
    assert visible(tmp_path) == NEW
    assert hidden(tmp_path) <= {LIST_NAME, LOCK_NAME}


def test_a_second_run_waits_briefly_and_then_gives_up(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    write_files(OLD, tmp_path)
    monkeypatch.setattr(folder_module, "LOCK_WAIT_S", 0.05)
    with FileLock(tmp_path / LOCK_NAME), pytest.raises(OutputError, match="being written by another run"):
        write_files(NEW, tmp_path)
    assert visible(tmp_path) == OLD
    write_files(NEW, tmp_path)
    assert visible(tmp_path) == NEW


def test_a_refused_folder_is_left_without_a_trace(tmp_path: Path) -> None:
    (tmp_path / "index.html").write_text("mine")
    with pytest.raises(OutputError, match="not written by Fellspan"):
        write_files({**NEW, "index.html": "ours"}, tmp_path)
    assert [path.name for path in tmp_path.iterdir()] == ["index.html"]
