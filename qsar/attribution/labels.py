"""Where the numbers stand on a drawing: beside their group, clear of atoms, bonds and each other."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]

_DIRECTIONS = np.pi * np.arange(24) / 12.0
_REACHES = (0.45, 0.6, 0.75, 0.9, 1.1, 1.3, 1.6)  # bond lengths from an atom of the group to the middle of its label
_CLEAR = 0.22  # bond lengths between a label and anything else that are enough
_CHARACTER = 0.58  # width of a character of the drawing's font in heights


def place_labels(
    texts: Sequence[str],
    groups: Sequence[Floats],
    lines: Floats,
    font_size: float,
    size: tuple[float, float],
) -> list[tuple[float, float]]:
    """Middles of the labels, in pixels.

    Parameters
    ----------
    texts : sequence of str
    groups : sequence of ndarray, shape (n_atoms, 2)
        Places of the atoms that each label belongs to.
    lines : ndarray, shape (n_bonds, 2, 2)
        Both ends of every bond.
    font_size : float
        Height of a character.
    size : tuple of float
        Width and height that may be written on.

    Notes
    -----
    Labels are placed one after the other, each at the nearest place around its group that is clear enough; where there
    is none, at the clearest.
    """
    bond = float(np.median(np.linalg.norm(lines[:, 0] - lines[:, 1], axis=1)))
    along = np.linspace(0.0, 1.0, 9)[:, None, None]
    taken = (lines[:, 0] * (1.0 - along) + lines[:, 1] * along).reshape(-1, 2)
    placed = []
    for text, atoms in zip(texts, groups, strict=True):
        half = np.array([0.5 * _CHARACTER * len(text), 0.5]) * font_size
        best = _best(atoms, taken, half, bond, np.array(size))
        placed.append((float(best[0]), float(best[1])))
        corners = best + half * np.array([[x, y] for x in (-1.0, -0.5, 0.0, 0.5, 1.0) for y in (-1.0, 0.0, 1.0)])
        taken = np.vstack([taken, corners])
    return placed


def _best(atoms: Floats, taken: Floats, half: Floats, bond: float, size: Floats) -> Floats:
    around = np.column_stack([np.cos(_DIRECTIONS), np.sin(_DIRECTIONS)])
    best: Floats = atoms.mean(axis=0)
    clearest = -np.inf
    for reach in _REACHES:
        middles = (atoms[:, None] + (reach * bond + half * np.abs(around)) * around).reshape(-1, 2)
        middles = middles[((middles > half) & (middles < size - half)).all(axis=1)]
        if not len(middles):
            continue
        outside = np.maximum(np.abs(taken[None] - middles[:, None]) - half, 0.0)
        clearance = np.linalg.norm(outside, axis=2).min(axis=1)
        k = int(np.argmax(clearance))
        if clearance[k] > clearest:
            best, clearest = middles[k], float(clearance[k])
        if clearest >= _CLEAR * bond:
            break
    return best
