"""A count-fingerprint random forest: what a model must beat (see also :mod:`qsar.validation.lines`)."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from qsar.structures import Acid

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]
_BITS = 2048


def count_fingerprints(acids: Sequence[Acid], steps: Ints) -> Floats:
    """Folded Morgan counts of radius 2 (Rogers & Hahn, J. Chem. Inf. Model. 2010, 50, 742), step and COOH count.

    Parameters
    ----------
    acids : sequence of Acid
        One for each row.
    steps : ndarray of int, shape (n,)

    Returns
    -------
    ndarray, shape (n, 2050)
    """
    from rdkit.Chem.rdFingerprintGenerator import GetMorganGenerator

    generator = GetMorganGenerator(radius=2, fpSize=_BITS)
    seen: dict[str, Floats] = {}
    for acid in acids:
        if acid.smiles not in seen:
            seen[acid.smiles] = generator.GetCountFingerprintAsNumPy(acid.mol).astype(float)
    counts = np.array([seen[acid.smiles] for acid in acids]).reshape(len(acids), _BITS)
    sites = np.array([len(acid.sites) for acid in acids], dtype=float)
    return np.column_stack([counts, np.asarray(steps, dtype=float), sites])


def fit_forest(x: Floats, y: Floats, seed: int = 0, trees: int = 100):  # type: ignore[no-untyped-def]
    """Fit a random forest (Breiman, Mach. Learn. 2001, 45, 5) to count fingerprints.

    Returns
    -------
    sklearn.ensemble.RandomForestRegressor
    """
    from sklearn.ensemble import RandomForestRegressor

    return RandomForestRegressor(n_estimators=trees, max_features=0.3, random_state=seed).fit(x, y)
