"""The wire between a page and its server: HTML for the page's places, and what the reader does."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path
from typing import Any

import param
from panel.custom import JSComponent

WEB = Path(__file__).resolve().parent / "web"


class Wire(JSComponent):
    """``slots`` holds HTML by place, ``state`` everything else the page needs to know."""

    slots = param.Dict(default={})
    state = param.Dict(default={})
    _esm = WEB / "wire.js"

    def __init__(self, heard: Callable[[str, Any], None], **params: Any) -> None:
        super().__init__(**params)
        self._heard = heard

    def _handle_msg(self, msg: Any) -> None:
        self._heard(str(msg.get("name", "")), msg.get("value"))
