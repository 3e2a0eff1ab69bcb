"""Structures from MOL and SD files (CTfile formats), one entry at a time."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass, field
from itertools import pairwise
from pathlib import Path

from rdkit import Chem, rdBase

from qsar.reading import Record
from qsar.spreadsheets import bounded_lines, open_text

MAX_ENTRY = 2_000_000
"""Characters of one entry; a longer one is refused without being kept in memory."""


@dataclass
class _Entry:
    lines: list[str] = field(default_factory=list)
    size: int = 0

    def add(self, line: str | None) -> None:
        self.size += MAX_ENTRY + 1 if line is None else len(line)
        if line is not None and self.size <= MAX_ENTRY:
            self.lines.append(line.rstrip("\r\n"))


def read_mol_file(path: Path, note: Callable[[str], None]) -> Iterator[Record]:
    """Read the entries of an SD file, or the one of a MOL file.

    Parameters
    ----------
    path : pathlib.Path
        The file; V2000 and V3000 blocks are read.
    note : callable
        Told, in one line, what had to be guessed.

    Yields
    ------
    Record
        The ``id`` is the data item of that name, else the item ``name``, else the title line, else the
        number of the entry. An entry that RDKit cannot read has its `error`.
    """
    with open_text(path, note) as handle:
        for number, entry in enumerate(sdf_entries(bounded_lines(handle)), start=1):
            yield record_of(entry, number, f"{path.name}, entry {number}")


def sdf_entries(lines: Iterator[str | None]) -> Iterator[_Entry]:
    """Entries of an SD file, one at a time."""
    entry = _Entry()
    for line in lines:
        if line is not None and line.startswith("$$$$"):
            yield entry
            entry = _Entry()
        else:
            entry.add(line)
    if entry.size > MAX_ENTRY or any(line.strip() for line in entry.lines):
        yield entry


def record_of(entry: _Entry, number: int, where: str) -> Record:
    """Record of one entry; `number` is its id where it has none."""
    if entry.size > MAX_ENTRY:
        return Record(str(number), "", where, None, f"the entry is longer than {MAX_ENTRY:,} characters")
    items = data_items(entry.lines)
    title = entry.lines[0].strip() if entry.lines else ""
    identity = items.get("id") or items.get("name") or title or str(number)
    block = "\n".join(entry.lines)
    with rdBase.BlockLogs():
        mol, error = _molecule(block)
        smiles = "" if mol is None else Chem.MolToSmiles(mol)
    return Record(identity, smiles, where, mol, error)


def _molecule(block: str) -> tuple[Chem.Mol | None, str | None]:
    mol = Chem.MolFromMolBlock(block)
    if mol is not None:
        if mol.GetNumAtoms() == 0:
            return None, "the entry has no atoms"
        return mol, None
    raw = Chem.MolFromMolBlock(block, sanitize=False, removeHs=False)
    if raw is None:
        return None, "the entry is not a readable MOL block; export it again from the drawing program"
    try:
        Chem.SanitizeMol(raw)
    except (Chem.MolSanitizeException, ValueError, RuntimeError) as problem:
        return None, f"not a valid structure: {' '.join(str(problem).split())}"
    return None, "the entry is not a readable MOL block; export it again from the drawing program"


def data_items(lines: list[str]) -> dict[str, str]:
    """First lines of the data items of an entry (``> <name>`` and the value below), names in lower case."""
    items: dict[str, str] = {}
    for line, value in pairwise(lines):
        if line.startswith(">") and "<" in line:
            name = line.partition("<")[2].partition(">")[0].strip().casefold()
            items.setdefault(name, value.strip())
    return items
