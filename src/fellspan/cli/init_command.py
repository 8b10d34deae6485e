"""`fellspan init`: write a starter study file, or the JSON Schema for editors. Never overwrites."""

import datetime as dt
from pathlib import Path
from typing import Annotated

import typer

from fellspan.errors import UsageError

STARTER_NAME = "study.toml"


def init_command(
    target: Annotated[Path, typer.Argument(help="Folder or .toml file to write.", show_default="this folder")] = Path(),
    schema: Annotated[
        bool, typer.Option("--schema", help="Write the JSON Schema for editors instead of the starter.")
    ] = False,
) -> None:
    """Write a commented starter study file."""
    if schema:
        from fellspan.study.json_schema import SCHEMA_FILE_NAME, study_json_schema_text

        path, text = _path(target, SCHEMA_FILE_NAME, ".json"), study_json_schema_text()
    else:
        from fellspan.study.starter import starter_text

        path, text = _path(target, STARTER_NAME, ".toml"), starter_text(date=dt.date.today())
    write_new(path, text)
    typer.echo(f"wrote {path}")
    if not schema:
        typer.echo(f"fill it in, then run: fellspan plan {path}")


def write_new(path: Path, text: str) -> None:
    """Write a file that must not exist yet, whole or not at all."""
    if not path.parent.is_dir():
        raise UsageError(f"there is no folder {path.parent}", "make it first, or name another place")
    try:
        stream = path.open("x", encoding="utf-8", newline="\n")
    except FileExistsError:
        raise UsageError(f"{path} exists and is left as it is", "name another file, or move it away first") from None
    try:
        with stream:
            stream.write(text)
    except BaseException:
        path.unlink(missing_ok=True)
        raise


def _path(target: Path, name: str, suffix: str) -> Path:
    """A folder takes the usual name; anything else must end as such files do."""
    if target.is_dir():
        return target / name
    if target.suffix.lower() != suffix:
        raise UsageError(
            f"{target} is no folder, and does not end in {suffix}", f"name a folder, or a file that ends in {suffix}"
        )
    return target
