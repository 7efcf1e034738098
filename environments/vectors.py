"""Arrays of vectors, shape (3, N): axis first, then time."""

import numpy as np
from numpy.typing import ArrayLike, NDArray


def as_vectors(value: ArrayLike, name: str) -> NDArray[np.float64]:
    """Check that an argument is a finite array of vectors.

    Parameters
    ----------
    value : array_like, shape (3, N)
        Any unit.
    name : str
        What to call it in the error.

    Returns
    -------
    ndarray, shape (3, N)

    Raises
    ------
    ValueError
        Other shape, nan or inf.

    Examples
    --------
    >>> as_vectors([[1], [2], [3]], "position_m").shape
    (3, 1)
    """
    array = np.asarray(value, dtype=np.float64)
    if array.ndim != 2 or array.shape[0] != 3 or not bool(np.isfinite(array).all()):
        raise ValueError(f"{name} must be finite and have the shape (3, N)")
    return array


def length(vector: NDArray[np.float64]) -> NDArray[np.float64]:
    """Lengths of vectors, shape (3, N) to (N,), same unit.

    Examples
    --------
    >>> length(np.array([[3.0], [0.0], [4.0]])).tolist()
    [5.0]
    """
    return np.asarray(np.sqrt(np.sum(vector**2, axis=0)), dtype=np.float64)


def direction(vector: ArrayLike) -> NDArray[np.float64]:
    """Unit vectors along vectors.

    Parameters
    ----------
    vector : array_like, shape (3, N)
        Any unit, none of them zero.

    Returns
    -------
    ndarray, shape (3, N)

    Raises
    ------
    ValueError
        Wrong shape, not finite, or a vector of length zero.

    Examples
    --------
    >>> direction([[3.0], [0.0], [4.0]])[:, 0].tolist()
    [0.6, 0.0, 0.8]
    """
    v = as_vectors(vector, "vector")
    size = length(v)
    if not bool((size > 0.0).all()):
        raise ValueError("a vector of length zero has no direction")
    return np.asarray(v / size, dtype=np.float64)
