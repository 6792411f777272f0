"""Products with large sparse matrices in blocks of rows, side by side on several threads."""

from __future__ import annotations

from dataclasses import dataclass
from itertools import pairwise

import numpy as np
from scipy.sparse import csr_array

from ..parallel import side_by_side, threads
from .around import stacked

# Below so many entries in a block, handing it to a thread takes longer than the product.
WORTH_A_THREAD = 300_000
# Entries of the left matrix to a block: the same whatever the number of threads.
ENTRIES_AT_ONCE = 2_000_000


@dataclass(frozen=True)
class Rows:
    """A matrix (n, m) as the blocks of its rows."""

    blocks: tuple[csr_array, ...]

    def __matmul__(self, vectors: np.ndarray) -> np.ndarray:
        """(n, k): the products with vectors (m, k)."""
        if vectors.shape[1] == 1:
            # SciPy is faster with one vector that is not a matrix.
            return self._times(vectors[:, 0])[:, None]
        return self._times(vectors)

    def left(self, loads: np.ndarray, vectors: np.ndarray) -> np.ndarray:
        """(n, k): loads (n, k) less the products with vectors (m, k)."""
        products = self @ vectors
        return np.subtract(loads, products, out=products)

    def _times(self, vectors: np.ndarray) -> np.ndarray:
        if len(self.blocks) == 1:
            return self.blocks[0] @ vectors
        return np.concatenate(side_by_side(lambda block: block @ vectors, self.blocks))


def in_rows(matrix: csr_array) -> Rows:
    """As many blocks as there are threads, if that pays; they share the matrix's memory."""
    return Rows(_blocks(matrix, max(1, min(threads(), matrix.nnz // WORTH_A_THREAD))))


def product(left: csr_array, right: csr_array) -> csr_array:
    """The matrix left @ right."""
    blocks = in_pieces(left)
    if len(blocks) == 1:
        return left @ right
    return stacked(side_by_side(lambda block: block @ right, blocks))


def in_pieces(matrix: csr_array) -> tuple[csr_array, ...]:
    """Blocks of rows, the same whatever the number of threads, for work that is done piece by piece."""
    return _blocks(matrix, 1 + matrix.nnz // ENTRIES_AT_ONCE)


def _blocks(matrix: csr_array, count: int) -> tuple[csr_array, ...]:
    """Blocks of about as many entries each."""
    cuts = np.searchsorted(matrix.indptr, np.linspace(0, matrix.nnz, count + 1)[1:-1])
    bounds = [0, *cuts.tolist(), matrix.shape[0]]
    return tuple(_rows(matrix, first, last) for first, last in pairwise(bounds))


def _rows(matrix: csr_array, first: int, last: int) -> csr_array:
    starts = matrix.indptr[first : last + 1]
    inside = slice(starts[0], starts[-1])
    block = (matrix.data[inside], matrix.indices[inside], starts - starts[0])
    return csr_array(block, shape=(last - first, matrix.shape[1]))
