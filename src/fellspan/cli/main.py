"""The `fellspan` command: registers the commands and turns every ending into an exit code and a few clear lines.

0 done, 1 a required verdict was not reached, 2 input, 3 a bug of ours, 4 files or disk, 130 interrupted.
Imports nothing heavy: the commands load the engine when they run.
"""

import io
import os
import re
import sys
from collections.abc import Sequence
from typing import Annotated

import typer

from fellspan import __version__
from fellspan.cli.accept_command import accept_command
from fellspan.cli.antenna_command import antenna_command
from fellspan.cli.around_command import around_command
from fellspan.cli.candidates_command import candidates_command
from fellspan.cli.equip_command import equip_command
from fellspan.cli.heights_command import heights_command
from fellspan.cli.init_command import init_command
from fellspan.cli.layout import message_lines
from fellspan.cli.plan_command import plan_command
from fellspan.cli.relay_command import relay_command
from fellspan.cli.sight_command import sight_command
from fellspan.cli.terrain_command import terrain_command
from fellspan.errors import FellspanError

OK, INPUT, BUG, FILES, INTERRUPTED = 0, 2, 3, 4, 130
_NEGATIVE_COORDINATE = re.compile(r"""-\s*\.?\d[\d\s.,;:°'"nsew-]*""", re.IGNORECASE)

app = typer.Typer(
    name="fellspan",
    help="Plan outdoor point-to-point radio links over real terrain.",
    rich_markup_mode=None,
    pretty_exceptions_enable=False,
    add_completion=False,
)


def _show_version(wanted: bool) -> None:
    if wanted:
        typer.echo(f"fellspan {__version__}")
        raise typer.Exit()


@app.callback()
def _options(
    version: Annotated[
        bool, typer.Option("--version", callback=_show_version, is_eager=True, help="Show the version.")
    ] = False,
) -> None:
    """Plan outdoor point-to-point radio links over real terrain."""


app.command("sight")(sight_command)
app.command("heights")(heights_command)
app.command("equip")(equip_command)
app.command("plan")(plan_command)
app.command("candidates")(candidates_command)
app.command("around")(around_command)
app.command("relay")(relay_command)
app.command("terrain")(terrain_command)
app.command("antenna")(antenna_command)
app.command("accept")(accept_command)
app.command("init")(init_command)


def main() -> None:
    """Entry point of the `fellspan` command."""
    sys.exit(run(sys.argv[1:]))


def run(arguments: Sequence[str]) -> int:
    """Run one command and return its exit code; no exception gets out."""
    _write_what_can_be_written()
    try:
        code = app(args=_with_signs_kept(arguments or ("--help",)), prog_name="fellspan", standalone_mode=False)
        sys.stdout.flush()
    except FellspanError as error:
        return _complain(f"fellspan: {error}", error.exit_code)
    except (KeyboardInterrupt, typer.Abort):
        code = INTERRUPTED
    except BrokenPipeError:
        return _reader_left()
    except SystemExit as ending:
        # The parser ends by itself when a pipe breaks, and leaves its own wrapper in the place of the stream.
        return _reader_left() if type(sys.stdout).__name__ == "PacifyFlushWrapper" else int(ending.code or OK)
    except OSError as error:
        return _complain(f"fellspan: {_about_files(error)}", FILES)
    except Exception as error:
        return _about_unexpected(error)
    if code == INTERRUPTED:
        return _complain("\nfellspan: interrupted", INTERRUPTED)
    return code if isinstance(code, int) else OK


def _write_what_can_be_written() -> None:
    """A name with letters that the terminal's encoding lacks is shown with question marks, not as a crash."""
    for stream in (sys.stdout, sys.stderr):
        if isinstance(stream, io.TextIOWrapper):
            stream.reconfigure(errors="replace")


def _with_signs_kept(arguments: Sequence[str]) -> list[str]:
    """Arguments in which a coordinate's leading minus is not taken for an option: a blank before it is enough."""
    return [f" {argument}" if _NEGATIVE_COORDINATE.fullmatch(argument) else argument for argument in arguments]


def _complain(text: str, code: int) -> int:
    print("\n".join(message_lines(text)), file=sys.stderr)  # noqa: T201
    return code


def _reader_left() -> int:
    """The reader of our output closed it (as `head` does): no message, and none from the interpreter's own flush."""
    os.dup2(os.open(os.devnull, os.O_WRONLY), 1)
    return OK


def _about_files(error: OSError) -> str:
    where = f" '{error.filename}'" if error.filename else ""
    return f"cannot use{where}: {error.strerror or error}" if where else str(error)


def _about_unexpected(error: Exception) -> int:
    """A wrong call of the command line (which the parser raises), else a bug of ours."""
    message = getattr(error, "format_message", None)
    if callable(message):
        return _complain(
            f"fellspan: {message()}\n  fellspan --help, or fellspan COMMAND --help, shows what is allowed", INPUT
        )
    if os.environ.get("FELLSPAN_DEBUG") == "1":
        import traceback

        traceback.print_exc()
    text = " ".join(str(error).split())[:300]
    return _complain(
        f"fellspan: this is a bug in fellspan: {type(error).__name__}: {text}\n"
        "  run again with FELLSPAN_DEBUG=1 for the details, and report them with the command that you typed",
        BUG,
    )
