"""The pack: a folder, or one HTML file, that shows a review in any browser with no Python and no network."""

from .gather import Pack, gather
from .write import is_pack, write_folder, write_single

__all__ = ["Pack", "gather", "is_pack", "write_folder", "write_single"]
