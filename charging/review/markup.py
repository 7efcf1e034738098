"""HTML from Python: every text is escaped unless it is markup already."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from html import escape
from itertools import chain

VOID = {"br", "hr", "meta", "link"}


class Markup(str):
    """Text that is HTML already."""

    __slots__ = ()


Child = str | Markup | Iterable["Child"] | None


def element(tag: str, *children: Child, **attributes: str | bool | None) -> Markup:
    """Write an element; `_` in a name of an attribute stands for `-`, one at its end is dropped.

    Examples
    --------
    >>> element("p", "a < b", element("b", "&"), id="x")
    '<p id="x">a &lt; b<b>&amp;</b></p>'
    >>> element("th", "kind", scope="col", class_="left")
    '<th scope="col" class="left">kind</th>'
    """
    written = "".join(
        f" {name.rstrip('_').replace('_', '-')}"
        + ("" if value is True else f'="{escape(str(value), quote=True)}"')
        for name, value in attributes.items()
        if value is not None and value is not False
    )
    if tag in VOID:
        return Markup(f"<{tag}{written}>")
    return Markup(f"<{tag}{written}>{joined(children)}</{tag}>")


def joined(children: Child) -> Markup:
    """Join children, escaping what is no markup."""
    if children is None:
        return Markup("")
    if isinstance(children, Markup):
        return children
    if isinstance(children, str):
        return Markup(escape(visible(children), quote=False))
    return Markup("".join(joined(child) for child in children))


def visible(text: str) -> str:
    r"""Replace characters that HTML forbids or that turn the direction of text.

    Examples
    --------
    >>> visible("a\x00b\u202ec")
    'a�b�c'
    """
    return "".join("\ufffd" if _hidden(c) else c for c in text)


def _hidden(c: str) -> bool:
    code = ord(c)
    control = (code < 32 and c not in "\t\n\r") or 127 <= code < 160
    turns = 0x202A <= code <= 0x202E or 0x2066 <= code <= 0x2069
    return control or turns or 0xD800 <= code <= 0xDFFF or code in (0xFFFE, 0xFFFF)


def table(
    caption: str,
    head: Sequence[str],
    rows: Iterable[Sequence[Child]],
    *,
    numbers: Sequence[int] = (),
    classes: str = "",
) -> Markup:
    """Write a table whose first column heads its rows, in a box that scrolls by itself.

    `numbers` are the columns set flush right.
    """
    body = [
        element(
            "tr",
            [
                element(
                    "th" if i == 0 else "td",
                    cell,
                    scope="row" if i == 0 else None,
                    class_="number" if i in numbers else None,
                )
                for i, cell in enumerate(row)
            ],
        )
        for row in rows
    ]
    heads = [
        element("th", text, scope="col", class_="number" if i in numbers else None)
        for i, text in enumerate(head)
    ]
    inner = element(
        "table",
        element("caption", caption),
        element("thead", element("tr", heads)),
        element("tbody", body),
    )
    return element(
        "div", inner, class_=f"scroll {classes}".strip(), tabindex="0", role="region",
        aria_label=f"table: {caption}",
    )  # fmt: skip


def items(texts: Iterable[Child], tag: str = "ul") -> Markup:
    """Write a list."""
    return element(tag, [element("li", text) for text in texts])


def section(anchor: str, title: str, *children: Child) -> Markup:
    """Write a section with a heading that names it."""
    return element(
        "section",
        element("h2", title, id=f"{anchor}-title"),
        list(chain(children)),
        id=anchor,
        aria_labelledby=f"{anchor}-title",
    )
