"""What the tests of attributions share: the shipped model, loaded once, and explanations of its own table."""

from __future__ import annotations

from pathlib import Path

import pytest

from qsar.attribution import Explained, explain_many
from qsar.errors import UserError
from qsar.model import Model, load_model


@pytest.fixture(scope="session")
def model(shipped_model: Path) -> Model:
    """The shipped model."""
    try:
        return load_model(shipped_model)
    except UserError as problem:
        pytest.skip(f"the shipped model cannot be loaded: {problem}")


@pytest.fixture(scope="session")
def explained(model: Model) -> list[Explained]:
    """Every third acid of the model's own table, every acid with several COOH groups and every amino acid."""
    library = model.library
    rows = [(s, f) for s, f in zip(library.smiles, library.family, strict=True) if s]
    wanted = ("dicarboxylic", "tricarboxylic_more", "amino_acid")
    chosen = [s for k, (s, f) in enumerate(rows) if k % 3 == 0 or f in wanted]
    if not chosen:
        pytest.skip("the shipped model withholds its structures")
    return explain_many(model, list(dict.fromkeys(chosen)))
