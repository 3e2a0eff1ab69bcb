"""From what a user pastes or drops to records, without any of it being taken for a file of this machine."""

from __future__ import annotations

import re
import tempfile
from collections.abc import Iterator, Mapping
from itertools import islice
from pathlib import Path

from qsar.errors import UserError
from qsar.reading import MAX_SMILES, READABLE, Record, read_sources
from qsar.service.settings import Refused

_ENDINGS = frozenset((".csv", ".tsv", ".xlsx", ".xlsm", ".smi", ".smiles", ".txt", ".sdf", ".sd", ".mol"))
_MOL_MARK = re.compile(r"^(M  END|.{33,34} V[23]000)", re.MULTILINE)


def records_of_text(text: str, names: Mapping[str, str], most: int) -> list[Record]:
    """Records of pasted text: SMILES with or without names, names of known acids, MOL blocks, or a table.

    Parameters
    ----------
    text : str
    names : mapping of str to str
        SMILES by name in lower case.
    most : int
        Records that are allowed.

    Raises
    ------
    Refused
        If there are more, or the text cannot be read.
    """
    if _MOL_MARK.search(text):
        return records_of_file(text.encode(), "pasted.sdf", most)
    lines = [line for line in text.splitlines() if line.strip()]
    if not lines:
        raise Refused(422, "nothing to read: paste a SMILES, the name of an acid in the table, or a MOL block")
    header = {cell.strip().casefold() for cell in re.split(r"[,;\t]", lines[0])}
    if "smiles" in header and len(lines) > 1:
        return records_of_file(text.encode(), "pasted.csv", most)
    if len(lines) > most:
        raise Refused(413, _too_many(most))
    return [_record_of_line(line.strip(), str(n), names) for n, line in enumerate(lines, start=1)]


def _record_of_line(line: str, position: str, names: Mapping[str, str]) -> Record:
    known = names.get(line.casefold())
    if known:
        return Record(line, known)
    smiles, _, rest = line.replace("\t", " ", 1).partition(" ")
    if rest.startswith("|") and "|" in rest[1:]:
        extension, _, rest = rest[1:].partition("|")
        smiles = f"{smiles} |{extension}|"
    if len(smiles) > MAX_SMILES:
        return Record(rest.strip() or position, smiles[:60] + "…", "", None, _too_long())
    if "=" not in smiles and re.fullmatch(r"[A-Za-z][\w ,()'’-]*[a-z]{3}[\w ,()'’-]*", line):
        return Record(line, line, "", None, f"'{line[:60]}' is not the name of an acid in the table; give its SMILES")
    return Record(rest.strip() or position, smiles)


def _too_long() -> str:
    return f"the SMILES is longer than {MAX_SMILES:,} characters: too large a molecule"


def _too_many(most: int) -> str:
    return f"more than {most:,} structures at once; cut the list into parts, or use acidity predict"


def records_of_file(content: bytes, name: str, most: int) -> list[Record]:
    """Records of a file that was sent.

    Parameters
    ----------
    content : bytes
    name : str
        Its name, of which only the ending is used.
    most : int
        Records that are allowed.

    Raises
    ------
    Refused
        If it cannot be read or has too many.
    """
    ending = Path(name.replace("\\", "/").rpartition("/")[2]).suffix.lower()
    if ending not in _ENDINGS:
        raise Refused(415, f"this kind of file is not read; save it as {READABLE}, with that extension")
    with tempfile.TemporaryDirectory(prefix="acidity-") as folder:
        place = Path(folder) / f"file{ending}"
        place.write_bytes(content)
        try:
            records = list(islice(_plain(read_sources([str(place)])), most + 1))
        except UserError as problem:
            raise Refused(422, str(problem).removeprefix(f"{place}: ")) from problem
    if len(records) > most:
        raise Refused(413, _too_many(most))
    return records


def _plain(records: Iterator[Record]) -> Iterator[Record]:
    """Records without molecules, which are written as SMILES, and without the name of the temporary file."""
    for record in records:
        yield Record(record.id[:200], record.smiles, record.where.partition(", ")[2], None, record.error)
