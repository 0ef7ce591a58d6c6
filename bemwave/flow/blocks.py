"""A large matrix of smooth influences, kept as blocks of few rows' worth each.

Points close together see what is far from all of them alike, so the rows of a block span far fewer
dimensions than there are of them. A basis is found by random sums of its columns: Halko,
Martinsson & Tropp (2011), SIAM Review 53:217, algorithm 4.2.
"""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
import numpy.typing as npt

Array = npt.NDArray[np.float64]
Floats = npt.NDArray[np.float32]
Ints = npt.NDArray[np.int64]

LARGEST = 500  # points of a block
ACCURACY = 3e-6  # of a block, as the root of the sum of squares


class BlockMap:
    """The map from values to `components` numbers at each of n points.

    Parameters
    ----------
    points : (n, 3).
    rows : gives the matrix's rows (points, components, columns) at some of the points.
    weights : (columns,) magnitudes of the values, by which errors are weighed.
    """

    def __init__(
        self, points: Array, rows: Callable[[Array], Array], weights: Array, components: int
    ) -> None:
        self._shape = (len(points), components)
        self._blocks: list[tuple[Ints, list[Floats]]] = []
        for numbers in close_together(points):
            matrix = rows(points[numbers]).reshape(components * len(numbers), -1)
            self._blocks.append((numbers, _factors(matrix, weights)))

    @property
    def memory(self) -> int:
        """Bytes held."""
        return sum(factor.nbytes for _, factors in self._blocks for factor in factors)

    def __matmul__(self, values: Array) -> Array:
        result = np.empty(self._shape)
        single = values.astype(np.float32)
        for numbers, factors in self._blocks:
            part = single
            for factor in reversed(factors):
                part = factor @ part
            result[numbers] = part.reshape(len(numbers), -1)
        return result


def close_together(points: Array) -> list[Ints]:
    """Numbers of the points (n, 3), halved across the longest side until few are together."""
    done, left = [], [np.arange(len(points))]
    while left:
        numbers = left.pop()
        if len(numbers) <= LARGEST:
            done.append(numbers)
            continue
        axis = np.argmax(np.ptp(points[numbers], axis=0))
        order = np.argsort(points[numbers, axis], kind="stable")
        left += np.array_split(numbers[order], 2)
    return done


def _factors(matrix: Array, weights: Array) -> list[Floats]:
    """Two thin matrices whose product is the given one, or itself if they would not be thin."""
    weighted = matrix * weights
    size = np.linalg.norm(weighted)
    random = np.random.default_rng(1)
    rank = 32
    while rank < min(matrix.shape) // 3:
        basis = np.linalg.qr(weighted @ random.standard_normal((len(weights), rank)))[0]
        inner = basis.T @ weighted
        if np.linalg.norm(weighted - basis @ inner) <= ACCURACY * size:
            return [basis.astype(np.float32), (inner / weights).astype(np.float32)]
        rank = 3 * rank // 2
    return [matrix.astype(np.float32)]
