"""Options that take one of a few words; the words come from the vocabulary."""

from typing import TypeVar

from fellspan.errors import UsageError

_Word = TypeVar("_Word", bound=str)


def one_of(value: str, choices: tuple[_Word, ...], option: str) -> _Word:
    """The choice that `value` is; a UsageError names the choices otherwise."""
    for choice in choices:
        if choice == value:
            return choice
    raise UsageError(f"{option} '{value}' is not allowed", f"allowed: {', '.join(choices)}")
