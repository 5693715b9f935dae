"""How results show themselves: a few plain lines, and the same as HTML for notebooks."""

from __future__ import annotations

import html
from collections.abc import Sequence

Facts = Sequence[tuple[str, str]]


def figure(value: float | None) -> str:
    """Return a coefficient to three decimals, "undefined" where there is none."""
    return "undefined" if value is None else f"{value:.3f}"


def plain(title: str, facts: Facts) -> str:
    """Return a title and a line per fact.

    Examples
    --------
    >>> print(plain("topic", [("alpha", "0.642"), ("items", "294")]))
    topic
      alpha  0.642
      items  294
    """
    width = max((len(name) for name, _ in facts), default=0)
    return "\n".join([title, *(f"  {name:<{width}}  {text}" for name, text in facts)])


def as_html(title: str, facts: Facts) -> str:
    """Return the same as an HTML table; every text is escaped, for labels come from anywhere.

    Examples
    --------
    >>> as_html("<b>", [("alpha", "0.642")])
    '<table><caption>&lt;b&gt;</caption><tr><th>alpha</th><td>0.642</td></tr></table>'
    """
    rows = "".join(
        f"<tr><th>{html.escape(name)}</th><td>{html.escape(text)}</td></tr>" for name, text in facts
    )
    return f"<table><caption>{html.escape(title)}</caption>{rows}</table>"
