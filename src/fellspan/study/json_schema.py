"""The JSON Schema of a study file, for editors that complete and check keys; drawn from the models, so it cannot drift."""

import json
from typing import Any

from fellspan.study.schema import StudyFile

SCHEMA_FILE_NAME = "fellspan-study.schema.json"


def study_json_schema() -> dict[str, Any]:
    """The schema (JSON Schema draft 2020-12)."""
    schema = StudyFile.model_json_schema(mode="validation")
    return {"$schema": "https://json-schema.org/draft/2020-12/schema", **schema, "title": "Fellspan study file"}


def study_json_schema_text() -> str:
    """The schema as the text of a file."""
    return json.dumps(study_json_schema(), indent=2, ensure_ascii=False) + "\n"
