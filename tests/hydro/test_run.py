"""A run: frames by index and time, windows and their means."""

from __future__ import annotations

import hashlib

import numpy as np
import pytest

from hydro.provenance import files_hash
from tests import builders


def ramp(times):
    """Depth 1 + t / 100 m, moving at 1 m/s."""
    mesh = builders.channel(4, 3)
    return builders.run_of(mesh, times, lambda i: builders.raw_of(mesh, 1.0 + times[i] / 100.0, (1.0, 0.0)))


def test_frames_are_taken_by_index_from_either_end():
    run = ramp([0.0, 10.0, 40.0])
    assert run.frame(-1).seconds == 40.0 and run.frame(1).index == 1
    assert [f.face_depth[0] for f in run.frames()] == pytest.approx([1.0, 1.1, 1.4])
    for index in (3, -4):
        with pytest.raises(ValueError, match=f"no frame {index}; .* has 3, numbered 0 to 2"):
            run.frame(index)


def test_the_nearest_frame():
    run = ramp([0.0, 10.0, 40.0])
    assert [run.nearest(t) for t in (-5, 4, 6, 24, 26, 99)] == [0, 0, 1, 1, 2, 2]


def test_the_mean_over_a_window_is_trapezoidal_in_time():
    """Closed form: a depth linear in time has its middle value as mean over any window, on uneven steps too."""
    run = ramp([0.0, 10.0, 40.0, 50.0])
    mean = run.mean(10.0, 50.0)
    np.testing.assert_allclose(mean.face_depth, 1.3)
    assert mean.kind == "mean" and mean.interval_s == 40.0


def test_a_window_of_one_frame_is_that_frame_and_an_empty_one_is_refused():
    run = ramp([0.0, 10.0, 40.0])
    np.testing.assert_allclose(run.mean(9.0, 11.0).face_depth, 1.1)
    with pytest.raises(ValueError, match="no frame between 50 s and 60 s; the run goes from 0 s to 40 s"):
        run.mean(50.0, 60.0)


def test_a_run_is_known_by_its_files_content(tmp_path):
    """SHA-256 of one file; of the files' hashes where there are several."""
    one, two = tmp_path / "a", tmp_path / "b"
    one.write_bytes(b"water")
    two.write_bytes(b"more water")
    single = hashlib.sha256(b"water").hexdigest()
    assert files_hash([one]) == single
    both = f"{single}\n{hashlib.sha256(b'more water').hexdigest()}"
    assert files_hash([one, two]) == hashlib.sha256(both.encode()).hexdigest()
