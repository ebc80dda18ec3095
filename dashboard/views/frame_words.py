"""The page's standing words: the rail of questions, the caution strip, and the states between answers."""

from __future__ import annotations

from collections.abc import Sequence

from hydro.cautions import CAUTIONS

from ..text import safe


def rail(questions: Sequence[tuple[str, str, str]], chosen: str) -> str:
    """Buttons (key, word, summary) of the seven questions."""
    items = "".join(
        f'<li><button type="button" data-do="question" data-value="{key}" data-key="question-{key}"'
        f'{" aria-current=page" if key == chosen else ""}><b>{word}</b><span>{safe(summary)}</span></button></li>'
        for key, word, summary in questions
    )
    number = [key for key, _, _ in questions].index(chosen)
    before, after = questions[number - 1][0], questions[(number + 1) % len(questions)][0]
    bar = (
        f'<button type="button" class="step" data-do="question" data-value="{before}" aria-label="Question before">'
        '<svg viewBox="0 0 12 20" aria-hidden="true"><path d="M9 3 L3 10 L9 17"/></svg></button>'
        f'<button type="button" class="which" data-do="menu" aria-haspopup="true">{questions[number][1]}, {number + 1} of '
        f'{len(questions)}</button>'
        f'<button type="button" class="step" data-do="question" data-value="{after}" aria-label="Next question">'
        '<svg viewBox="0 0 12 20" aria-hidden="true"><path d="M3 3 L9 10 L3 17"/></svg></button>'
    )
    return f'<div class="bar">{bar}</div><ul>{items}</ul>'


def cautions(ids: Sequence[str], *, short: bool = False) -> str:
    """The footnotes, in order of their letters; the hall view shortens the words, not the list."""
    items = "".join(
        f'<li id="caution-{chr(ord("a") + i)}"><b>{chr(ord("a") + i)}</b> '
        f"{CAUTIONS[id_].short if short else CAUTIONS[id_].text}</li>"
        for i, id_ in enumerate(ids)
    )
    return f"<h2>Cautions</h2><ol>{items}</ol>" if items else ""


def working(label: str, done: int = 0, total: int = 0, unit: str = "frames", *, stoppable: bool = False) -> str:
    """What is being made, as a scale bar that fills up, with a way to stop."""
    count = f" {done}\u00a0%" if unit == "%" else f" {done} of {total} {unit}."
    out = f"<span>{safe(label)}{count if total else ''}</span>"
    if total:
        out += (
            f'<progress max="{total}" value="{done}" aria-label="{safe(label)}"></progress>'
        )
    if stoppable:
        out += '<button type="button" class="plain" data-do="stop" data-key="stop">Stop</button>'
    return out


def trouble(sentence: str) -> str:
    """What went wrong, where, and what to do; the review is untouched."""
    return f'{safe(sentence)} <span class="calm">Your review is unchanged.</span>'
