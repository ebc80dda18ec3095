"""Packs made on the desk: in the review's exports, one at a time, with a way to stop; and those that lie there."""

from __future__ import annotations

from dataclasses import dataclass
from datetime import UTC, datetime
from functools import partial
from pathlib import Path

from .reading import Reading

KINDS = {"public": "for the public", "team": "for the team"}
PACKS = "packs"  # told to all viewers when one moves on
EXPORTS = "exports"


@dataclass(frozen=True, slots=True)
class Making:
    """A pack that is being made: what is being done, and how far the whole is, 0 to 1."""

    label: str
    share: float


@dataclass(frozen=True, slots=True)
class Finished:
    """A pack that lies in the exports: its folder's name, the date and time it was written (UTC), and its size."""

    name: str
    at: str
    size_mb: float


class Stopped(Exception):
    """The reader asked for an end; nothing has been written."""


class Packs:
    """The packs of one reading's review; shared by all viewers."""

    def __init__(self, reading: Reading) -> None:
        self.reading = reading
        self.making: dict[str, Making] = {}
        self.trouble: dict[str, str] = {}
        self._stop: set[str] = set()

    @property
    def folder(self) -> Path | None:
        """Where packs lie; None where there is no review."""
        review = self.reading.matter().review
        return None if review is None else review.folder / EXPORTS

    def finished(self) -> list[Finished]:
        """The packs in the exports, by name; whatever else lies there is left out."""
        from .pack import is_pack  # here, for a pack is drawn by the questions, which show what lies here

        folder = self.folder
        if folder is None or not folder.is_dir():
            return []
        return [_finished(p) for p in sorted(folder.glob("pack-*")) if is_pack(p)]

    def make(self, kind: str) -> None:
        """Have a pack made in the background; an older one of its kind is replaced once it is ready.

        Raises ``ValueError`` for an unknown kind, or where there is no review to keep it.
        """
        if kind not in KINDS:
            raise ValueError(f"there is no pack {kind!r}; choose {' or '.join(KINDS)}.")
        if self.folder is None:
            raise ValueError("the desk keeps packs in a review's exports; make one of a results file with leewater pack.")
        if kind in self.making:
            return
        self.trouble.pop(kind, None)
        self._stop.discard(kind)
        self.making[kind] = Making("Waiting for other work.", 0.0)
        self.reading.long.forget((PACKS, kind))
        self.reading.long.ahead((PACKS, kind), partial(self._make, kind), label="Making a pack.", group=PACKS)
        self._tell()

    def stop(self, kind: str) -> None:
        """Give up making a pack; an older one stays as it is."""
        if self.making.pop(kind, None) is not None:
            self._stop.add(kind)
            self._tell()

    def _make(self, kind: str) -> None:
        from .pack import gather, write_folder

        folder = self.folder
        assert folder is not None  # make refuses a results file alone

        def progress(label: str, done: int, whole: int) -> None:
            if kind in self._stop:
                raise Stopped
            before = self.making.get(kind)
            self.making[kind] = Making(label, done / whole)
            if before is None or int(50 * before.share) != int(50 * done / whole):
                self._tell()

        try:
            progress("Reading the review.", 0, 1)
            pack = gather(self.reading.path, team=kind == "team", progress=progress)
            progress("Writing the pack.", 1, 1)
            write_folder(pack, folder / f"pack-{kind}")
        except Stopped:
            pass
        except (ValueError, OSError) as error:
            self.trouble[kind] = str(error)
        finally:
            if kind not in self._stop:
                self.making.pop(kind, None)
            self._tell()

    def _tell(self) -> None:
        self.reading.long.tell(PACKS)


def _finished(folder: Path) -> Finished:
    size = sum(p.stat().st_size for p in folder.rglob("*") if p.is_file())
    at = datetime.fromtimestamp((folder / "index.html").stat().st_mtime, UTC)
    return Finished(folder.name, f"{at:%Y-%m-%d at %H:%M}", size / 1e6)
