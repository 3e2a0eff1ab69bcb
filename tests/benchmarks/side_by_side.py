"""One block of structures predicted, described and fingerprinted in turn: what a process of the measurement does."""

from __future__ import annotations

from dataclasses import dataclass
from time import perf_counter

from benchmarks.many_acids import acids

BLOCK = 512
EVERY = 8  # the slow measure is taken on every eighth structure of a block


@dataclass
class Timing:
    """Structures and seconds of one block: prediction, full list of descriptors, parsing and fingerprint."""

    predicted: tuple[int, float]
    described: tuple[int, float]
    fingerprinted: tuple[int, float]
    complete: bool


_model = None


def begin() -> None:
    """Load the model into this process and make its imports and tables."""
    global _model
    from qsar.model import load_model

    _model = load_model()
    _model.predict(list(acids(BLOCK, 900_000)))  # imports and tables are made before the clock runs


def measure(start: int) -> Timing:
    """Time one block of structures, from number `start` on, in the three ways."""
    from rdkit import Chem
    from rdkit.Chem import Descriptors, rdFingerprintGenerator
    from rdkit.Chem.MolStandardize import rdMolStandardize

    smiles = list(acids(BLOCK, start))
    begun = perf_counter()
    predictions = _model.predict(smiles)
    predicted = perf_counter() - begun
    few = smiles[::EVERY]
    begun = perf_counter()
    for text in few:
        Descriptors.CalcMolDescriptors(Chem.MolFromSmiles(text))
    described = perf_counter() - begun
    morgan = rdFingerprintGenerator.GetMorganGenerator(radius=2)
    begun = perf_counter()
    for text in smiles:
        morgan.GetFingerprint(rdMolStandardize.Cleanup(Chem.MolFromSmiles(text)))
    fingerprinted = perf_counter() - begun
    complete = all(
        p.error is None and p.steps and all(s.low <= s.pka <= s.high and s.domain and s.nearest for s in p.steps)
        for p in predictions
    )
    return Timing((len(smiles), predicted), (len(few), described), (len(smiles), fingerprinted), complete)
