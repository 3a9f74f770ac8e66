"""The worked examples of the guide: compared with the service, or written from it.

``python tests/support/guide_examples.py`` writes the answers of the service into the pages. ``shown`` says which
members of an answer a page shows. Numbers are written with six digits.
"""

from __future__ import annotations

import json
import re
from pathlib import Path
from typing import Any

from gasapi.guide import PAGES, Guide, examples_of

FOLDER = Path(__file__).resolve().parents[2] / "gasapi" / "guide" / "pages"
_ANSWER = re.compile(r'(<pre class="answer">\n).*?(\n</pre>)', re.DOTALL)
_CANDIDATE = ("id", "molar_mass", "density", "relative_difference", "toxic")
_COMPARED = ("id", "density", "compressibility_factor", "relative_difference")
_LINE = 96


def shown(answer: dict[str, Any]) -> dict[str, Any]:
    """Return the part of an answer that a page shows."""
    result = dict(answer["result"])
    if result.get("candidates"):
        result["candidates"] = [{name: c[name] for name in _CANDIDATE} for c in result["candidates"]]
    if "models" in result:
        result["models"] = [{name: m[name] for name in _COMPARED} for m in result["models"]]
    if "points" in result:
        result = {"points": result["points"], "complete": result["complete"]}
    return {"result": result, "quality": {"level": answer["quality"]["level"]}}


def rounded(value: Any) -> Any:
    """Return a value with its numbers at six digits."""
    if isinstance(value, float):
        return float(f"{value:.6g}")
    if isinstance(value, dict):
        return {name: rounded(item) for name, item in value.items()}
    return [rounded(item) for item in value] if isinstance(value, list) else value


def text(value: Any, indent: str = "") -> str:
    """Return JSON that is short where it can be and broken where it must be."""
    short = json.dumps(value, ensure_ascii=False)
    if len(indent) + len(short) <= _LINE or not isinstance(value, dict | list) or not value:
        return short
    deeper = indent + "  "
    if isinstance(value, dict):
        lines = [f"{deeper}{json.dumps(name)}: {text(item, deeper)}" for name, item in value.items()]
        return "{\n" + ",\n".join(lines) + f"\n{indent}}}"
    return "[\n" + ",\n".join(deeper + text(item, deeper) for item in value) + f"\n{indent}]"


def write() -> None:
    """Write the answers of the service into the pages."""
    from gasapi.app import create_app

    client = create_app().test_client()
    for page in PAGES:
        source = Guide.source(page.name)
        answers = []
        for example in examples_of(source):
            response = client.post(f"/{example.call}", json=example.question)
            assert response.status_code == 200, response.text
            answers.append(text(rounded(shown(response.get_json()))))
        waiting = iter(answers)
        made = _ANSWER.sub(lambda found, waiting=waiting: found[1] + next(waiting) + found[2], source)
        (FOLDER / f"{page.name}.html").write_text(made, encoding="utf-8")


if __name__ == "__main__":
    write()
