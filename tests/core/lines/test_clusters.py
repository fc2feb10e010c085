import numpy as np
import pytest

from spinledger.lines.clusters import cluster_lines
from spinledger.lines.picking import Picks


def test_lines_closer_than_the_reach_make_one_cluster() -> None:
    picks = Picks(
        points=np.array([100.0, 110.0, 400.0]),
        heights=np.array([30.0, 10.0, 20.0]),
        noise_sd=1.0,
    )
    clusters = cluster_lines(picks, step_hz=0.2, reach_hz=2.6)
    # 10 points of 0.2 Hz are 2 Hz; the centre is weighted by height.
    assert clusters.points == pytest.approx([102.5, 400.0])
    assert clusters.sums == pytest.approx([40.0, 20.0])
    assert clusters.tops == pytest.approx([30.0, 20.0])
    assert clusters.widths_hz == pytest.approx([2.0, 0.0])


def test_lines_in_the_noise_are_left_out() -> None:
    picks = Picks(points=np.array([100.0]), heights=np.array([5.0]), noise_sd=1.0)
    assert cluster_lines(picks, step_hz=0.2).points.size == 0
