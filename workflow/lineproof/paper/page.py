"""What all pages share: the template environment and the colours of their figures."""

from __future__ import annotations

from typing import Any

from jinja2 import Environment, FileSystemLoader, StrictUndefined

from lineproof.paper.html_table import TEMPLATES
from lineproof.paper.palette import DARK, LIGHT


def environment() -> Environment:
    """Templates that escape all text and know no undefined name."""
    return Environment(
        loader=FileSystemLoader(TEMPLATES),
        autoescape=True,
        undefined=StrictUndefined,
        trim_blocks=True,
        lstrip_blocks=True,
    )


def palette() -> dict[str, Any]:
    """The colours that `style.css.j2` gives to figures, for light pages and dark."""
    return {"light": LIGHT, "dark": DARK}
