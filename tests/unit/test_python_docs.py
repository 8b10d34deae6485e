"""The worked page of the Python API runs as it stands and prints what it shows."""

import contextlib
import io
import re
from pathlib import Path

import fellspan

ROOT = Path(__file__).parents[2]
PAGE = (ROOT / "docs" / "python-api.md").read_text(encoding="utf-8")
BLOCKS = re.findall(r"```python\n(.*?)```\n(?:\n```text\n(.*?)```)?", PAGE, re.DOTALL)


def test_every_block_prints_what_stands_below_it(monkeypatch, tmp_path):
    monkeypatch.chdir(ROOT)
    names = {"out_dir": tmp_path / "report"}
    assert len(BLOCKS) == PAGE.count("```python") >= 10
    for code, shown in BLOCKS:
        printed = io.StringIO()
        with contextlib.redirect_stdout(printed):
            exec(compile(code, "docs/python-api.md", "exec"), names)
        assert printed.getvalue() == shown, code
    assert (tmp_path / "report" / "index.html").exists()


def test_the_page_names_all_that_the_package_offers():
    for name in set(fellspan.__all__) - {"__version__", "propagation"}:
        assert f"`{name}`" in PAGE, name
    assert "`fellspan.propagation`" in PAGE
