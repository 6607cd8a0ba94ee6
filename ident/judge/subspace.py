"""Subspace: a state-space model by sippy-unipi, used as a second opinion and nowhere else.

The library prints, exits and warns, takes seconds to import, and may fail on any record: it is imported on the first
call, its output is swallowed, and every failure of its is an answer of None with the reason.
(Van Overschee and De Moor 1996: N4SID.)
"""

from __future__ import annotations

import contextlib
import io
import warnings

import numpy as np

from ident.record.segments import Floats

ORDERS = (2, 4)
HORIZON = 20  # block rows
FEWEST = 6 * HORIZON  # rows


def subspace_step(command: Floats, speed: Floats, dead: int, rows: int) -> tuple[Floats | None, str]:
    """Step response (rows,) of an N4SID model of order 2 to 4 by AIC, and "" or why there is none.

    command, speed  (n,), one unbroken run on one sample time;  dead  rows of dead time taken off the command first,
                    because models of so few states cannot hold it
    """
    command = command[: len(command) - dead] - command.mean()
    speed = speed[dead:] - speed.mean()
    if len(speed) < FEWEST:
        return None, f"the longest run has {len(speed)} rows, {FEWEST} are needed"
    try:
        with contextlib.redirect_stdout(io.StringIO()), warnings.catch_warnings(), np.errstate(all="ignore"):
            warnings.simplefilter("ignore")
            import sippy_unipi

            model = sippy_unipi.system_identification(
                speed, command, "N4SID", IC="AIC", SS_orders=list(ORDERS), SS_f=HORIZON, SS_p=HORIZON
            )
            A, B, C = (np.asarray(m, dtype=np.float64) for m in (model.A, model.B, model.C))
    except (Exception, SystemExit) as error:
        return None, f"{type(error).__name__}: {error}"
    if not np.isfinite(A).all() or float(np.abs(np.linalg.eigvals(A)).max()) >= 1.0:
        return None, "its model is unstable"
    response, state = np.zeros(rows), np.zeros(len(A))
    for k in range(dead, rows):
        response[k] = (C @ state).item()
        state = A @ state + B[:, 0]
    return (response, "") if np.isfinite(response).all() else (None, "its response is not finite")
