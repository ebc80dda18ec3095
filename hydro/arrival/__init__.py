"""The audit of what has arrived, and the sheet that asks for what is missing. Findings only, never a verdict."""

from .audit import audit
from .finding import GRADES, Finding

__all__ = ["GRADES", "Finding", "audit"]
