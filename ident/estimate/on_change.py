"""Reports on change: a speed that is written only when it has left a deadband about its last report.

Only reports are readings. A row in between holds the last of them, which lags the speed by anything up to the deadband,
always on the side the speed came from: such rows tell the command, and nothing of the speed.

Reports have an error of their own: the first reading beyond the deadband is written, and where the speed creeps
along, a reading that noise has put there. The longer it creeps, the more readings are tried, and the largest error
among m of them grows with log m (Gumbel 1958, Statistics of Extremes). One nuisance beside the offset takes that up:
log m in the direction of the move, its size left to the data (of the shapes tried, the one with the least bias).
Without it the gain of simulated logs comes out 0.5 % too large, nearly three standard deviations
(tests/benchmarks/irregular.py).
"""

from __future__ import annotations

import numpy as np

from ident.record.segments import Floats

SMALLEST = 0.05  # share of the steps between reports that may lie within the deadband (reports forced by a clock)


def ahead(time: Floats, speed: Floats) -> Floats:
    """How far each report runs ahead of the speed, (n,), up to a common factor: 0 where the speed moves fast.

    time, speed    (n,) of the reports of one stretch
    """
    steps = np.diff(time)
    # The first report after a standstill comes late for want of a move, not for want of a reading beyond the band.
    creeping = np.minimum(np.append(steps[:1], steps), np.append(steps, steps[-1:]))
    tried = np.log(creeping / steps.min()) if len(steps) else np.zeros(len(time))
    return np.asarray(np.sign(np.diff(speed, prepend=speed[:1])) * tried)


def deadband(speeds: list[Floats]) -> float:
    """The least change that is reported, from the reports of each stretch; 0 where there is none."""
    moves = np.abs(np.concatenate([np.diff(s) for s in speeds]))
    moves = moves[moves > 0.0]
    return float(np.quantile(moves, SMALLEST)) if len(moves) else 0.0
