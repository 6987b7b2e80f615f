"""Linear recurrences along a curve: x at the next knot is a share of x at this one, plus what the step brings."""

from __future__ import annotations

import numpy as np

from agewatch.aging.kinetics import Floats

_BLOCK = 32


def run(start: Floats, keep: Floats, bring: Floats) -> Floats:
    """x_0 = start, x_{i+1} = keep · x_i + bring_i, where the share kept is the same at every step.

    Parameters
    ----------
    start
        Any shape.
    keep
        Shape of `start`, between 0 and 1.
    bring
        (n_steps, …), its steps in the shape of `start`.

    Returns
    -------
    (n_steps + 1, …).

    Notes
    -----
    Inside blocks of steps the recurrence is a product with a triangle of powers of `keep`; only the blocks are
    walked one after another.
    """
    if len(bring) < _BLOCK:
        return _step_by_step(start, keep, bring)
    blocks = -(-len(bring) // _BLOCK)
    padded = np.zeros((blocks * _BLOCK, start.size))
    padded[: len(bring)] = bring.reshape(len(bring), -1)
    keep = keep.ravel()
    lag = np.subtract.outer(np.arange(_BLOCK), np.arange(_BLOCK))
    triangle = np.where(lag >= 0, keep[:, None, None] ** np.maximum(lag, 0), 0.0)
    inside = np.matmul(triangle, padded.T.reshape(start.size, blocks, _BLOCK).transpose(0, 2, 1))
    fading = keep ** np.arange(1, _BLOCK + 1)[:, None]
    x = np.empty((blocks * _BLOCK + 1, start.size))
    x[0] = start.ravel()
    for block in range(blocks):
        begin = block * _BLOCK
        x[begin + 1 : begin + 1 + _BLOCK] = inside[:, :, block].T + fading * x[begin]
    return x[: len(bring) + 1].reshape(len(bring) + 1, *start.shape)


def _step_by_step(start: Floats, keep: Floats, bring: Floats) -> Floats:
    x = np.empty((len(bring) + 1, *start.shape))
    x[0] = start
    for step, brought in enumerate(bring):
        x[step + 1] = keep * x[step] + brought
    return x
