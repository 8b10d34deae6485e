"""What a page carries packed is unpacked to the same letters, whichever of the three kinds of block RFC 1951 has."""

import base64
import random
import zlib

import pytest

from fellspan.report import assets

pytestmark = pytest.mark.browser

RUN = """([unpack, packed, size]) => {
  (0, eval)(unpack + "; window.run = runPacked");
  window.run(packed, size);
  return window.said;
}"""


def _packed(script: str, *, level: int, strategy: int) -> tuple[str, int]:
    plain = script.encode("utf-8")
    packer = zlib.compressobj(level, zlib.DEFLATED, -zlib.MAX_WBITS, 9, strategy)
    return base64.b64encode(packer.compress(plain) + packer.flush()).decode("ascii"), len(plain)


@pytest.mark.parametrize(
    ("level", "strategy"),
    [
        (0, zlib.Z_DEFAULT_STRATEGY),
        (9, zlib.Z_FIXED),
        (9, zlib.Z_DEFAULT_STRATEGY),
        (9, zlib.Z_HUFFMAN_ONLY),
        (1, zlib.Z_RLE),
    ],
    ids=["stored", "fixed", "dynamic", "no repeats", "runs"],
)
def test_every_kind_of_block_is_unpacked(watch, level: int, strategy: int) -> None:
    dice = random.Random(3)
    words = "".join(dice.choice("abcdefgh  éΩ") * dice.randint(1, 300) for _ in range(900))
    packed, size = _packed(f'window.said = "{words}";', level=level, strategy=strategy)
    assert size > 65_535  # more than one stored block
    watched = watch(800, 600)
    watched.page.set_content("<p>plain</p>")
    assert watched.page.evaluate(RUN, [str(assets.asset("unpack.js")), packed, size]) == words
    assert watched.messages == []


def test_the_map_library_is_there_with_its_licence_and_takes_two_fifths(plain, watch) -> None:
    text = str(assets.leaflet_js())
    assert text.lstrip().startswith("/*")
    assert "Agafonkin" in text[:400]
    assert len(text) < 65_000
    page = watch(1280, 900).page
    page.goto(plain.link_pages[0].as_uri())
    assert page.evaluate("() => L.version").startswith("1.9")
