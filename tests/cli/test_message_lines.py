"""Messages on standard error keep to 80 columns, and paths and quoted values stay in one piece; piped output too."""

import random
from pathlib import Path

import pytest
from made_studies import run_command, unwrapped

from fellspan.cli.layout import WIDTH, columns_of, message_lines

FOLDER = "/srv/plans/harbour links of last year/third revision"
LONG = f"{FOLDER}/ground and cover of the north side.tif"


@pytest.mark.parametrize(
    ("message", "whole"),
    [
        (f"fellspan: cannot write {LONG}: No space left on device", (f"{LONG}:",)),
        (f"fellspan: there is no study file {FOLDER}/study.toml\n  fellspan init writes a starter, and an example", ()),
        (
            (
                "fellspan: terrain has no data from 3.21 km to 4.07 km of the link 'Harbour Office at the pier - North Light'\n"
                "  raster: tolmera_dtm.tif, which ends at 36.1042 N; the path goes on to 36.1300 N, that is 2.8 km farther\n"
                '  add a raster that covers the stretch, or set terrain.gaps = "sea at the level of the tide" if it is open sea'
            ),
            ("'Harbour Office at the pier - North Light'", '"sea at the level of the tide"'),
        ),
        (
            "fellspan: the key --antennas='panel 5 GHz, 4 x 4; dish 0.3 m; grid dish 0.6 m' is not known, nor (\"other, one\")",
            ("--antennas='panel 5 GHz, 4 x 4; dish 0.3 m; grid dish 0.6 m'", '("other, one")'),
        ),
        (
            "fellspan: the maker's figure of the antenna doesn't agree with the crew's own figure of 'O'Hara's mast' at all",
            ("'O'Hara's mast'",),
        ),
        (
            f"fellspan: {'n' * 200} is too long a name for a link of a study that is to be written to a file",
            ("n" * 200,),
        ),
        ("fellspan: 東の灯台と西の灯台 " * 8 + "ends", ()),
    ],
)
def test_messages_keep_to_the_width_and_values_stay_whole(message: str, whole: tuple[str, ...]) -> None:
    lines = message_lines(message)
    for line in lines:
        assert columns_of(line) <= WIDTH or len(line.split()) == 1 or any(part in line for part in whole), line
    for part in whole:
        assert any(part in line for line in lines), part
    assert unwrapped("\n".join(lines)) == " ".join(message.split(" ")).rstrip()
    heads = [line for line in lines if not line.startswith("    ")]
    assert len(heads) == len(message.splitlines())
    assert [line.startswith("  ") for line in heads] == [line.startswith("  ") for line in message.splitlines()]


def test_a_short_path_does_not_swallow_the_words_after_it() -> None:
    words = "fellspan: /tmp/a is no raster and neither is /tmp/b; paths in a study start from the folder of the study"
    first, second = message_lines(words)
    assert columns_of(first) <= WIDTH
    assert second.startswith("    ")
    assert max(map(columns_of, (first, second))) <= WIDTH


def test_no_word_is_lost_in_any_text() -> None:
    chance = random.Random(7)
    pieces = ["'", '"', "/a/b", "/c d/e.tif:", "x=", "word", "1.5", "(it", "end).", "O'Neil", "–", "東", "./k", "'p q'"]
    for _ in range(400):
        message = " ".join(chance.choice(pieces) for _ in range(chance.randrange(1, 60)))
        assert unwrapped("\n".join(message_lines(message))) == message


def test_a_control_character_never_reaches_the_terminal() -> None:
    assert "\x1b" not in "".join(message_lines("fellspan: a name '\x1b[31mred\x07'"))


@pytest.mark.parametrize(
    "arguments",
    [
        ("plan", "no such folder with a name of some length/no such study file with a long name.toml"),
        ("sight", "36.05N 45.2W", "36.06N 45.21W", "--ground", "ground.tif"),
        ("plan", "study.toml", "--no-such-option-of-any-length-that-one-could-think-of", "--and-one-more-of-these"),
        (
            "sight",
            "nowhere in particular that anybody would know or could find on a map",
            "36.06N 45.21W",
            "--frequency",
            "5 GHz",
        ),
    ],
)
def test_piped_errors_are_wrapped_too(arguments: tuple[str, ...], tmp_path: Path) -> None:
    done = run_command(*arguments, folder=tmp_path)
    assert done.returncode == 2
    lines = done.stderr.splitlines()
    assert lines
    assert all(columns_of(line) <= WIDTH or "'" in line or ".toml" in line for line in lines), done.stderr
    assert 1 <= len(unwrapped(done.stderr).splitlines()) <= 4, done.stderr
