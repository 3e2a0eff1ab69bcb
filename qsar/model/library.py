"""The measured acids that a bundle carries: evidence for the user, and what is known about an acid itself."""

from __future__ import annotations

import re
from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray
from rdkit import Chem

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]


@dataclass(frozen=True, eq=False)
class Library:
    """The measured steps of the training acids; all arrays have shape (n_steps,).

    Attributes
    ----------
    smiles, name, family, source : list of str
        `smiles` are empty where structures were withheld.
    step : ndarray of int
    pka : ndarray
        Measured value.
    uncertainty : ndarray
    pka_without : ndarray
        Prediction by the member that never saw the acid.
    expected_error : ndarray
        Of that prediction.
    """

    smiles: list[str]
    name: list[str]
    family: list[str]
    source: list[str]
    step: Ints
    pka: Floats
    uncertainty: Floats
    pka_without: Floats
    expected_error: Floats

    @cached_property
    def _rows(self) -> dict[str, dict[int, int]]:
        table: dict[str, dict[int, int]] = {}
        for row, smiles in enumerate(self.smiles):
            if smiles:
                table.setdefault(smiles, {})[int(self.step[row])] = row
        for smiles in list(table):  # one stereocentre alone does not matter: a flat drawing finds the measured acid
            if len(re.findall("@+", smiles)) == 1 and not re.search(r"[/\\\\]", smiles):
                table.setdefault(_canonical(smiles.replace("@", "")), table[smiles])
        return table

    @cached_property
    def _atoms(self) -> set[str]:
        return {_atoms_of(smiles) for smiles in self._rows}

    def rows_of(self, smiles: str) -> dict[int, int]:
        """Row of each measured step of an acid, by step; empty where it was not measured.

        Parameters
        ----------
        smiles : str
            Canonical SMILES. An enantiomer finds its mirror image, and an acid whose measured sample was written
            without configuration is found whichever configuration is asked for.
        """
        table = self._rows
        if smiles in table:
            return table[smiles]
        if "@" not in smiles or _atoms_of(smiles) not in self._atoms:
            return {}
        mirrored = _canonical(smiles.replace("@@", "\0").replace("@", "@@").replace("\0", "@"))
        if mirrored in table:
            return table[mirrored]
        return table.get(_canonical(smiles.replace("@", "")), {})

    def label(self, row: int) -> str:
        """What to call the acid of a row: its name, else its structure, else its value."""
        return self.name[row] or self.smiles[row] or f"an acid of pKa {self.pka[row]:.2f}"


def _atoms_of(smiles: str) -> str:
    """What all drawings of one constitution have in common, told without parsing: its heavy atoms."""
    return "".join(sorted(c for c in smiles if c.isalpha() and c != "H"))


def _canonical(smiles: str) -> str:
    mol = Chem.MolFromSmiles(smiles)
    return "" if mol is None else Chem.MolToSmiles(mol)
