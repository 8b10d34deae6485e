"""The usual cautions live once, cover what can hurt someone, and reach every view."""

from pathlib import Path
from typing import get_args

from fellspan.links.safety import ANTENNA_TOPICS, RAISING, SAFETY, SafetyTopic, safety_lines

SOURCE = Path(__file__).parents[2] / "src" / "fellspan"


def test_every_topic_has_one_sentence_in_order() -> None:
    assert tuple(caution.topic for caution in SAFETY) == get_args(SafetyTopic)
    assert len(set(safety_lines())) == len(SAFETY)
    assert safety_lines(ANTENNA_TOPICS) == tuple(c.text for c in SAFETY if c.topic in ANTENNA_TOPICS)


def test_the_sentences_stand_in_one_file_only() -> None:
    texts = {
        path: path.read_text(encoding="utf-8") for path in SOURCE.rglob("*") if path.suffix in (".py", ".j2", ".js")
    }
    for text in (*safety_lines(), RAISING):
        start = text[:40]
        assert [path.name for path, content in texts.items() if start in content] == ["safety.py"]
