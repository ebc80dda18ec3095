"""Every frame of a run, one at a time: on this machine's cores, or on a cluster; in order, stoppable."""

from __future__ import annotations

import multiprocessing
from collections.abc import Callable, Iterator, Sequence
from concurrent.futures import ProcessPoolExecutor
from dataclasses import dataclass
from pathlib import Path

from ..reach import Reach
from ..review import open_results
from ..run import Run
from ..settings import Settings
from .frames import FrameLedger, FrameReader
from .report import frame_json
from .summary import FrameSummary


@dataclass(frozen=True)
class Job:
    """What a worker needs to read frames by itself."""

    path: Path
    settings: Settings | None = None
    sensitivity: bool = True


def read_all(
    run: Run, indices: Sequence[int], *, reach: Reach | None = None, job: Job | None = None, workers: int = 1,
    scheduler: str | None = None, settings: Settings | None = None, sensitivity: bool = True,
    progress: Callable[[int, int], None] = lambda done, all_: None,
) -> Iterator[FrameSummary]:
    """Summaries of frames in the order asked, each as soon as it is ready.

    Parameters
    ----------
    run : Run
    indices : frames
    reach : Reach, optional
        Ignored by workers, who open ``job.path`` with its review.
    job : Job, optional
        Needed for more than one worker, or a scheduler.
    workers : int
        Processes on this machine.
    scheduler : str, optional
        Address of a Dask scheduler; its workers read the same path.
    progress : callable
        Called with the frames done and asked.

    Maxima are passed over. Every frame is worked out by itself, so the digits do not depend on who did it.
    """
    wanted = [i for i in indices if run.times.kinds[i] != "maximum"]
    if scheduler is not None and job is not None:
        results = _on_cluster(scheduler, job, wanted)
    elif workers > 1 and job is not None and len(wanted) > 1:
        results = _on_processes(workers, job, wanted)
    else:
        reader = FrameReader(run, reach=reach, settings=settings, sensitivity=sensitivity)
        results = (summary_of(run, reader.frame(i)) for i in wanted)
    progress(0, len(wanted))
    for done, summary in enumerate(results, 1):
        progress(done, len(wanted))
        yield summary


def summary_of(run: Run, entry: FrameLedger) -> FrameSummary:
    return FrameSummary(entry.frame.index, entry.frame.seconds, frame_json(run, entry), entry.zones.zones, entry.zones.travelling)


_readers: dict[tuple, tuple[Run, FrameReader]] = {}


def _read_one(job: Job, index: int) -> FrameSummary:
    """In a worker: the run is opened once and kept."""
    key = (str(job.path), job.settings.digest() if job.settings else "", job.sensitivity)
    if key not in _readers:
        review, run = open_results(job.path)
        reader = FrameReader(run, reach=review.reach_for(run) if review else None, settings=job.settings, sensitivity=job.sensitivity)
        _readers[key] = run, reader
    run, reader = _readers[key]
    return summary_of(run, reader.frame(index))


def _on_processes(workers: int, job: Job, wanted: Sequence[int]) -> Iterator[FrameSummary]:
    # Fresh processes: a forked one would share open files and half-made threads.
    pool = ProcessPoolExecutor(min(workers, len(wanted)), mp_context=multiprocessing.get_context("spawn"))
    try:
        yield from pool.map(_read_one, [job] * len(wanted), wanted)
    finally:
        pool.shutdown(wait=True, cancel_futures=True)


def _on_cluster(scheduler: str, job: Job, wanted: Sequence[int]) -> Iterator[FrameSummary]:
    from distributed import Client

    with Client(scheduler, set_as_default=False) as client:
        futures = client.map(_read_one, [job] * len(wanted), list(wanted), pure=False)
        try:
            for k, future in enumerate(futures):
                yield future.result()
                futures[k] = None  # let the cluster forget it
        finally:
            client.cancel([f for f in futures if f is not None])
