"""Drawing pages from templates."""

import json
from collections.abc import Mapping
from dataclasses import asdict
from pathlib import Path
from typing import Any
from uuid import uuid4

from jinja2 import Environment, FileSystemLoader, StrictUndefined

from server.drawing.marks import mark
from server.web.static_files import StaticFiles


class Templating:
    """Templates with what each of them may use: ``url_static`` and ``mark``."""

    def __init__(self, folder: Path, static: StaticFiles) -> None:
        self.environment = Environment(
            loader=FileSystemLoader(folder),
            autoescape=True,
            undefined=StrictUndefined,
            auto_reload=False,
        )
        self.environment.globals.update(url_static=static.url, mark=mark)

    def draw(self, template: str, context: Mapping[str, Any]) -> str:
        """Return a page; what a template does not find in the context is an error."""
        return self.environment.get_template(template).render(context)


def new_key() -> str:
    """Return the idempotency key of one form as it is drawn."""
    return str(uuid4())


def script_json(sheet: Any) -> str:
    """Return a read model as JSON that can stand inside a script element."""
    text = json.dumps(asdict(sheet), ensure_ascii=False, allow_nan=False)
    return text.replace("&", "\\u0026").replace("<", "\\u003c").replace(">", "\\u003e")
