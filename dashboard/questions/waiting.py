"""Questions that have no figures yet in this review: their screens say what they need."""

from __future__ import annotations

from .base import Desk, Question


class Waiting(Question):
    """A question whose inputs are missing; ``needs`` says which, in one sentence."""

    has_map = False
    has_time = False

    def __init__(self, key: str, word: str, asks: str, needs: str) -> None:
        self.key, self.word, self.asks, self.needs = key, word, asks, needs

    def summary(self, desk: Desk) -> str:
        return "not looked at yet"

    def sentence(self, desk: Desk) -> str:
        return self.needs
