"""The IUPAC Digitized pKa Dataset as a table to train on: the consensus steps, put through the common rules."""

from __future__ import annotations

import csv
from dataclasses import dataclass
from pathlib import Path

from qsar.curation.curate import Curated, curate, write_csv
from qsar.curation.duplicates import LIMIT
from qsar.curation.iupac import Excluded, OpenStep, sort_iupac
from qsar.curation.readers import RawRow
from qsar.curation.rules import Defaults

#: Standard uncertainty by the compilers' grade; two laboratories differ by 0.09 in the median, more where the grade is
#: low. Common practice, no source.
UNCERTAINTY = {"reliable": 0.03, "approximate": 0.06, "probably approximate": 0.08, "uncertain": 0.12}
UNGRADED = 0.10
SOURCE = "IUPAC-DIGITIZED"


@dataclass(frozen=True)
class CuratedDataset:
    """The outcome of reading the dataset.

    Attributes
    ----------
    curated : Curated
        Over the consensus steps; their ``number`` counts them from 1.
    excluded : list of Excluded
        Rows of the file that are not used.
    rows : int
        Rows of the file.
    """

    curated: Curated
    excluded: list[Excluded]
    rows: int

    @property
    def balance(self) -> str:
        """The count that shows that nothing disappeared."""
        kept = len(self.curated.kept)
        refused = len(self.excluded) + len(self.curated.refused) + len(self.curated.conflicts)
        return f"{self.rows} in = {kept} kept + {self.rows - kept - refused} merged + {refused} refused"


def curate_iupac(path: Path, limit: float = LIMIT) -> CuratedDataset:
    """Read the dataset as downloaded (release 2.x), choose one value for each carboxyl step, and apply the rules.

    Parameters
    ----------
    path : pathlib.Path
        The CSV file.
    limit : float
        Largest difference between spellings of one acid that are merged, pKa units.

    Raises
    ------
    UserError
        If the file cannot be read.
    """
    data = sort_iupac(path)
    with path.open(encoding="utf-8-sig", newline="") as handle:
        rows = sum(1 for _ in csv.DictReader(handle))
    steps = [_as_row(k, step) for k, step in enumerate(data.steps, start=1)]
    return CuratedDataset(curate(steps, Defaults(), limit), data.excluded, rows)


def _as_row(number: int, step: OpenStep) -> RawRow:
    kinds = [k for k in ("thermodynamic", "mixed", "concentration") if k in step.note.casefold()]
    cells = {
        "smiles": step.smiles,
        "pka": repr(step.pka),
        "step": str(step.step),
        "temperature_c": repr(step.temperature_c),
        "ionic_strength_m": "" if step.ionic_strength_m is None else repr(step.ionic_strength_m),
        "constant": kinds[0] if len(kinds) == 1 else "",
        "uncertainty": repr(UNCERTAINTY.get(step.assessment.casefold(), UNGRADED)),
        "source": SOURCE,
    }
    return RawRow(number, cells, cells)


def write_excluded(path: Path, dataset: CuratedDataset) -> None:
    """Write every row of the dataset that is not used, and every step that the rules refuse."""
    rows = {row.number: row.cells for row in dataset.curated.rows}
    lines: list[list[object]] = [[e.line, "refused", e.reason, e.smiles, e.label] for e in dataset.excluded]
    for number, reason in dataset.curated.refused.items():
        lines.append(["", "refused", reason, rows[number]["smiles"], f"step {rows[number]['step']}"])
    for conflict in dataset.curated.conflicts:
        cells = rows[conflict.row.number]
        lines.append(["", "conflict", conflict.reason, cells["smiles"], f"step {cells['step']}"])
    write_csv(path, ("row", "outcome", "reason", "smiles", "label"), lines)
