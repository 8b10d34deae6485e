"""A link as built as JSON: what `results.json` holds of it under `as_built`, by itself."""

import json

from fellspan.design.acceptance_result import AcceptanceResult
from fellspan.exports.results_json import plain_of


def as_built_text(found: AcceptanceResult) -> str:
    """The text of the JSON: keys in the order of the result, the same measurement the same bytes."""
    text = json.dumps(plain_of(found), ensure_ascii=False, allow_nan=False, indent=1) + "\n"
    return text.encode("utf-8", "backslashreplace").decode("utf-8")
