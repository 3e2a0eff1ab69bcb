"""Read the published constants that travel with the package.

Three tables sit beside this module: ``elements.csv``, ``substituents.csv`` and ``sources.csv``. Each row of
the first two names the source of each of its values as ``column=key``, where ``key`` is a row of the third.
Only the standard library is needed to read them; RDKit is imported when the first group is looked up by its
SMILES.
"""

from __future__ import annotations

import csv
from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from functools import cache, lru_cache
from importlib.resources import files
from types import MappingProxyType

_SUBSTITUENT_VALUES = (
    "sigma_meta",
    "sigma_para",
    "sigma_i",
    "sigma_r",
    "taft_star",
    "es",
    "group_electronegativity",
    "charton_nu",
)
_ELEMENT_VALUES = ("electronegativity", "covalent_radius")


@dataclass(frozen=True)
class Source:
    """A publication that constants are taken from.

    Attributes
    ----------
    key : str
        Short name used in the ``source`` column of the other tables.
    citation : str
        Authors, title, journal or publisher, year, pages.
    columns : tuple of str
        The columns that take values from it.
    scale : str
        Zero points and units of the published scale.
    """

    key: str
    citation: str
    columns: tuple[str, ...]
    scale: str


@dataclass(frozen=True)
class Element:
    """Constants of a chemical element.

    Attributes
    ----------
    symbol : str
        Chemical symbol.
    atomic_number : int
        Nuclear charge number.
    electronegativity : float
        Pauling scale (Allred, J. Inorg. Nucl. Chem. 1961, 17, 215).
    covalent_radius : float
        Single-bond covalent radius in pm (Cordero et al., Dalton Trans. 2008, 2832).
    sources : mapping of str to str
        Column name to source key.
    from_memory : bool
        Whether the values were written down from memory, without the publication at hand.
    """

    symbol: str
    atomic_number: int
    electronegativity: float
    covalent_radius: float
    sources: Mapping[str, str]
    from_memory: bool


@dataclass(frozen=True)
class Substituent:
    """Constants of a group that replaces a hydrogen atom; ``None`` where no value is tabulated.

    Attributes
    ----------
    group : str
        Condensed formula or name, for instance ``"SO2CH3"``.
    smiles : str
        SMILES of the group with a dummy atom where it is attached, for instance ``"[*]C#N"``.
    sigma_meta, sigma_para : float or None
        Hammett constants, dimensionless, H = 0 (Hansch, Leo, Taft, Chem. Rev. 1991, 91, 165).
    sigma_i : float or None
        Inductive constant, dimensionless, H = 0 (Charton, Prog. Phys. Org. Chem. 1981, 13, 119).
    sigma_r : float or None
        Resonance constant on the sigma-R-zero scale, dimensionless, H = 0 (Ehrenson, Brownlee, Taft,
        Prog. Phys. Org. Chem. 1973, 10, 1).
    taft_star : float or None
        Taft polar constant, dimensionless, CH3 = 0 (Perrin, Dempsey, Serjeant 1981).
    es : float or None
        Taft steric constant, dimensionless, CH3 = 0 and H = 1.24; more negative is bulkier (Taft 1956; Kutter
        and Hansch 1969 where no ester hydrolysis was measured).
    group_electronegativity : float or None
        Pauling scale (Wells, Prog. Phys. Org. Chem. 1968, 6, 111).
    charton_nu : float or None
        Charton steric constant, in Angstrom beyond the radius of hydrogen (Charton, Top. Curr. Chem. 1983,
        114, 57).
    sources : mapping of str to str
        Column name to source key, for each value that is not ``None``.
    from_memory : bool
        Whether the values were written down from memory, without the publication at hand.
    note : str
        What else must be known about the values; may be empty.
    """

    group: str
    smiles: str
    sigma_meta: float | None
    sigma_para: float | None
    sigma_i: float | None
    sigma_r: float | None
    taft_star: float | None
    es: float | None
    group_electronegativity: float | None
    charton_nu: float | None
    sources: Mapping[str, str]
    from_memory: bool
    note: str


@cache
def sources() -> Mapping[str, Source]:
    """Publications by their key.

    Returns
    -------
    mapping of str to Source
        In the order of ``sources.csv``; read only.
    """
    found: dict[str, Source] = {}
    for where, row in _rows("sources.csv"):
        key = row["key"]
        if key in found:
            raise ValueError(f"{where}: the key {key!r} stands twice; give each source its own key")
        columns = tuple(column.strip() for column in row["columns"].split(";"))
        found[key] = Source(key, row["citation"], columns, row["scale"])
    return MappingProxyType(found)


@cache
def elements() -> tuple[Element, ...]:
    """All tabulated elements by rising atomic number.

    Returns
    -------
    tuple of Element
        In the order of ``elements.csv``.
    """
    return tuple(
        Element(
            symbol=row["symbol"],
            atomic_number=int(_number(row, "atomic_number", where)),
            electronegativity=_number(row, "electronegativity", where),
            covalent_radius=_number(row, "covalent_radius", where),
            sources=_cell_sources(row, _ELEMENT_VALUES, where),
            from_memory=row["from_memory"] == "yes",
        )
        for where, row in _rows("elements.csv")
    )


@cache
def element(symbol: str) -> Element:
    """Constants of one element.

    Parameters
    ----------
    symbol : str
        Chemical symbol, for instance ``"Cl"``.

    Returns
    -------
    Element

    Raises
    ------
    KeyError
        If the element is not tabulated.
    """
    for candidate in elements():
        if candidate.symbol == symbol:
            return candidate
    raise KeyError(f"no constants for the element {symbol!r}; tabulated: {_tabulated()}")


@cache
def element_by_number(atomic_number: int) -> Element:
    """Constants of one element by its atomic number.

    Parameters
    ----------
    atomic_number : int
        Nuclear charge number, for instance 17.

    Returns
    -------
    Element

    Raises
    ------
    KeyError
        If the element is not tabulated.
    """
    for candidate in elements():
        if candidate.atomic_number == atomic_number:
            return candidate
    raise KeyError(f"no constants for atomic number {atomic_number}; tabulated: {_tabulated()}")


@cache
def substituents() -> tuple[Substituent, ...]:
    """All tabulated groups.

    Returns
    -------
    tuple of Substituent
        In the order of ``substituents.csv``.
    """
    return tuple(_substituent(where, row) for where, row in _rows("substituents.csv"))


@lru_cache(maxsize=4096)
def substituent_by_smiles(smiles: str) -> Substituent | None:
    """Constants of the group with this structure.

    Parameters
    ----------
    smiles : str
        SMILES with exactly one dummy atom where the group is attached, for instance ``"*C#N"``. The spelling,
        stereo marks, isotopes and a number on the dummy atom do not matter.

    Returns
    -------
    Substituent or None
        ``None`` if the group is not tabulated.

    Raises
    ------
    ValueError
        If the SMILES cannot be read or has not exactly one dummy atom.
    """
    return _by_canonical_smiles().get(canonical_group(smiles))


def canonical_group(smiles: str) -> str:
    """One spelling for all SMILES of a group, without stereo marks, isotopes and atom numbers.

    Parameters
    ----------
    smiles : str
        SMILES with exactly one dummy atom where the group is attached.

    Returns
    -------
    str
        Canonical SMILES.

    Raises
    ------
    ValueError
        If the SMILES cannot be read or has not exactly one dummy atom.
    """
    # Imported here, so that reading constants stays quick for those who need no structures.
    from rdkit import Chem, rdBase

    with rdBase.BlockLogs():  # a hydrogen on a dummy is meant; what cannot be read is raised below
        molecule = Chem.MolFromSmiles(smiles)
    if molecule is None:
        raise ValueError(f"{smiles!r} cannot be read as SMILES; write a group as in '[*]C#N'")
    dummies = sum(atom.GetAtomicNum() == 0 for atom in molecule.GetAtoms())
    if dummies != 1:
        raise ValueError(f"{smiles!r} has {dummies} dummy atoms; a group needs exactly one, as in '[*]C#N'")
    for atom in molecule.GetAtoms():
        atom.SetAtomMapNum(0)
        atom.SetIsotope(0)
    return str(Chem.MolToSmiles(molecule, isomericSmiles=False))


@cache
def _by_canonical_smiles() -> Mapping[str, Substituent]:
    found: dict[str, Substituent] = {}
    for substituent in substituents():
        key = canonical_group(substituent.smiles)
        if key in found:
            pair = f"{found[key].group} and {substituent.group}"
            raise ValueError(f"substituents.csv: {pair} are the same group {key}; keep one")
        found[key] = substituent
    return MappingProxyType(found)


def _substituent(where: str, row: Mapping[str, str]) -> Substituent:
    values = {name: _number(row, name, where) if row[name] else None for name in _SUBSTITUENT_VALUES}
    return Substituent(
        group=row["group"],
        smiles=row["smiles"],
        sources=_cell_sources(row, _SUBSTITUENT_VALUES, where),
        from_memory=row["from_memory"] == "yes",
        note=row["note"],
        **values,
    )


def _rows(name: str) -> Iterator[tuple[str, dict[str, str]]]:
    """Rows of a table of this package, each with the words that say where it stands."""
    text = files("qsar.constants").joinpath(name).read_text(encoding="utf-8")
    header, *lines = csv.reader(text.splitlines(), strict=True)
    for number, cells in enumerate(lines, start=2):
        where = f"{name} row {number}"
        if len(cells) != len(header):
            raise ValueError(f"{where}: {len(cells)} cells under {len(header)} columns; check the commas")
        yield where, dict(zip(header, cells, strict=True))


def _number(row: Mapping[str, str], column: str, where: str) -> float:
    try:
        return float(row[column])
    except ValueError:
        told = f"{row[column]!r} is not a number; write it as 0.12"
        raise ValueError(f"{where}, column {column}: {told}") from None


def _cell_sources(row: Mapping[str, str], columns: tuple[str, ...], where: str) -> Mapping[str, str]:
    """Source key of each column that holds a value."""
    found: dict[str, str] = {}
    for pair in row["source"].split():
        column, _, key = pair.partition("=")
        if column not in columns or key not in sources():
            told = f"{pair!r} is not 'column=key' with a key of sources.csv"
            raise ValueError(f"{where}, column source: {told}")
        found[column] = key
    if set(found) != {column for column in columns if row[column]}:
        told = "name one source for each column that holds a value, and no other"
        raise ValueError(f"{where}, column source: {told}")
    return MappingProxyType(found)


def _tabulated() -> str:
    return ", ".join(candidate.symbol for candidate in elements())
