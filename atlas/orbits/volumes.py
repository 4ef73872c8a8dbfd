"""How lengths, areas and volumes grow under a map: compound matrices of its Jacobian, as formulas.

The k-th compound matrix holds the k x k minors of the Jacobian; it maps the k-volumes that tangent vectors
span. Their growth gives the sums of the k largest Lyapunov exponents without any orthogonalisation (Benettin,
Galgani, Giorgilli & Strelcyn 1980, Meccanica 15, 9-20, who take volumes; citation from memory).
"""

from __future__ import annotations

from itertools import combinations

from atlas.formula.algebra import ONE, ZERO, difference, product, total
from atlas.formula.tree import Name, Node

Matrix = tuple[tuple[Node, ...], ...]


def compounds(jacobian: Matrix) -> tuple[Matrix, ...]:
    """Return the compound matrices of a matrix, from the matrix itself to its determinant.

    Parameters
    ----------
    jacobian : tuple of tuple of Node
        Of one to three rows.
    """
    size = len(jacobian)
    found = []
    for order in range(1, size + 1):
        chosen = list(combinations(range(size), order))
        found.append(tuple(tuple(_minor(jacobian, rows, columns) for columns in chosen) for rows in chosen))
    return tuple(found)


def carried(matrices: tuple[Matrix, ...], vectors: list[str]) -> list[Node]:
    """Return the next value of every component of the vectors that compound matrices carry along.

    Parameters
    ----------
    matrices : tuple of Matrix
    vectors : list of str
        Names of the components, those of the first matrix first.
    """
    found: list[Node] = []
    at = 0
    for matrix in matrices:
        names = vectors[at : at + len(matrix)]
        found += [
            total(product(entry, Name(name)) for entry, name in zip(row, names, strict=True))
            for row in matrix
        ]
        at += len(matrix)
    return found


def lengths(states: int) -> tuple[int, ...]:
    """Return how many components the vector of each compound matrix has.

    Examples
    --------
    >>> lengths(3)
    (3, 3, 1)
    """
    return tuple(len(list(combinations(range(states), order))) for order in range(1, states + 1))


def _minor(matrix: Matrix, rows: tuple[int, ...], columns: tuple[int, ...]) -> Node:
    if not rows:
        return ONE
    first, rest = rows[0], rows[1:]
    found: Node = ZERO
    for place, column in enumerate(columns):
        inner = _minor(matrix, rest, columns[:place] + columns[place + 1 :])
        term = product(matrix[first][column], inner)
        found = difference(found, term) if place % 2 else total((found, term))
    return found
