"""What an attribution says: the parent, what each substituent contributed, and how sure that is."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

from qsar.substituents import Decomposition

if TYPE_CHECKING:
    from qsar.model.model import StepPrediction
    from qsar.structures import Acid

SITE_STATISTICS = "site statistics"


@dataclass(frozen=True, slots=True)
class Witnesses:
    """Measured matched pairs that show the same exchange: the group against hydrogen at the same distance.

    Attributes
    ----------
    n : int
        Number of pairs; the other fields mean nothing where it is 0.
    low, high, mean : float
        Range and mean of the measured differences, pKa units.
    verdict : str
        "agrees", "contradicts", or "" without pairs.
    examples : tuple of (str, str, float)
        Names of the acid with the group and of the acid without it, and the difference; at most three.
    """

    n: int = 0
    low: float = 0.0
    high: float = 0.0
    mean: float = 0.0
    verdict: str = ""
    examples: tuple[tuple[str, str, float], ...] = ()


@dataclass(frozen=True, slots=True)
class Contribution:
    """One line of an attribution.

    Attributes
    ----------
    substituent : str
        Name with place, as "α-chloro"; "site statistics" for that line.
    name, kind : str
        Name without place, and a key that is equal for equal groups; see `qsar.substituents.Substituent`.
    atoms : tuple of int
        Atoms of ``Explanation.acid.mol``; empty for the site statistics.
    path : tuple of int
        Atoms from the carboxyl carbon to the first atom of the substituent.
    electronegativity : float or None
        Group electronegativity, Pauling scale.
    contribution, low, high : float
        pKa units, with the interval from the members of the ensemble.
    alone : float or None
        What the substituent does on the parent with nothing else there but what carries it, pKa units.
    strongest_pair : str
        The substituent that it interacts with most.
    pair_interaction : float or None
        What both do together beyond the sum of what each does alone, pKa units.
    carrier : int or None
        Position of the line that carries this one.
    sampling_error : float
        Standard error from sampling of orders; 0 where all orders were averaged.
    outside : float
        Share of the orders whose step for this substituent meets a hypothetical molecule outside the domain.
    witnesses : Witnesses
    """

    substituent: str
    name: str
    kind: str
    atoms: tuple[int, ...]
    path: tuple[int, ...]
    electronegativity: float | None
    contribution: float
    low: float
    high: float
    alone: float | None = None
    strongest_pair: str = ""
    pair_interaction: float | None = None
    carrier: int | None = None
    sampling_error: float = 0.0
    outside: float = 0.0
    witnesses: Witnesses = Witnesses()

    @property
    def path_length(self) -> int | None:
        """Bonds from the carboxyl carbon; None for the site statistics."""
        return len(self.path) - 1 if self.path else None


@dataclass(frozen=True, eq=False)
class Explanation:
    """Attribution of one step of one acid: ``pka == parent_pka + sum of the contributions``.

    Attributes
    ----------
    acid : Acid
        Atom numbers refer to ``acid.mol``.
    step : int
    pka : float
        As predicted.
    parent : str
        SMILES of the parent.
    parent_pka : float
        Micro pKa that the model gives it.
    contributions : tuple of Contribution
        Substituents nearest first, then the site statistics where they are not zero.
    decomposition : Decomposition
    ionised : frozenset of int
        Carboxyl carbons without their proton in this step.
    coverage : float
        Of the intervals.
    exact : bool
        Whether all orders were averaged.
    molecules : int
        Distinct hypothetical molecules that were evaluated.
    outside : tuple of str
        SMILES of those outside the domain.
    prediction : StepPrediction
    notes : tuple of str
    """

    acid: Acid
    step: int
    pka: float
    parent: str
    parent_pka: float
    contributions: tuple[Contribution, ...]
    decomposition: Decomposition
    ionised: frozenset[int]
    coverage: float
    exact: bool
    molecules: int
    outside: tuple[str, ...]
    prediction: StepPrediction
    notes: tuple[str, ...] = ()

    @property
    def smiles(self) -> str:
        """Canonical SMILES of the acid."""
        return self.acid.smiles
