"""A pack written out: a folder of small files, or one HTML file with the same parts inside."""

from __future__ import annotations

import base64
import hashlib
import json
import re
import shutil
from pathlib import Path

from hydro.review import write_whole

from .. import theme
from .gather import Pack
from .items import script

WEB = Path(__file__).resolve().parent / "web"
_DESK = Path(__file__).resolve().parent.parent / "web"
SCRIPTS = ("store.js", "water.js", "drift.js", "plate.js", "marks.js", "queries.js", "page.js", "controls.js")
_MARK = '<meta name="generator" content="leewater pack">'
_POLICY = (
    "default-src 'none'; script-src {scripts}; style-src 'self' 'unsafe-inline'; img-src 'self' data: blob:; font-src 'self' data:; "
    "connect-src 'self'; manifest-src 'self'; worker-src 'self'; base-uri 'none'; form-action 'none'"
)


def write_folder(pack: Pack, folder: Path) -> list[Path]:
    """Write a pack as a folder; an older pack there is replaced.

    Raises
    ------
    ValueError
        The folder holds something that is no pack: it is left as it is.
    """
    _refuse_other_things(folder)
    data = folder / "data"
    data.mkdir(parents=True, exist_ok=True)
    for old in data.glob("*.js"):
        if old.stem not in pack.items:
            old.unlink()
    files: dict[str, str | bytes] = {f"data/{name}.js": script(name, text) for name, text in pack.items.items()}
    files |= {name: (WEB / name).read_text("utf-8") for name in (*SCRIPTS, "pack.css", "README.txt")}
    files |= {"desk.css": (_DESK / "desk.css").read_text("utf-8"), "theme.css": theme.stylesheet()}
    files["manifest.webmanifest"] = json.dumps(_manifest(pack), indent=1)
    for part in ("fonts", "icons"):
        shutil.copytree(_DESK / part, folder / part, dirs_exist_ok=True)
    copied = [f"{part}/{p.name}" for part in ("fonts", "icons") for p in sorted((_DESK / part).iterdir())]
    page = _page(pack, _linked(), "'self'")
    files["sw.js"] = _worker(pack, page, files, copied)
    written = []
    # The page comes last: a pack that is half there has no way in.
    for name, content in {**files, "index.html": page}.items():
        _put(folder / name, content)
        written.append(folder / name)
    return [*written, *(folder / name for name in copied)]


def is_pack(folder: Path) -> bool:
    """Whether a folder holds a whole pack: its page, which is written last, says so."""
    page = folder / "index.html"
    return page.is_file() and _MARK in page.read_text("utf-8", errors="replace")


def write_single(pack: Pack, file: Path) -> list[Path]:
    """Write a pack as one HTML file; its scripts are known to the page's policy by their hashes."""
    file.parent.mkdir(parents=True, exist_ok=True)
    scripts = [(WEB / name).read_text("utf-8") for name in SCRIPTS]
    hashes = " ".join(f"'sha256-{base64.b64encode(hashlib.sha256(s.encode()).digest()).decode()}'" for s in scripts)
    styles = "\n".join([theme.stylesheet(), _with_fonts((_DESK / "desk.css").read_text("utf-8")), (WEB / "pack.css").read_text("utf-8")])
    data = "".join(f'<script type="application/octet-stream" id="data-{name}">{text}</script>\n' for name, text in pack.items.items())
    parts = {"head": f"<style>{styles}</style>", "scripts": data + "".join(f"<script>{s}</script>\n" for s in scripts)}
    _put(file, _page(pack, parts, hashes))
    return [file]


def _put(path: Path, content: str | bytes) -> None:
    """A file written whole, for everybody to read: a pack is made to be passed on and served."""
    write_whole(path, content)
    path.chmod(0o644)


def _refuse_other_things(folder: Path) -> None:
    if not folder.exists() or (folder.is_dir() and not any(folder.iterdir())):
        return
    if not is_pack(folder):
        raise ValueError(f"{folder} holds something that is no pack; name a new or empty folder with --out.")


def _linked() -> dict[str, str]:
    head = "".join(f'<link rel="stylesheet" href="{name}">\n' for name in ("theme.css", "desk.css", "pack.css"))
    head += '<link rel="icon" href="icons/leewater.svg" type="image/svg+xml">\n'
    head += '<link rel="manifest" href="manifest.webmanifest">\n'
    return {"head": head, "scripts": "".join(f'<script src="{name}"></script>\n' for name in SCRIPTS)}


def _page(pack: Pack, parts: dict[str, str], scripts: str) -> str:
    """The template with its places filled, all at once, so that nothing filled in is read again."""
    filled = pack.places | parts | {"policy": _POLICY.format(scripts=scripts), "mark": _MARK}
    text = (WEB / "index.html").read_text("utf-8")
    text = re.sub(r"<!--team-->(.*?)<!--/team-->", r"\1" if pack.team else "", text, flags=re.DOTALL)
    return re.sub(r"\{\{(\w+)\}\}", lambda found: filled[found[1]], text)


def _with_fonts(css: str) -> str:
    def inside(found: re.Match[str]) -> str:
        font = (_DESK / found[1]).read_bytes()
        return f'url("data:font/woff2;base64,{base64.b64encode(font).decode("ascii")}")'

    return re.sub(r'url\("(fonts/[^"]+)"\)', inside, css)


def _manifest(pack: Pack) -> dict:
    icons = [{"src": f"icons/leewater-{s}.png", "sizes": f"{s}x{s}", "type": "image/png"} for s in (192, 512)]
    return {
        "name": pack.title, "short_name": pack.title[:24], "start_url": "index.html", "scope": "./", "display": "standalone",
        "background_color": theme.LIGHT.paper, "theme_color": theme.LIGHT.ink, "icons": icons,
    }


def _worker(pack: Pack, page: str, files: dict[str, str | bytes], copied: list[str]) -> str:
    """The service worker of a served pack, named by all it stores: a new pack replaces the old one whole."""
    whole = hashlib.sha256(page.encode())
    for name, content in sorted(files.items()):
        whole.update(name.encode() + (content.encode() if isinstance(content, str) else content))
    stored = json.dumps(["index.html", *files, *copied])
    text = (WEB / "sw.js").read_text("utf-8")
    return text.replace("{{version}}", whole.hexdigest()[:16]).replace("[{{files}}]", stored)
