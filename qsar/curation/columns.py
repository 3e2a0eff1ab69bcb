"""Which column of somebody's table holds what: named by options, else guessed from the header and said."""

from __future__ import annotations

import re
from collections.abc import Mapping, Sequence
from dataclasses import dataclass

from qsar.errors import UserError

#: Fields of a measured row with the headers that are taken for them, all in lower case without punctuation.
ALIASES: dict[str, tuple[str, ...]] = {
    "smiles": ("smiles", "canonicalsmiles", "isomericsmiles", "compoundsmiles", "structure", "molecule", "mol"),
    "pka": (
        "pka",
        "pkavalue",
        "pkaexp",
        "exppka",
        "measuredpka",
        "pkameasured",
        "experimentalpka",
        "pk",
        "ka",
        "kavalue",
        "pkb",
        "value",
    ),
    "step": ("step", "pkastep", "stepno", "dissociationstep", "ionisationstep", "ionizationstep", "n"),
    "name": ("name", "compound", "compoundname", "title", "id", "compoundid", "sample", "sampleid", "code"),
    "temperature_c": ("temperaturec", "temperature", "temp", "tempc", "t", "tc", "tdegc", "temperaturedegc"),
    "ionic_strength_m": ("ionicstrengthm", "ionicstrength", "ionicstrengthmoll", "i", "im", "imoll", "mu"),
    "constant": ("constant", "kind", "constantkind", "kindofconstant", "constanttype", "typeofconstant"),
    "uncertainty": ("uncertainty", "sd", "stdev", "standarddeviation", "se", "error", "pkaerror", "pkasd", "u"),
    "quantity": ("quantity", "whatwasmeasured", "measuredquantity"),
    "family": ("family", "class", "series"),
    "source": ("source", "reference", "ref", "instrument", "laboratory", "lab"),
    "date": ("date", "measuredon", "measurementdate", "dateofmeasurement"),
    "invented": ("invented",),
}
REQUIRED = ("smiles", "pka")
QUANTITIES = ("pka", "ka", "pkb")
_SEVERAL = re.compile(r"^p?k_?a?_?\s*[12]\b", re.IGNORECASE)


@dataclass(frozen=True)
class Columns:
    """Where each field is found.

    Attributes
    ----------
    header : dict of str to str
        Header of each field that is there.
    quantity : str
        What the value column holds: pka, ka or pkb.
    notes : tuple of str
        What was guessed, in one line each.
    """

    header: dict[str, str]
    quantity: str
    notes: tuple[str, ...]


def map_columns(
    columns: Sequence[str],
    named: Mapping[str, str] | None = None,
    quantity: str | None = None,
    *,
    has_structures: bool = False,
) -> Columns:
    """Find the fields among the columns of a table.

    Parameters
    ----------
    columns : sequence of str
        Headers as written.
    named : mapping of field to header, optional
        What the user says.
    quantity : {"pka", "ka", "pkb"}, optional
        What the value column holds, if the user says so.
    has_structures : bool
        The rows bring their structure (an SD file), so that no column is needed for it.

    Returns
    -------
    Columns

    Raises
    ------
    UserError
        If a named column or field does not exist, or structure or value are not found.
    """
    header: dict[str, str] = {}
    for field, wanted in (named or {}).items():
        if field not in ALIASES:
            raise UserError(f"--column {field}={wanted}: no field {field}; the fields are {', '.join(ALIASES)}")
        found = [c for c in columns if c.casefold() == wanted.casefold()]
        if not found:
            raise UserError(f"--column {field}={wanted}: no column {wanted}; there are {', '.join(columns)}")
        header[field] = found[0]
    notes = []
    for field, aliases in ALIASES.items():
        if field in header:
            continue
        found = sorted(
            (c for c in columns if _key(c) in aliases and c not in header.values()),
            key=lambda c: aliases.index(_key(c)),
        )
        if found:
            header[field] = found[0]
            if found[0].casefold() != field:
                notes.append(f"column '{found[0]}' is read as {field}")
            if len(found) > 1 and field in REQUIRED:
                notes.append(f"column '{found[1]}' could be {field} too and is left aside (--column chooses)")
    _check(columns, header, has_structures)
    guessed = _quantity(header["pka"])
    if quantity is None and guessed != "pka":
        notes.append(f"the values of column '{header['pka']}' are read as {_SHOWN[guessed]}")
    return Columns(header, quantity or guessed, tuple(notes))


_SHOWN = {"pka": "pKa", "ka": "Ka", "pkb": "pKb of the conjugate base"}


def _check(columns: Sequence[str], header: Mapping[str, str], has_structures: bool) -> None:
    for field in REQUIRED:
        if field in header or (field == "smiles" and has_structures):
            continue
        several = [c for c in columns if _SEVERAL.match(c)]
        if field == "pka" and several:
            raise UserError(
                f"several columns of values ({', '.join(several)}): put each step in a row of its own with a "
                f"column step, or choose one with --column pka={several[0]}"
            )
        raise UserError(
            f"no column for {field} among {', '.join(c or '(no name)' for c in columns)}; say which with "
            f"--column {field}=HEADER"
        )


def _key(column: str) -> str:
    return re.sub(r"[^a-z0-9]", "", column.casefold())


def _quantity(column: str) -> str:
    key = _key(column)
    return "ka" if key in ("ka", "kavalue") else "pkb" if key == "pkb" else "pka"
