"""Order of rows in files: by numbers first, by text only where the numbers tie."""

from collections.abc import Sequence

import numpy as np
import pyarrow as pa
import pyarrow.compute as pc
from numpy.typing import NDArray


def order_by(keys: Sequence[NDArray[np.generic]], texts: pa.Array, *, ready: bool = False) -> NDArray[np.int64]:
    """Order of rows by whole-number keys, the first one foremost, then by text (by code point), then as they stand.

    ready : the rows are in order of the keys already
    """
    rows = len(texts)
    order = np.arange(rows) if ready else np.lexsort(tuple(reversed(keys)))
    same = np.ones(max(rows - 1, 0), dtype=bool)
    for key in keys:
        ordered = key if ready else key[order]
        same &= ordered[1:] == ordered[:-1]
    tied = np.zeros(rows, dtype=bool)
    tied[1:] |= same
    tied[:-1] |= same
    at = np.flatnonzero(tied)
    if len(at):
        group = np.cumsum(np.append(True, ~same))[at]
        named = texts.take(pa.array(order[at]))
        distinct = pc.unique(named)
        rank = np.empty(len(distinct), dtype=np.int64)
        rank[pc.sort_indices(distinct).to_numpy()] = np.arange(len(distinct))
        place = rank[pc.index_in(named, value_set=distinct).to_numpy()]
        order[at] = order[at][np.lexsort((place, group))]
    return order
