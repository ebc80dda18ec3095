"""The ledger: the table of recirculation zones of a run, by frame, of the mean flow, and in time."""

from .export import write_tables
from .frames import FrameLedger, depth_rate, frame_ledger, mean_ledger
from .report import ledger_json

__all__ = ["FrameLedger", "depth_rate", "frame_ledger", "ledger_json", "mean_ledger", "write_tables"]
