"""Messages on standard error: one voice for errors and notes, within the width of a terminal, also where they are piped."""

import typer

from fellspan.cli.layout import message_lines


def tell(message: str) -> None:
    """A message: what is wrong, its details as lines of their own two blanks in."""
    typer.echo("\n".join(message_lines(message)), err=True)
