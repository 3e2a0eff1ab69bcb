"""A model that is trained in a few seconds, for tests that need one but not a good one."""

from __future__ import annotations

from functools import cache

from qsar.model import Model
from qsar.model.boosting import BoostingSettings
from qsar.model.members import Settings
from qsar.model.training import train
from qsar.paths import reference_table
from qsar.table import Measurement, read_table

QUICK = Settings(folds=3, inner_folds=2, rounds=2, boosting=BoostingSettings(max_iter=10))


@cache
def reference_rows() -> tuple[Measurement, ...]:
    return tuple(read_table(reference_table()))


@cache
def small_model() -> Model:
    """Trained on every fourth row of the reference table."""
    return train(reference_rows()[::4], "small", QUICK, provenance={"tables": [{"name": "a quarter", "sha256": ""}]})
