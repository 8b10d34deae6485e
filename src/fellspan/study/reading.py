"""Reads a study file: TOML text in, a validated `Study` in SI out, or a StudyError that says what to mend.

Opens the study file alone. Rasters are opened by terrain; here it is only seen that they exist.
"""

import tomllib
from pathlib import Path
from typing import Any

from pydantic import ValidationError

from fellspan.errors import StudyError
from fellspan.planning.inputs import Study
from fellspan.study.assembling import assemble
from fellspan.study.messages import problems_of, raise_problems
from fellspan.study.schema import StudyFile
from fellspan.study.schema_links import SiteTable


def load_study(path: str | Path) -> Study:
    """Read a study file; paths in it are relative to the file.

    Raises
    ------
    StudyError
        The file is missing, empty, not TOML, or has an unknown key, a wrong value or a missing one.
    """
    path = Path(path)
    return read_study(_text_of(path), path=path)


def read_study(text: str, *, path: Path) -> Study:
    """Read the text of a study file that stands, or is to stand, at `path`."""
    data = _table_of(text, path)
    try:
        study_file = StudyFile.model_validate(data)
    except ValidationError as error:
        raise_problems(path.name, problems_of(error.errors(include_url=False), data))
    return assemble(study_file, path=path)


def stated_site(path: Path, name: str) -> SiteTable | None:
    """The table of a site of a valid study file, as it stands, without what links state for themselves; None without one."""
    tables = StudyFile.model_validate(_table_of(_text_of(path), path))
    return next((site for site in tables.site if site.name == name), None)


def study_table(path: Path) -> dict[str, Any]:
    """The tables of a study file as they stand, not yet checked; a StudyError where it cannot be read."""
    return _table_of(_text_of(path), path)


def _text_of(path: Path) -> str:
    if path.is_dir():
        raise StudyError(f"{path} is a folder", "name the study file in it, which ends in .toml")
    try:
        raw = path.read_bytes()
    except FileNotFoundError:
        raise StudyError(f"there is no study file {path}", "fellspan init writes a starter") from None
    try:
        return raw.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        raise StudyError(
            f"{path.name}: not a text file in UTF-8 (byte {error.start + 1} is {raw[error.start]:#04x})",
            "a study file is plain text in TOML; fellspan init writes a starter",
        ) from None


def _table_of(text: str, path: Path) -> dict[str, Any]:
    if not text.strip():
        raise StudyError(f"{path.name}: the study file is empty", "fellspan init writes a starter to fill in")
    try:
        return tomllib.loads(text)
    except tomllib.TOMLDecodeError as error:
        raise StudyError(
            f"{path.name}: not valid TOML: {error}",
            'a value stands as key = "text" or key = 1.5, a table as [terrain], one of several as [[site]]',
        ) from None
    except RecursionError:
        raise StudyError(f"{path.name}: not valid TOML: brackets are nested too deep") from None
