"""The templates' environment: strict names, escaping, the `ui` macros, and filters that format.

Words, numbers and figures are given by the caller, `app.py`; this room knows nothing of them.
"""

import re
from collections.abc import Callable, Iterable, Mapping
from types import SimpleNamespace
from typing import Any
from urllib.parse import urlencode

import orjson
from jinja2 import Environment, FileSystemLoader, StrictUndefined, Template
from jinja2.runtime import Context
from markupsafe import Markup, escape

from server.paths import folder

_SYMBOL = re.compile(r"\b([A-Za-z])_x\b")  # and nothing else, since names of files have it too
_IN_SCRIPT = {ord(sign): f"\\u{ord(sign):04x}" for sign in "<>&\u2028\u2029"}


def environment(
    *,
    filters: Mapping[str, Callable[..., Any]],
    names: Mapping[str, Any],
    asset: Callable[[str], str],
) -> Environment:
    """Templates with these filters and global names beside the ones of this room."""
    made = Environment(
        loader=FileSystemLoader(folder("templates")),
        autoescape=True,
        undefined=StrictUndefined,
        trim_blocks=True,
        lstrip_blocks=True,
        auto_reload=False,
    )
    made.filters |= {
        "asset": asset,
        "keyed": keyed,
        "place": place,
        "of_table": of_table,
        "symbols": symbols,
        "json": json_block,
        **filters,
    }
    ui = SimpleNamespace()
    made.globals |= {"ui": ui, **names}
    for path in sorted(folder("templates").glob("ui/*.html")):
        macros = made.get_template(f"ui/{path.name}").module
        for name in dir(macros):
            if not name.startswith("_"):
                setattr(ui, name, getattr(macros, name))
    return made


def context(made: Environment, template: Template, values: Mapping[str, Any]) -> Context:
    """A context in which blocks of the template, and of its frame, can be rendered alone."""
    new = template.new_context(dict(values))
    for name, block in made.get_template("base.html").blocks.items():
        new.blocks.setdefault(name, []).append(block)
    return new


def block(of: Context, name: str) -> str:
    """One block alone."""
    return "".join(of.blocks[name][0](of))


def keyed(items: Iterable[Any], key: str) -> Any:
    """The item of this key: a chart, a table. KeyError lists the keys."""
    items = tuple(items)
    for item in items:
        if item.key == key:
            return item
    raise KeyError(f"{key!r}: this page has {[item.key for item in items]}")


def place(items: Iterable[Any], key: str) -> int:
    """Its number, counted from 1: figures are numbered as they stand in the page's charts."""
    items = tuple(items)
    return items.index(keyed(items, key)) + 1


def of_table(address: str, key: str) -> str:
    """The address of a twin that holds one table."""
    joint = "&" if "?" in address else "?"
    return f"{address}{joint}{urlencode({'table': key})}" if key else address


def symbols(text: str) -> Markup:
    """Text in which symbols such as m_x are set with the letter below the line."""
    return Markup(_SYMBOL.sub(r"\1<sub>x</sub>", str(escape(text))))


def json_block(value: object) -> Markup:
    """JSON that may stand inside a script element."""
    return Markup(orjson.dumps(value).decode().translate(_IN_SCRIPT))
