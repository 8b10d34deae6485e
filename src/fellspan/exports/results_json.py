"""results.json, schema 1: every number of a plan for other programs; and LinkResult back from it.

The keys of a link are the fields of `LinkResult`, in their order; docs/results.md explains each. Knows no other format.
"""

import dataclasses
import json
import math
from functools import cache
from typing import TYPE_CHECKING, Any

from fellspan.design.survey_list import label_of
from fellspan.errors import FellspanError
from fellspan.links.result import LinkResult
from fellspan.planning.plan import LinkFailure, StudyPlan

if TYPE_CHECKING:
    from pydantic import TypeAdapter

SCHEMA = 1


class ResultsFileError(FellspanError, ValueError):
    """A results.json does not hold what schema 1 says."""


def results_dict(plan: StudyPlan) -> dict[str, Any]:
    """All of a plan but its arrays, as plain dictionaries, lists, texts and numbers.

    What is infinite or undefined is None. `a` and `b` of a link are the names of its sites.
    """
    return {
        "schema": SCHEMA,
        "fellspan": plan.version,
        "study": _stamp(plan),
        "files": [plain_of(file) for file in plan.files],
        "cautions": list(plan.cautions),
        "links": [
            {
                **link_result_dict(linked.result),
                "reflections": plain_of(linked.reflections),
                "heights": plain_of(linked.heights),
                "confidence_along_path": plain_of(linked.confidence),
                "survey": [
                    plain_of(dataclasses.replace(point, label=label_of(number, point.rank))) for point in linked.survey
                ],
                # As exports/equipment.py writes it; absent unless asked for.
                **({} if linked.equipment is None else {"equipment": plain_of(linked.equipment)}),
                # Absent unless `fellspan accept` held a measured file against the link.
                **({} if linked.as_built is None else {"as_built": plain_of(linked.as_built)}),
            }
            for number, linked in enumerate(plan.links, start=1)
        ],
        "failures": [_failure(failure) for failure in plan.failures],
        "interference": plain_of(plan.interference),
    }


def link_result_dict(result: LinkResult) -> dict[str, Any]:
    """One link as it stands in the list "links" of results.json."""
    plain: dict[str, Any] = plain_of(result)
    return plain


def results_text(plan: StudyPlan) -> str:
    """`results_dict` as the text of the file: keys in the order of schema 1, the same plan the same bytes."""
    text = json.dumps(results_dict(plan), ensure_ascii=False, allow_nan=False, indent=1) + "\n"
    return text.encode("utf-8", "backslashreplace").decode("utf-8")  # a lone surrogate becomes its JSON escape


def link_result_from_dict(data: dict[str, Any]) -> LinkResult:
    """LinkResult from one entry of "links"; keys that a later version added are skipped.

    Raises
    ------
    ResultsFileError
        A key is missing or holds something of another type.
    """
    from pydantic import ValidationError

    try:
        return _adapter().validate_python(data)
    except ValidationError as error:
        first = error.errors(include_url=False, include_input=False)[0]
        where = ".".join(str(part) for part in first["loc"]) or "the link"
        name = data.get("name", "?") if isinstance(data, dict) else "?"
        raise ResultsFileError(
            f"results.json: link '{name}': {where}: {first['msg'].lower()}",
            "the file must be results.json of a fellspan report, schema 1, unchanged",
        ) from None


@cache
def _adapter() -> "TypeAdapter[LinkResult]":
    from pydantic import TypeAdapter

    return TypeAdapter(LinkResult)


def _stamp(plan: StudyPlan) -> dict[str, Any]:
    study = plan.study
    return {
        "title": study.title,
        "planner": study.planner,
        "revision": study.revision,
        "date": study.date.isoformat(),
        "file": None if study.path is None else study.path.name,
        "preset": None if study.criteria else study.preset,
        "median_k": plain_of(study.median_k),
        "confidence": plain_of(study.confidence),
        "growth_years": plain_of(study.growth_years),
        "notes": list(study.notes),
    }


def _failure(failure: LinkFailure) -> dict[str, Any]:
    link, error = failure.link, failure.error
    return {
        "name": link.name,
        "a": link.a.name,
        "b": link.b.name,
        "error": type(error).__name__,
        "what": error.what,
        "details": list(error.details),
    }


@cache
def _names(kind: Any) -> tuple[str, ...]:
    return tuple(field.name for field in dataclasses.fields(kind))


def plain_of(value: Any) -> Any:
    """Dataclasses to dictionaries, tuples to lists, numbers to Python's own, what is not finite to None."""
    kind: Any = type(value)
    if kind is float:
        return value + 0.0 if math.isfinite(value) else None
    if kind is str or kind is int:
        return value
    if dataclasses.is_dataclass(value) and not isinstance(value, type):
        return {name: plain_of(getattr(value, name)) for name in _names(kind)}
    if isinstance(value, (tuple, list)):
        return [plain_of(item) for item in value]
    if isinstance(value, bool) or value is None:
        return value
    if isinstance(value, str):
        return str(value)
    if hasattr(value, "item"):
        value = value.item()  # a NumPy scalar
    if isinstance(value, float):
        return value + 0.0 if math.isfinite(value) else None
    return value
