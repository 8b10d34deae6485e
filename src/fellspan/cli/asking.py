"""Asking at a terminal for what a command lacks, again and again until the answer can be read.

Questions go to standard error, so that standard output holds results alone.
"""

import sys
from collections.abc import Callable, Sequence
from typing import TypeVar

import typer

from fellspan.cli.telling import tell
from fellspan.errors import FellspanError

_T = TypeVar("_T")


def can_ask() -> bool:
    """Whether a person sits at the other end of standard input."""
    return sys.stdin.isatty()


def ask(question: str, read: Callable[[str], _T]) -> _T:
    """Ask until `read` takes the answer; what it complains of is shown."""
    while True:
        answer = typer.prompt(question, err=True).strip()
        try:
            return read(answer)
        except FellspanError as error:
            _complain(error)


def ask_or_skip(question: str, read: Callable[[str], _T]) -> _T | None:
    """As `ask`, but an empty answer is None."""
    while True:
        answer = typer.prompt(f"{question} (Enter to skip)", default="", show_default=False, err=True).strip()
        if not answer:
            return None
        try:
            return read(answer)
        except FellspanError as error:
            _complain(error)


def ask_choice(question: str, choices: Sequence[str]) -> str:
    """Ask for one of a few words; the first letters of one are enough."""
    while True:
        answer = typer.prompt(f"{question} ({' / '.join(choices)})", err=True).strip().lower()
        fitting = [choice for choice in choices if answer and choice.startswith(answer)]
        if len(fitting) == 1:
            return fitting[0]
        tell(f"  one of: {', '.join(choices)}")


def _complain(error: FellspanError) -> None:
    """What is wrong with an answer, broken between words."""
    tell("\n".join(f"  {text}" for text in (error.what, *error.details)))
