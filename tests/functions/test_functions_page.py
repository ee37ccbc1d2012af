"""The page of functions is what the registry says."""

from __future__ import annotations

import importlib.util
from pathlib import Path

SCRIPT = Path(__file__).parents[2] / "docs" / "functions_page.py"


def test_the_page_is_up_to_date() -> None:
    spec = importlib.util.spec_from_file_location("functions_page", SCRIPT)
    assert spec is not None
    assert spec.loader is not None
    script = importlib.util.module_from_spec(spec)
    spec.loader.exec_module(script)
    assert script.PAGE.read_text(encoding="utf-8") == script.functions_page(), (
        "run `python docs/functions_page.py`"
    )
