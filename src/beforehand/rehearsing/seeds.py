"""Random numbers of a rehearsal: a stream of its own for each replicate.

A replicate draws the same numbers whichever worker computes it, whatever came before it, and
however many replicates there are.
"""

from __future__ import annotations

import numpy as np

# The stream of a scenario is told apart by its place here; a new scenario goes to the end.
STREAMS = ("scrambled", "noise", "expected", "half_samples", "bootstrap", "hold_out", "predictors")


def generator(seed: int, stream: str, replicate: int, part: int = 0) -> np.random.Generator:
    """The generator of one replicate.

    Parameters
    ----------
    seed : int
        Of the whole rehearsal.
    stream : str
        One of ``STREAMS``.
    replicate : int
        From 0.
    part : int
        For a scenario that is made of several, such as one for each number of rows.
    """
    key = (STREAMS.index(stream), part, replicate)
    return np.random.Generator(np.random.PCG64DXSM(np.random.SeedSequence(seed, spawn_key=key)))
