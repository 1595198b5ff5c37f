"""The JSON Schema of the project file, made from the model.

``python -m solver.project.schema`` writes it anew; a test compares the file with the model.
"""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any, Final

from solver.project.file import FORMAT
from solver.project.model import Project
from solver.project.upgrades import VERSION

SCHEMA_FILE: Final = Path(__file__).with_name("thalweg-project.schema.json")


def project_schema() -> dict[str, Any]:
    """The schema of a project file of the present version."""
    schema = Project.model_json_schema()
    schema["title"] = "Thalweg project"
    schema["$schema"] = "https://json-schema.org/draft/2020-12/schema"
    schema["properties"] = {
        "format": {"const": FORMAT},
        "version": {"const": VERSION},
        **schema["properties"],
    }
    schema["required"] = ["format", "version"]
    return schema


def schema_text() -> str:
    """The text of the schema file."""
    return json.dumps(project_schema(), indent=2, ensure_ascii=False, sort_keys=True) + "\n"


if __name__ == "__main__":
    SCHEMA_FILE.write_text(schema_text(), encoding="utf-8")
