"""Which unknown each local function has, and how local matrices and vectors are summed."""

from __future__ import annotations

from dataclasses import dataclass, replace
from functools import cached_property

import numpy as np
from numpy.typing import NDArray
from scipy.sparse import csc_matrix
from scipy.sparse.linalg import splu

Array = NDArray[np.float64]
Index = NDArray[np.int64]

FILL_REDUCING = "MMD_AT_PLUS_A"
PRESERVING = "NATURAL"


@dataclass(frozen=True)
class Numbering:
    """The unknowns of one side on one mesh.

    Parameters
    ----------
    unknown : int array, (elements, 6)
        Unknown of each local function, -1 where the value is fixed.
    size : int
        Number of unknowns.
    ordering : str
        SuperLU's ordering of columns that suits the numbers.
    """

    unknown: Index
    size: int
    ordering: str = FILL_REDUCING

    def vector(self, local: Array) -> Array:
        """Return the sum of local vectors (elements, 6) over the unknowns, (size,)."""
        free = self.unknown >= 0
        total = np.bincount(self.unknown[free], weights=local[free], minlength=self.size)
        return np.asarray(total, dtype=float)

    def matrix(self, local: Array) -> csc_matrix:
        """Return the sum of local matrices (elements, 6, 6) over the unknowns, (size, size)."""
        free, rows, columns = self._places
        if self.ordering == FILL_REDUCING:
            return csc_matrix((local.ravel()[free], (rows, columns)), shape=(self.size, self.size))
        entry, indices, starts = self._pattern
        data = np.bincount(entry, weights=local.ravel()[free], minlength=len(indices))
        return csc_matrix((data, indices, starts), shape=(self.size, self.size))

    def for_many_solutions(self) -> Numbering:
        """Return the same unknowns in an order that fills little as it is.

        It costs about as much as four solutions, and each solution after that is half as long:
        neither the order nor the places of a matrix's entries are found again.
        """
        _, rows, columns = self._places
        ones = np.ones(len(rows))
        graph = csc_matrix((ones, (rows, columns)), shape=(self.size, self.size))
        graph.setdiag(graph.sum(axis=1).A1 + 1.0)  # any values that need no pivoting do
        order = splu(graph, permc_spec=FILL_REDUCING, options={"SymmetricMode": True}).perm_c
        renumbered = np.where(self.unknown >= 0, order[self.unknown], -1)
        return replace(self, unknown=renumbered, ordering=PRESERVING)

    @cached_property
    def _places(self) -> tuple[Index, Index, Index]:
        """Places of the free entries among all local ones, and their rows and columns."""
        rows = np.broadcast_to(self.unknown[:, :, None], (len(self.unknown), 6, 6)).ravel()
        columns = np.broadcast_to(self.unknown[:, None, :], (len(self.unknown), 6, 6)).ravel()
        free = np.flatnonzero((rows >= 0) & (columns >= 0))
        return free, rows[free], columns[free]

    @cached_property
    def _pattern(self) -> tuple[Index, Index, Index]:
        """Entry of the matrix that each free local one adds to; row indices; starts of columns."""
        _, rows, columns = self._places
        keys, entry = np.unique(columns * self.size + rows, return_inverse=True)
        starts = np.searchsorted(keys, np.arange(self.size + 1) * self.size)
        return entry, keys % self.size, starts
