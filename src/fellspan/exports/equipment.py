"""A comparison of equipment as JSON: the fields of `EquipResult` in their order, as docs/equip.md explains them."""

import json
from typing import Any

from fellspan import __version__
from fellspan.design.equip_result import EquipResult
from fellspan.exports.results_json import SCHEMA, plain_of


def equipment_dict(result: EquipResult) -> dict[str, Any]:
    """Plain dictionaries, lists, texts and numbers; None for what is infinite or undefined."""
    found: dict[str, Any] = plain_of(result)
    return found


def equipment_text(result: EquipResult) -> str:
    """`{"schema", "fellspan", "equipment"}` as text."""
    answer = {"schema": SCHEMA, "fellspan": __version__, "equipment": equipment_dict(result)}
    text = json.dumps(answer, ensure_ascii=False, allow_nan=False, indent=1) + "\n"
    return text.encode("utf-8", "backslashreplace").decode("utf-8")
