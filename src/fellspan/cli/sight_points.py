"""Two positions from the words of a command line, however the shell has split them. Reads notation, asks nothing."""

from collections.abc import Sequence

from fellspan.errors import CoordinateError, UsageError
from fellspan.geodesy.coordinates import ParsedPosition, parse_position


def read_points(words: Sequence[str], *, crs: str | None) -> list[ParsedPosition]:
    """No, one or two positions from words such as '36.04217,-45.19876' or '36.04217' '-45.19876' '36.1' '-45.2'.

    Raises
    ------
    CoordinateError
        A word, or all of them together, is no position.
    UsageError
        The words can be split into two positions in no way.
    """
    words = [word.strip() for word in words]
    if not words:
        return []
    if len(words) == 1:
        return [parse_position(words[0], crs=crs)]
    for cut in _cuts(len(words)):
        a, b = " ".join(words[:cut]), " ".join(words[cut:])
        try:
            return [parse_position(part.rstrip(","), crs=crs) for part in (a, b) if part]
        except CoordinateError:
            continue
    if len(words) == 2:
        return [parse_position(word, crs=crs) for word in words]  # says which of the two is wrong
    raise UsageError(
        f"'{' '.join(words)}' does not read as two positions",
        "put each position in quotes, latitude first: '36.04217 N, 45.19876 W' '36.08862 N, 45.17243 W'",
    )


def _cuts(count: int) -> list[int]:
    """Where A may end: in the middle first, for people write both positions the same way; all words as one last."""
    inner = sorted(range(1, count), key=lambda cut: abs(2 * cut - count))
    return [*inner, count]
