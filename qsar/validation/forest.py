"""A count-fingerprint random forest: what a model must beat (see also :mod:`qsar.validation.lines`)."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from qsar.structures import Acid

Floats = NDArray[np.float64]
Counts = NDArray[np.float32]
Ints = NDArray[np.int64]
_BITS = 2048


def count_fingerprints(acids: Sequence[Acid], steps: Ints) -> Counts:
    """Folded Morgan counts of radius 2 (Rogers & Hahn, J. Chem. Inf. Model. 2010, 50, 742), step and COOH count.

    Parameters
    ----------
    acids : sequence of Acid
        One for each row.
    steps : ndarray of int, shape (n,)

    Returns
    -------
    ndarray of float32, shape (n, 2050)
        What forests work with; counts are exact in it.
    """
    from rdkit.Chem.rdFingerprintGenerator import GetMorganGenerator

    generator = GetMorganGenerator(radius=2, fpSize=_BITS)
    table = np.empty((len(acids), _BITS + 2), dtype=np.float32)
    seen: dict[str, int] = {}
    for row, acid in enumerate(acids):
        first = seen.setdefault(acid.smiles, row)
        table[row, :_BITS] = table[first, :_BITS] if first < row else generator.GetCountFingerprintAsNumPy(acid.mol)
    table[:, _BITS] = steps
    table[:, _BITS + 1] = [len(acid.sites) for acid in acids]
    return table


def fit_forest(x: Counts, y: Floats, seed: int = 0, trees: int = 100):  # type: ignore[no-untyped-def]
    """Fit a random forest (Breiman, Mach. Learn. 2001, 45, 5) to count fingerprints.

    Returns
    -------
    sklearn.ensemble.RandomForestRegressor
    """
    from sklearn.ensemble import RandomForestRegressor

    return RandomForestRegressor(n_estimators=trees, max_features=0.3, random_state=seed).fit(x, y)
