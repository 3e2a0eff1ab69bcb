"""Duplicates and steps. The weighted median is checked against numpy and against its definition."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from qsar.curation.duplicates import merge, settle_steps, weighted_median
from qsar.curation.readers import RawRow
from qsar.curation.rules import Defaults, Usable, apply_rules


def rows(*given: tuple[str, ...]) -> list[Usable]:
    result = []
    for number, (smiles, pka, *rest) in enumerate(given, start=2):
        cells = {"smiles": smiles, "pka": pka, "temperature_c": "25", "ionic_strength_m": "0"}
        cells |= dict(zip(("step", "uncertainty"), rest, strict=False))
        result.append(apply_rules(RawRow(number, cells, cells), Defaults()))
    return result


@given(st.lists(st.floats(-10, 10), min_size=1, max_size=20))
def test_with_equal_weights_it_is_the_median(values: list[float]) -> None:
    assert weighted_median(values, np.ones(len(values))) == pytest.approx(float(np.median(values)))


@given(st.lists(st.tuples(st.floats(-10, 10), st.integers(1, 9)), min_size=1, max_size=12))
def test_a_weight_counts_like_that_many_copies(pairs: list[tuple[float, int]]) -> None:
    copies = [v for v, w in pairs for _ in range(w)]
    assert weighted_median([v for v, _ in pairs], [float(w) for _, w in pairs]) == pytest.approx(
        float(np.median(copies))
    )


def test_duplicates_are_merged_with_the_rows_named() -> None:
    merged, conflicts = merge(
        rows(("CC(=O)O", "4.76"), ("CCC(=O)O", "4.87"), ("OC(C)=O", "4.72"), ("CC([O-])=O.[K+]", "4.75"))
    )
    assert not conflicts
    assert [(m.rows, m.row.pka) for m in merged] == [((2, 4, 5), 4.75), ((3,), 4.87)]


def test_mirror_images_are_one_acid_and_diastereomers_are_two() -> None:
    merged, _ = merge(rows(("C[C@H](O)C(=O)O", "3.86"), ("C[C@@H](O)C(=O)O", "3.87"), ("CC(O)C(=O)O", "3.85")))
    assert [m.rows for m in merged] == [(2, 3, 4)]
    tartaric = [("O[C@H]([C@@H](O)C(=O)O)C(=O)O", "3.03", "1"), ("O[C@H]([C@H](O)C(=O)O)C(=O)O", "3.22", "1")]
    assert len(merge(rows(*tartaric))[0]) == 2


def test_a_pair_that_disagrees_is_set_apart_with_its_pair() -> None:
    merged, conflicts = merge(rows(("CC(=O)O", "4.76"), ("CC(=O)O", "5.76")))
    assert merged == []
    assert [(c.row.number, c.other.number) for c in conflicts] == [(2, 3), (3, 2)]
    assert "row 3" in conflicts[0].reason


def test_one_against_several_is_set_apart_alone() -> None:
    merged, conflicts = merge(rows(("CC(=O)O", "4.76"), ("CC(=O)O", "4.74"), ("CC(=O)O", "6.47")))
    assert [m.rows for m in merged] == [(2, 3)]
    assert [c.row.number for c in conflicts] == [4]


def test_two_against_two_are_all_set_apart() -> None:
    merged, conflicts = merge(rows(*(("CC(=O)O", v) for v in ("4.0", "4.05", "5.0", "5.05"))))
    assert merged == [] and len(conflicts) == 4


def test_precise_rows_decide() -> None:
    merged, _ = merge(
        rows(("CC(=O)O", "4.76", "1", "0.01"), ("CC(=O)O", "4.60", "1", "0.1"), ("CC(=O)O", "4.62", "1", "0.1"))
    )
    assert merged[0].row.pka == 4.76


SUCCINIC = "OC(=O)CCC(=O)O"


def test_steps_by_rising_value_where_every_step_has_its_row() -> None:
    settled, refused = settle_steps(rows((SUCCINIC, "5.64"), (SUCCINIC, "4.21")))
    assert [(r.number, r.step) for r in settled] == [(2, 2), (3, 1)] and not refused
    assert all("step not stated" in c for r in settled for c in r.changes[-1:])


def test_the_only_row_is_the_first_step_and_more_than_steps_is_refused() -> None:
    assert settle_steps(rows((SUCCINIC, "4.21")))[0][0].step == 1
    settled, refused = settle_steps(rows((SUCCINIC, "4.21"), (SUCCINIC, "4.20"), (SUCCINIC, "5.64")))
    assert settled == [] and [n for n, _ in refused] == [2, 3, 4]
    settled, refused = settle_steps(rows((SUCCINIC, "4.21", "1"), (SUCCINIC, "5.64")))
    assert len(settled) == 1 and len(refused) == 1
