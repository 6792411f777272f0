"""Sums over the elements around each node, some hundred nodes at a time and on several threads.

Element by element, all contributions would have to be written out and sorted; node by node, only the result is.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from itertools import pairwise
from typing import TypeVar

import numpy as np
from scipy.sparse import csc_array, csr_array

from ..parallel import side_by_side

CONTRIBUTIONS_AT_ONCE = 1 << 15

Sum = TypeVar("Sum")


@dataclass(frozen=True)
class Ring:
    """The elements around some nodes in a row, sorted by the place that the node has in them.

    groups: for each place, the elements (k,). total: (R, K) sums for each node what they contribute, in that order.
    """

    groups: list[np.ndarray]
    total: csr_array


def summed_matrix(elements: np.ndarray, row: Callable[[int, np.ndarray], np.ndarray], size: int) -> csr_array:
    """(N, N) sum of element matrices; elements (M, n), row(a, chosen) gives row a (k, n) of those chosen (k,)."""

    def rows_of(ring: Ring) -> csr_array:
        values = np.concatenate([row(place, chosen) for place, chosen in enumerate(ring.groups)])
        columns = elements.take(np.concatenate(ring.groups), axis=0)
        starts = values.shape[1] * np.arange(len(values) + 1, dtype=np.int32)
        return ring.total @ csr_array((values.ravel(), columns.ravel(), starts), shape=(len(values), size))

    return stacked(_of_all_nodes(rows_of, elements, size))


def summed_at_nodes(elements: np.ndarray, value: Callable[[int, np.ndarray], np.ndarray], size: int) -> np.ndarray:
    """(N, c) sums at the nodes; value(a, chosen) gives what the chosen elements (k,) add at their node a, (k, c)."""

    def sums_of(ring: Ring) -> np.ndarray:
        return ring.total @ np.concatenate([value(place, chosen) for place, chosen in enumerate(ring.groups)])

    return np.concatenate(_of_all_nodes(sums_of, elements, size))


def _of_all_nodes(work: Callable[[Ring], Sum], elements: np.ndarray, size: int) -> list[Sum]:
    every = np.arange(elements.size + 1, dtype=np.int32)
    one_each = np.ones(elements.size, bool)
    contributions = csc_array((one_each, elements.ravel(), every), shape=(size, elements.size)).tocsr()
    starts, slots, places = contributions.indptr, contributions.indices, elements.shape[1]
    cuts = np.unique([*np.searchsorted(starts, every[::CONTRIBUTIONS_AT_ONCE]), size]).tolist()

    def of_nodes(first_and_last: tuple[int, int]) -> Sum:
        first, last = first_and_last
        mine = slots[starts[first] : starts[last]]
        return work(_ring(mine, starts[first : last + 1] - starts[first], places))

    return side_by_side(of_nodes, pairwise(cuts))


def _ring(slots: np.ndarray, starts: np.ndarray, places: int) -> Ring:
    """slots: (K,) element times places plus place, node after node; starts: (R + 1,) of each node among them."""
    element, place = np.divmod(slots, np.int32(places))
    by_place = np.argsort(place.astype(np.uint8), kind="stable")
    groups = np.split(element.take(by_place), np.cumsum(np.bincount(place, minlength=places))[:-1])
    moved = np.empty(len(slots), np.int32)
    moved[by_place] = np.arange(len(slots), dtype=np.int32)
    return Ring(groups, csr_array((np.ones(len(slots)), moved, starts), shape=(len(starts) - 1, len(slots))))


def stacked(blocks: list[csr_array]) -> csr_array:
    """The rows of all blocks below each other; the list is emptied on the way, so that memory holds them only once."""
    columns, count = blocks[0].shape[1], sum(block.nnz for block in blocks)
    starts = np.concatenate([[0], np.cumsum(np.concatenate([np.diff(block.indptr) for block in blocks]))])
    data, indices, at = np.empty(count), np.empty(count, np.int32), 0
    blocks.reverse()
    while blocks:
        block = blocks.pop()
        data[at : at + block.nnz], indices[at : at + block.nnz] = block.data, block.indices
        at += block.nnz
    return csr_array((data, indices, starts.astype(np.int32)), shape=(len(starts) - 1, columns))
