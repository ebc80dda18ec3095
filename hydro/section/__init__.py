"""Lines across and along the flow, and what they measure."""

from .cut import Section, cut
from .figures import FORMULAS, SectionFigures, section_figures, shares, velocity_area

__all__ = ["FORMULAS", "Section", "SectionFigures", "cut", "section_figures", "shares", "velocity_area"]
