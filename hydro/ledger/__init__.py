"""The ledger: the table of recirculation zones of a run, by frame, of the mean flow, and in time."""

from .all_frames import Job, read_all
from .export import write_tables
from .follow import Life, follow, follow_travelling
from .frames import FrameLedger, FrameReader, depth_rate, frame_ledger, mean_ledger
from .report import ledger_json
from .summary import FrameSummary
from .windows import Instants, instants_of, lumped_area, twin_of

__all__ = [
    "FrameLedger", "FrameReader", "FrameSummary", "Instants", "Job", "Life", "depth_rate", "follow", "follow_travelling", "frame_ledger",
    "instants_of", "ledger_json", "lumped_area", "mean_ledger", "read_all", "twin_of", "write_tables",
]
