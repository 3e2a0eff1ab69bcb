"""Which column of somebody's table holds what: named by options, else guessed from the header and said."""

from __future__ import annotations

import re
import unicodedata
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from dataclasses import field as with_default

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
#: Headers of a wide table, one column a step: pKa1, pK2, "Ka (3)", "pKa₂ exp".
_STEP_COLUMN = re.compile(r"^(?:exp|measured)?(pka?|ka)([1-6])(?:value|exp|measured)?$")


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
    steps : dict of int to str
        Of a wide table, the header of the values of each step; empty where each step has a row of its own.
    """

    header: dict[str, str]
    quantity: str
    notes: tuple[str, ...]
    steps: dict[int, str] = with_default(default_factory=dict)


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
        If a named column or field does not exist, two columns have the same header, or structure or value are not
        found.
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
    steps = {} if "pka" in header else _step_columns(columns)
    for field, aliases in ALIASES.items():
        if field in header or (steps and field in ("pka", "step")):
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
    _check(columns, header, has_structures or "smiles" in header, bool(steps))
    if steps:
        read = ", ".join(f"'{steps[k]}' as step {k}" for k in sorted(steps))
        notes.append(f"one column a step: {read}; each filled cell counts as a row")
    first = steps[min(steps)] if steps else header["pka"]
    guessed = _quantity(first)
    if quantity is None and guessed != "pka":
        notes.append(f"the values of column '{first}' are read as {_SHOWN[guessed]}")
    return Columns(header, quantity or guessed, tuple(notes), steps)


def _step_columns(columns: Sequence[str]) -> dict[int, str]:
    """Header of each step of a wide table; empty where the table has one column of values.

    A plain "pKa" beside "pKa2" is the first step.

    Raises
    ------
    UserError
        If two columns are the same step, or pKa and Ka are mixed.
    """
    found: dict[int, list[str]] = {}
    for column in columns:
        if match := _STEP_COLUMN.match(_key(column)):
            found.setdefault(int(match[2]), []).append(column)
    if found and 1 not in found:
        found[1] = [c for c in columns if _key(c) in ("pka", "ka", "pkavalue", "kavalue")]
    if any(_key(c) in ALIASES["pka"] for c in columns if c not in found.get(1, ())):
        return {}  # a column of values of its own: the others are left to --column
    steps = {step: names[0] for step, names in found.items() if names}
    doubled = next((names for names in found.values() if len(names) > 1), None)
    if doubled:
        raise UserError(f"columns {', '.join(doubled)} hold the same step; rename or take out one")
    if len({_quantity(name) for name in steps.values()}) > 1:
        raise UserError(f"columns {', '.join(steps.values())} mix pKa and Ka; convert one or take it out")
    return steps


_SHOWN = {"pka": "pKa", "ka": "Ka", "pkb": "pKb of the conjugate base"}


def _check(columns: Sequence[str], header: Mapping[str, str], has_structures: bool, has_values: bool) -> None:
    for name in header.values():
        if columns.count(name) > 1:
            places = " and ".join(str(i) for i, c in enumerate(columns, start=1) if c == name)
            raise UserError(f"two columns are called {name} ({places}); rename one")
    for field in REQUIRED:
        if field in header or (has_structures if field == "smiles" else has_values):
            continue
        raise UserError(
            f"no column for {field} among {', '.join(c or '(no name)' for c in columns)}; say which with "
            f"--column {field}=HEADER"
        )


def _key(column: str) -> str:
    return re.sub(r"[^a-z0-9]", "", unicodedata.normalize("NFKC", column).casefold())  # pKa₁ is pKa1


def _quantity(column: str) -> str:
    key = _key(column)
    step = _STEP_COLUMN.match(key)
    return "ka" if key in ("ka", "kavalue") or (step and step[1] == "ka") else "pkb" if key == "pkb" else "pka"
