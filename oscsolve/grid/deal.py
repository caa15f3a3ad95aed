"""Who gets which model: neighbours of a track go to one worker, one after another."""

from __future__ import annotations

import os
from collections import deque
from collections.abc import Iterable, Iterator

from oscsolve.grid.plan import Planned

#: Most models of one track that are set aside for one worker.
BLOCK = 8


class Dealer:
    """Deals models of a plan to workers, in blocks of one track; nothing is left over.

    Parameters
    ----------
    planned : the models to solve; read only as far as needed
    block : most models set aside for one worker
    """

    def __init__(self, planned: Iterable[Planned], block: int = BLOCK) -> None:
        self._blocks = _blocks(planned, block)
        self._hands: dict[int, deque[Planned]] = {}

    def deal(self, place: int) -> Planned | None:
        """The next model for a worker, or None where no models are left."""
        hand = self._hands.setdefault(place, deque())
        if not hand:
            hand.extend(next(self._blocks, ()))
        if hand:
            return hand.popleft()
        # The plan is at its end: take from the one who has most, from the far end of its track.
        longest = max(self._hands.values(), key=len)
        return longest.pop() if longest else None


def _blocks(planned: Iterable[Planned], size: int) -> Iterator[list[Planned]]:
    block: list[Planned] = []
    for item in planned:
        if block and (len(block) == size or track_of(item) != track_of(block[0])):
            yield block
            block = []
        block.append(item)
    if block:
        yield block


def track_of(planned: Planned) -> str:
    """Models in one folder are taken for a track."""
    return os.path.dirname(planned.source)
