"""SVG figures set into the report: several in one page, coloured by the page."""

from __future__ import annotations

import re
from html import escape

from lineproof.paper.palette import LIGHT

LEAST, MOST = 0.067, 0.0966  # rem a point: legible on a phone; as wide as the report's column
_ROOT = re.compile(r"<svg\b[^>]*?\bviewBox=\"([^\"]+)\"[^>]*>", re.DOTALL)
_DROPPED = re.compile(r"<metadata>.*?</metadata>|<style\b.*?</style>", re.DOTALL)


def inline_svg(svg: bytes, name: str, title: str, description: str) -> str:
    """The figure as an element of an HTML page.

    Ids get `name` as a prefix, so that figures do not share any; colours of the palette become the
    page's own; title and description, plain text, are what a screen reader says. Raises ValueError
    for a file without a view box.
    """
    text = svg.decode("utf-8")
    root = _ROOT.search(text)
    if root is None:
        raise ValueError(f"figure {name} is no SVG with a view box")
    body = _DROPPED.sub("", text[root.end() :])
    body = re.sub(r'\bid="', f'id="{name}-', body)
    body = body.replace("url(#", f"url(#{name}-").replace('xlink:href="#', f'href="#{name}-')
    for token, colour in LIGHT.items():
        body = body.replace(colour, f"var(--plot-{token})")
    width = float(root[1].split()[2])
    size = f"min-width:{width * LEAST:.1f}rem;max-width:{width * MOST:.1f}rem"
    return (
        f'<svg class="plot" style="{size}" viewBox="{root[1]}" role="img" '
        f'aria-labelledby="{name}-title {name}-desc">'
        f'<title id="{name}-title">{escape(title)}</title>'
        f'<desc id="{name}-desc">{escape(description)}</desc>{body.strip()}'
    )
