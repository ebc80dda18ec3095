"""What Leewater chose by itself for a review, and whether somebody has accepted or overruled it."""

from __future__ import annotations

import tomllib
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from typing import Any

from .arrival.structures import found_representation
from .ledger.frames import plan_for
from .review import Review, RunEntry
from .settings import REGISTRY

SETTINGS = ("wet_depth_m", "automatic_sections")


@dataclass(frozen=True, slots=True)
class Choice:
    """One automatic choice.

    ``id`` is lasting; ``sentence`` says what was taken and why; ``how`` names the entry of review.toml that
    overrules it; ``standing`` says who accepted or overruled it, and when.
    """

    id: str
    sentence: str
    how: str
    standing: str

    @property
    def open(self) -> bool:
        """Whether nobody has answered it as it now stands."""
        return self.standing.startswith(("nobody", "accepted otherwise"))


def automatic_choices(review: Review) -> list[Choice]:
    """Every automatic choice of a review, with its standing in the log; reads one frame of each run.

    Raises ``ValueError`` when a run cannot be opened.
    """
    found = [(name, _of_setting(review, name), name) for name in SETTINGS]
    found += [("centre_line", _of_centre_line(review), "layer centre_line of the lines")]
    found += [(f"boundaries/{e.id}", _of_boundaries(review, e), "boundaries.closed or boundaries.open.NAME") for e in review.runs]
    found += [(f"represented_as/{s.id}", _of_structure(review, s), f"represented_as.{s.id}") for s in review.reach.structures]
    log = review.logged()
    return [Choice(i, sentence, how, _standing(log, i, sentence)) for i, sentence, how in found]


def accept(review: Review, choice_id: str, *, who: str) -> Choice:
    """Log that somebody accepts an automatic choice as it stands.

    Raises ``ValueError`` for an unknown choice, listing the known ones, or without a name.
    """
    if not who.strip():
        raise ValueError("who accepts it? Give a name.")
    known = {c.id: c for c in automatic_choices(review)}
    if choice_id not in known:
        raise ValueError(f"there is no automatic choice {choice_id!r}; there are {', '.join(known)}.")
    chosen = known[choice_id]
    review.log(who=who, what=f"accepted: {chosen.sentence}", choice=choice_id, answer="accepted", taken=chosen.sentence)
    return next(c for c in automatic_choices(review) if c.id == choice_id)


def overrule(review: Review, name: str, value: str, *, who: str, why: str = "") -> Review:
    """Set an entry of review.toml by its name and log it; where it stood for an automatic choice, that is overruled.

    Parameters
    ----------
    name : str
        A setting, ``represented_as.ID``, ``boundaries.closed`` or ``boundaries.open.NAME``.
    value : str
        A TOML value; a bare word is text.

    Returns
    -------
    Review
        Opened anew.

    Raises
    ------
    ValueError
        For an unknown name, a value that review.toml may not hold, no name of a person, or a file that somebody
        else saved meanwhile; nothing is written then.
    """
    if not who.strip():
        raise ValueError("who changes it? Give a name.")
    keys = _keys(name)
    given = _value(value)

    def change(document: Any) -> None:
        table = document
        for key in keys[:-1]:
            if key not in table:
                table[key] = {}
            table = table[key]
        table[keys[-1]] = given

    ids = _choices_of(review, name)
    what = f"{name} set to {value}" + (f": {why.strip()}" if why.strip() else "")
    return review.edit(change, who=who, what=what, check=_checks(name), **({"choices": ids, "answer": "overruled"} if ids else {}))


def _checks(name: str) -> Callable[[Review], object]:
    """What must still work once an entry is set."""
    if name.startswith("boundaries."):
        return lambda trial: [trial.open(e.id) for e in trial.runs]
    return lambda trial: trial.reach


def _keys(name: str) -> list[str]:
    parts = name.split(".", 2)
    if name in REGISTRY:
        return ["settings", name]
    shapes = {("boundaries", "closed"): 2, ("boundaries", "open"): 3, ("represented_as",): 2}
    if any(tuple(parts[: len(head)]) == head and len(parts) == length for head, length in shapes.items()):
        return parts
    raise ValueError(
        f"{name!r} cannot be set here; name a setting ({', '.join(sorted(REGISTRY))}), represented_as.ID, boundaries.closed "
        "or boundaries.open.NAME."
    )


def _value(text: str) -> Any:
    try:
        return tomllib.loads(f"value = {text}")["value"]
    except tomllib.TOMLDecodeError:
        return text


def _choices_of(review: Review, name: str) -> list[str]:
    if name.startswith("boundaries."):
        return [f"boundaries/{e.id}" for e in review.runs]
    if name.startswith("represented_as."):
        return [name.replace(".", "/", 1)]
    return [name] if name in SETTINGS else []


def _of_setting(review: Review, name: str) -> str:
    value, rule = review.settings[name], REGISTRY[name]
    origin = f"the default ({rule.source})" if value == rule.default else f"set in the review; the default is {rule.default:g}"
    return f"{name} is {value:g} {rule.unit}, {origin}; it touches {rule.touches}."


def _of_centre_line(review: Review) -> str:
    centre = review.reach.centre_line
    if centre is None:
        return "The review has no centre line; a straight one along the mean flow of each run is proposed."
    return f"The centre line of {review.contents.lines}, {centre.length:.0f} m long, decides left, right, upstream and downstream."


def _of_boundaries(review: Review, entry: RunEntry) -> str:
    run = review.open(entry.id)
    first = next((i for i, kind in enumerate(run.times.kinds) if kind != "maximum"), 0)
    names = [b.name for b in plan_for(run, run.frame(first), review.reach_for(run)).boundaries]
    origin = "the flow of the first frame"
    if review.contents.boundaries.open:
        origin = "the review"
    elif set(names) <= set(run.boundary_sets):
        origin = "the file"
    return f"Open boundaries of {entry.label}: {', '.join(names) or 'none'}, by {origin}."


def _of_structure(review: Review, structure: Any) -> str:
    said = "the review" if structure.id in review.contents.represented_as else review.contents.lines
    seen: dict[str, list[str]] = {}
    for entry in review.runs:
        if entry.design and structure.design not in ("both", entry.design):
            continue
        run = review.open(entry.id)
        found = found_representation(run.frame(run.n_frames - 1), run.roughness, structure)
        seen.setdefault(found, []).append(entry.id)
    read = "; ".join(f"{how} in {', '.join(ids)}" for how, ids in seen.items() if how != "unknown")
    return f"{structure.name} is taken as {structure.represented_as} by {said}; the runs show {read or 'nothing that tells'}."


def _standing(log: Sequence[Mapping[str, Any]], id_: str, sentence: str) -> str:
    """The last answer to a choice in the log, in words."""
    for entry in reversed(log):
        if entry.get("choice") == id_ or id_ in entry.get("choices", ()):
            by = f"by {entry.get('who')} on {str(entry.get('at'))[:10]}"
            if entry["answer"] == "accepted" and entry.get("taken") != sentence:
                return f"accepted otherwise {by}; it has changed since"
            return f"{entry['answer']} {by}"
    return "nobody has answered it"
