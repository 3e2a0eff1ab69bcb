"""Parquet in and out, read back with pyarrow itself."""

from __future__ import annotations

import csv
from pathlib import Path

import pytest
from benchmarks.many_acids import acids

from qsar import cli, parquet
from qsar.errors import UserError
from qsar.reading import count_records, read_sources
from qsar.writing import COLUMNS, Row

pyarrow = pytest.importorskip("pyarrow", reason="needs the package pyarrow (extra parquet)")
tables = pytest.importorskip("pyarrow.parquet")


def test_rows_come_back_with_their_types(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(parquet, "ROWS_AT_ONCE", 3)
    path = tmp_path / "out.parquet"
    rows = [Row(str(i), "CC(=O)O", "CC(=O)O", 1, 4.76 + i / 7) for i in range(8)] + [Row("x", "C", reasons="no acid")]
    with parquet.ParquetWriter(path) as writer:
        for row in rows:
            writer.write([row])
    file = tables.ParquetFile(path)
    assert file.num_row_groups == 3
    assert tuple(file.schema_arrow.names) == COLUMNS
    assert [Row(*cells.values()) for cells in file.read().to_pylist()] == rows


def test_columns_are_found_and_rows_streamed(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(parquet, "ROWS_AT_ONCE", 4)
    path = tmp_path / "in.parquet"
    given = list(acids(10))
    tables.write_table(pyarrow.table({"Name": [f"n{i}" for i in range(10)], "SMILES": [*given[:9], None]}), path)
    records = list(read_sources([str(path)]))
    assert [r.smiles for r in records] == [*given[:9], ""]
    assert [r.id for r in records] == [f"n{i}" for i in range(10)]
    assert records[9].error is not None
    assert "row 10" in records[9].where
    assert count_records([str(path)]) == 10


@pytest.mark.parametrize(
    ("content", "said"), [(b"PAR1 but no more", "not a Parquet file"), (None, "no column smiles")]
)
def test_what_cannot_be_read_is_said(tmp_path: Path, content: bytes | None, said: str) -> None:
    path = tmp_path / "in.parquet"
    if content is None:
        tables.write_table(pyarrow.table({"structure": ["C"]}), path)
    else:
        path.write_bytes(content)
    with pytest.raises(UserError, match=said):
        list(read_sources([str(path)]))


def test_the_command_reads_and_writes_it(tmp_path: Path, shipped_model: Path) -> None:
    source, target, plain = tmp_path / "in.parquet", tmp_path / "out.parquet", tmp_path / "out.csv"
    tables.write_table(pyarrow.table({"id": ["a", "b"], "smiles": ["CC(=O)O", "OC(=O)CC(=O)O"]}), source)
    assert cli.main(["predict", str(source), "--output", str(target)]) == 0
    assert cli.main(["predict", str(source), "--output", str(plain)]) == 0
    with plain.open(encoding="utf-8", newline="") as handle:
        expected = list(csv.DictReader(handle))
    found = tables.read_table(target).to_pylist()
    assert [row["id"] for row in found] == ["a", "b", "b"]
    assert [row["pka"] for row in found] == [float(row["pka"]) for row in expected]
    assert [row["reasons"] for row in found] == [row["reasons"] for row in expected]
