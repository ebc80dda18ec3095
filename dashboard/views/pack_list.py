"""The packs of a review as the Record question shows them: what is there, what is being made, what can be made."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

from ..packs import KINDS, Finished, Making
from ..text import safe


def html(finished: Sequence[Finished], making: Mapping[str, Making], trouble: Mapping[str, str]) -> str:
    """A line for each finished pack, the work that is going on, and a button for each kind."""
    items = "".join(
        f'<li><a href="/pack/{p.name}/index.html" target="_blank" rel="noopener">{safe(p.name)}</a>, made on {p.at} UTC, '
        f"{p.size_mb:.1f}\u00a0MB</li>" for p in finished
    )
    there = f"<ul>{items}</ul>" if items else ""
    kinds = "".join(_kind(kind, words, making.get(kind), trouble.get(kind)) for kind, words in KINDS.items())
    return (
        '<section class="packs" aria-label="Packs"><h2>Packs</h2><p>A pack shows the review in any browser without this desk. One that '
        "was opened here also opens when the desk has stopped. A pack for the team holds the queries and their authors; one for the public names "
        f'nobody.</p>{there}<div class="kinds">{kinds}</div></section>'
    )


def _kind(kind: str, words: str, making: Making | None, trouble: str | None) -> str:
    if making is not None:
        done = int(100 * making.share)
        return (
            f'<p class="progress" role="status"><span>Making the pack {words}. {safe(making.label.rstrip("."))}: {done}\u00a0%</span>'
            f'<progress max="100" value="{done}" aria-label="Making the pack {words}"></progress>'
            f'<button type="button" class="plain" data-do="unpack" data-value="{kind}" data-key="unpack-{kind}">Stop</button></p>'
        )
    told = f'<p class="status"><span class="trouble">{safe(trouble)}</span></p>' if trouble else ""
    return (
        f'{told}<div><button type="button" class="plain" data-do="pack" data-value="{kind}" data-key="pack-{kind}">'
        f"Make a pack {words}</button></div>"
    )
