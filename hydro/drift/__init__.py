"""Floating wood against piers and openings: of the modelled logs, never a forecast."""

from .share import Share, share_of, wilson
from .study import Drifted, Rules, drift, sentence, settings_tried
from .wood import Wood, design_log_length, draft, logs

__all__ = [
    "Drifted", "Rules", "Share", "Wood", "design_log_length", "draft", "drift", "logs", "sentence", "settings_tried",
    "share_of", "wilson",
]
