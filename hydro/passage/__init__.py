"""Is a way upstream excluded for a fish? Routes by fatigue over resting water, barriers, flows and swimmers."""

from .answer import EXCLUDED, NOT_ASSESSED, NOT_EXCLUDED, Answer, assess
from .areas import Places, places_of
from .export import write_tables
from .fish import EnduranceLine, Fish, read_fish
from .report import figures, passage_json
from .side import jet_speed, pool_power, pool_volume
from .study import FlowAnswer, RunAnswer, Study, study

__all__ = [
    "EXCLUDED", "NOT_ASSESSED", "NOT_EXCLUDED", "Answer", "EnduranceLine", "Fish", "FlowAnswer", "Places", "RunAnswer",
    "Study", "assess", "figures", "jet_speed", "passage_json", "places_of", "pool_power", "pool_volume", "read_fish", "study",
    "write_tables",
]
