"""The static twin of a panel: the sheet of its object at execution, which stays when no kernel is there."""

from __future__ import annotations

from typing import Any


def twin_bundle(calculation: Any) -> dict[str, Any]:
    """Return the sheet of an object in several media with its record, marked so that a live panel can stand in for it."""
    bundle = dict(calculation._repr_mimebundle_())
    if "text/html" in bundle:
        bundle["text/html"] = f'<div class="pk-twin">{bundle["text/html"]}</div>'
    return bundle
