"""What all pages have in common: templates that escape every text, style and script of our own under a policy that
allows nothing else, and nothing loaded from elsewhere."""

from __future__ import annotations

import base64
import hashlib
from pathlib import Path
from typing import Any

from electrolog.answers.report import Origin
from electrolog.clock import shown_moment
from electrolog.show.text import safe

TEMPLATES = Path(__file__).with_name("templates")


class Inline(str):
    """Our own style or script, which stands in the page as it is; the page's policy names it by its hash."""

    __slots__ = ()

    def __html__(self) -> str:
        return str(self)

    @property
    def hash(self) -> str:
        return "sha256-" + base64.b64encode(hashlib.sha256(self.encode()).digest()).decode()


def own_file(name: str) -> Inline:
    return Inline((TEMPLATES / name).read_text(encoding="utf-8"))


def rendered(template: str, **context: Any) -> str:
    """Every text goes through `safe` and is then escaped: a note holds no markup and moves no line about."""
    from jinja2 import Environment, FileSystemLoader, StrictUndefined

    made = Environment(
        loader=FileSystemLoader(TEMPLATES, encoding="utf-8"),
        autoescape=True,
        undefined=StrictUndefined,
        finalize=_finalized,
        trim_blocks=True,
        lstrip_blocks=True,
    )
    return made.get_template(template).render(**context)


def _finalized(value: Any) -> Any:
    return value if hasattr(value, "__html__") or isinstance(value, int | float) else safe(value)


def origin_said(made: Origin) -> str:
    """The head is what `verify --head` is asked later, to see whether anything was cut off since."""
    methods = ", ".join(f"{what} by {name}" for what, name in made.methods.items())
    return (
        f"Made by {made.made_by} on {shown_moment(made.made_at)} with electrolog {made.version} "
        f"from {_short(made.record)}; journal at entry {made.entries}, head {made.head[:16]}; {methods}."
    )


def _short(record: str) -> str:
    """A file by its name: where it lies on somebody's disk is nobody else's business."""
    return record if "://" in record else Path(record).name
