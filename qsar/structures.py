"""Reading and standardising molecules, and finding their carboxyl groups.

Everything downstream works on :class:`Acid`; nothing downstream parses SMILES again.
"""

from __future__ import annotations

import re
from dataclasses import dataclass, field, replace
from functools import cached_property

from rdkit import Chem, RDLogger

from qsar.graph import Graph

RDLogger.DisableLog("rdApp.*")  # type: ignore[attr-defined]  # RDKit's own messages are replaced by the one-line reasons below

MAX_HEAVY_ATOMS = 200
MAX_SITES = 6
ELEMENTS = frozenset((1, 5, 6, 7, 8, 9, 14, 15, 16, 17, 34, 35, 53))

_ACID_HYDROGEN = {7: "ammonium", 8: "oxonium", 16: "sulfonium", 15: "phosphonium"}


class StructureError(ValueError):
    """A structure that cannot be predicted; the message is one line for the user."""


@dataclass(frozen=True, eq=False)
class Acid:
    """A standardised carboxylic acid.

    Attributes
    ----------
    smiles : str
        Canonical isomeric SMILES of the acid form (carboxyl groups protonated, other groups uncharged
        unless the charge is permanent).
    drawn : rdkit.Chem.Mol
        The molecule without explicit hydrogens, its atoms in any order.
    sites : tuple of int
        Atom indices of the carboxyl carbons in `mol`, in atom order.
    notes : tuple of str
        Each act on the structure, as a sentence for the user.
    order : tuple of int or None
        Atoms of `drawn` in the order of `smiles`; None where they stand in it already.
    """

    smiles: str
    drawn: Chem.Mol
    sites: tuple[int, ...]
    notes: tuple[str, ...] = field(default=())
    order: tuple[int, ...] | None = None

    @cached_property
    def mol(self) -> Chem.Mol:
        """The molecule with its atoms in the order of `smiles`, whatever order they were read in."""
        return self.drawn if self.order is None else Chem.MolFromSmiles(self.smiles)

    @cached_property
    def graph(self) -> Graph:
        """Atoms and bonds as plain lists in the order of `mol`, read once."""
        return Graph.from_mol(self.drawn, stereo=_has_stereo(self.smiles), order=self.order)

    def forget_graph(self) -> None:
        """Let go of the graph; it is read again when it is asked for."""
        self.__dict__.pop("graph", None)

    def __reduce__(self) -> tuple[object, ...]:
        return acid_from_smiles_and_notes, (self.smiles, self.notes)


def _has_stereo(smiles: str) -> bool:
    return "@" in smiles or "/" in smiles or "\\" in smiles


def acid_from_smiles_and_notes(smiles: str, notes: tuple[str, ...]) -> Acid:
    """Rebuild an acid in another process from its canonical SMILES (`notes` are kept as they were)."""
    acid = read_acid(smiles)
    return replace(acid, notes=notes)


def read_acid(smiles: str) -> Acid:
    """Parse and standardise one SMILES string.

    Parameters
    ----------
    smiles : str
        Any SMILES; salts, solvates and carboxylates are accepted.

    Returns
    -------
    Acid

    Raises
    ------
    StructureError
        With one line that says what is wrong and how to mend it.
    """
    text = smiles.strip()
    if not text:
        raise StructureError("empty structure; give a SMILES string")
    acid = _plain_acid(text) if _PLAIN.fullmatch(text) else None
    if acid is not None:
        return acid
    params = Chem.SmilesParserParams()
    params.sanitize = params.removeHs = params.parseName = False  # type: ignore[assignment]
    mol = Chem.MolFromSmiles(text, params)
    if mol is None:
        raise StructureError(
            f"'{_short(text)}' is not a SMILES string that can be read; check brackets and ring closures"
        )
    return acid_from_mol(mol)


# SMILES on which standardising has nothing to do: one part, no isotopes, no labels, no explicit hydrogens, no charges
# but those of nitro groups. Most structures are written so, and take a third of the time.
_PLAIN = re.compile(
    r"(?:Cl|Br|[BCNOPSFIbcnops]|[()=#/\\\d-]|%\d\d|\[nH\]|\[C@@?H?\]|\[N\+\]\(=O\)\[O-\]|\[N\+\]\(\[O-\]\)=O"
    r"|O=\[N\+\]\(\[O-\]\)|\[O-\]\[N\+\]\(=O\))+"
)


def _plain_parameters(*, sanitize: bool) -> Chem.SmilesParserParams:
    params = Chem.SmilesParserParams()
    params.removeHs = params.parseName = params.allowCXSMILES = False  # type: ignore[assignment]
    params.sanitize = sanitize  # type: ignore[assignment]
    return params


_WITH_STEREO, _WITHOUT_STEREO = _plain_parameters(sanitize=True), _plain_parameters(sanitize=False)
# All that a plain SMILES without stereo marks needs. Other ways to write nitro groups and the like fail on valence and
# take the general way.
_ENOUGH = int(
    Chem.SanitizeFlags.SANITIZE_PROPERTIES
    | Chem.SanitizeFlags.SANITIZE_SYMMRINGS
    | Chem.SanitizeFlags.SANITIZE_KEKULIZE
    | Chem.SanitizeFlags.SANITIZE_SETAROMATICITY
    | Chem.SanitizeFlags.SANITIZE_ADJUSTHS
)


def _plain_acid(text: str) -> Acid | None:
    """The acid of a SMILES that needs no standardising; None where something is wrong with it.

    What is wrong is found, and said, by the general way through :func:`acid_from_mol`.
    """
    if _has_stereo(text):
        return _plain_acid_with_stereo(text)
    mol = Chem.MolFromSmiles(text, _WITHOUT_STEREO)
    if mol is None or not 0 < mol.GetNumAtoms() <= MAX_HEAVY_ATOMS:
        return None
    if Chem.SanitizeMol(mol, _ENOUGH, catchErrors=True) != Chem.SanitizeFlags.SANITIZE_NONE:
        return None
    smiles = Chem.MolToSmiles(mol)
    order = _order_written(mol)
    return _with_graph(smiles, mol, Graph.from_mol(mol, stereo=False, order=order, smiles=smiles), order)


def _order_written(mol: Chem.Mol) -> tuple[int, ...]:
    """Order in which the atoms of a molecule were last written."""
    return tuple(map(int, mol.GetProp("_smilesAtomOutputOrder")[1:-1].rstrip(",").split(",")))


def _plain_sites(graph: Graph) -> tuple[int, ...] | None:
    """Carboxyl carbons; None where there is none, or anything that :func:`_carboxyl_sites` has a word about."""
    sites = []
    numbers, all_neighbours, all_orders = graph.numbers, graph.neighbours, graph.orders
    acyls: dict[int, int] = {}  # carbon of each C=O, and how many it has
    hydroxyls: dict[int, int] = {}
    for a, number in enumerate(numbers):
        if number != 8:
            continue
        neighbours = all_neighbours[a]
        if len(neighbours) == 1:
            counts = acyls if all_orders[a][0] == 2.0 else hydroxyls
            counts[neighbours[0]] = counts.get(neighbours[0], 0) + 1
        if any(numbers[b] == 8 for b in neighbours):
            return None
    for carbon in sorted(acyls.keys() & hydroxyls.keys()):
        if numbers[carbon] != 6 or graph.aromatic[carbon] or acyls[carbon] != 1:
            continue
        others = [b for b in all_neighbours[carbon] if numbers[b] != 8 or len(all_neighbours[b]) > 1]
        if hydroxyls[carbon] > 1 or (others and numbers[others[0]] != 6):
            return None
        sites.append(carbon)
    return tuple(sites) if 0 < len(sites) <= MAX_SITES else None


def _plain_acid_with_stereo(text: str) -> Acid | None:
    mol = Chem.MolFromSmiles(text, _WITH_STEREO)
    if mol is None or not 0 < mol.GetNumAtoms() <= MAX_HEAVY_ATOMS:
        return None
    if "[C" in text and any(mol.GetAtomWithIdx(a).GetNumRadicalElectrons() for a in range(mol.GetNumAtoms())):
        return None
    written = Chem.MolToSmiles(mol)
    if written.replace("@@", "@").count("@") <= 1:  # nothing in it that reading and writing once more could settle
        order = _order_written(mol)
        return _with_graph(written, mol, Graph.from_mol(mol, order=order, smiles=written), order)
    mol = Chem.MolFromSmiles(written, _WITH_STEREO)  # canonical atom order, as in `acid_from_mol`
    if mol is None:
        return None
    graph = Graph.from_mol(mol, smiles=written)
    # Writing what was read may settle stereo marks once more.
    return _with_graph(Chem.MolToSmiles(mol), mol, graph)


def _with_graph(smiles: str, mol: Chem.Mol, graph: Graph, order: tuple[int, ...] | None = None) -> Acid | None:
    """An acid whose graph has been read already; None where its carboxyl groups need a word."""
    sites = _plain_sites(graph)
    if sites is None:
        return None
    acid = Acid(smiles, mol, sites, (), order)
    acid.__dict__["graph"] = graph
    return acid


def acid_from_mol(mol: Chem.Mol) -> Acid:
    """Standardise a molecule read from any format; see :func:`read_acid`."""
    if mol.GetNumHeavyAtoms() == 0:
        raise StructureError("no heavy atoms; give the structure of a carboxylic acid")
    if mol.GetNumHeavyAtoms() > 4 * MAX_HEAVY_ATOMS:
        raise StructureError(f"{mol.GetNumHeavyAtoms()} heavy atoms; at most {MAX_HEAVY_ATOMS} are handled")
    mol = _sanitised(mol)
    notes: list[str] = []
    mol = _largest_organic_part(mol, notes)
    _check_elements(mol)
    mol = _clean_labels(mol, notes)
    mol = _neutralised(mol, notes)
    if mol.GetNumHeavyAtoms() > MAX_HEAVY_ATOMS:
        raise StructureError(f"{mol.GetNumHeavyAtoms()} heavy atoms; at most {MAX_HEAVY_ATOMS} are handled")
    smiles = Chem.MolToSmiles(mol)
    mol = Chem.MolFromSmiles(smiles)  # canonical atom order: renumbered input gives the same arithmetic
    if mol is None:
        raise StructureError("the standardised structure cannot be read back; draw it again without charges")
    return Acid(Chem.MolToSmiles(mol), mol, _carboxyl_sites(mol), tuple(notes))


def _short(text: str, limit: int = 60) -> str:
    return text if len(text) <= limit else text[: limit - 1] + "…"


def _sanitised(mol: Chem.Mol) -> Chem.Mol:
    mol = Chem.Mol(mol)
    problems = Chem.DetectChemistryProblems(mol)
    if problems:
        raise StructureError(f"impossible structure: {problems[0].Message().splitlines()[0]}; check charges and bonds")
    try:
        Chem.SanitizeMol(mol)
        Chem.AssignStereochemistry(mol, cleanIt=True, force=True)
        return Chem.RemoveHs(mol)
    except (Chem.MolSanitizeException, RuntimeError, ValueError) as error:
        raise StructureError(f"impossible structure: {str(error).splitlines()[0]}; check charges and bonds") from error


def _largest_organic_part(mol: Chem.Mol, notes: list[str]) -> Chem.Mol:
    parts = Chem.GetMolFrags(mol, asMols=True, sanitizeFrags=False)
    if len(parts) == 1:
        return mol
    organic = [p for p in parts if any(a.GetAtomicNum() == 6 for a in p.GetAtoms())]
    if not organic:
        raise StructureError("only inorganic parts; give the structure of a carboxylic acid")
    # Among organic parts one that carries a carboxyl group goes first, so that a large organic counter-ion
    # does not displace a small acid.
    kept: Chem.Mol = max(organic, key=lambda p: (_has_carboxyl(p), p.GetNumHeavyAtoms(), Chem.MolToSmiles(p)))
    dropped = [Chem.MolToSmiles(p) for p in parts if p is not kept]
    names = ", ".join(_short(s, 30) for s in sorted(set(dropped)))
    notes.append(f"salt or solvate parts removed: {names}")
    Chem.SanitizeMol(kept)
    return kept


def _has_carboxyl(mol: Chem.Mol) -> bool:
    return bool(mol.HasSubstructMatch(_ANY_CARBOXYL))


_ANY_CARBOXYL = Chem.MolFromSmarts("[CX3](=O)[OX1-,OX2H1]")


def _check_elements(mol: Chem.Mol) -> None:
    table = Chem.GetPeriodicTable()
    for atom in mol.GetAtoms():
        number = atom.GetAtomicNum()
        if number == 0:
            raise StructureError("the structure has an attachment point or wildcard atom (*); draw the whole molecule")
        if number not in ELEMENTS:
            raise StructureError(
                f"contains {table.GetElementSymbol(number)}, for which no acid is measured here; metals and "
                "organometallic compounds are not predicted"
            )
        if atom.GetNumRadicalElectrons():
            raise StructureError("the structure is a radical; check valences")


def _clean_labels(mol: Chem.Mol, notes: list[str]) -> Chem.Mol:
    mol = Chem.RWMol(mol)
    isotopes = False
    for atom in mol.GetAtoms():
        atom.SetAtomMapNum(0)
        if atom.GetIsotope():
            isotopes = True
            atom.SetIsotope(0)
    if isotopes:
        notes.append("isotope labels ignored")
        return Chem.RemoveHs(mol.GetMol())
    return mol.GetMol()


def _neutralised(mol: Chem.Mol, notes: list[str]) -> Chem.Mol:
    """Give protons back to anions and take them from protonated bases; permanent charges stay."""
    mol = Chem.RWMol(mol)
    carboxylates = deprotonated = bases = 0
    for atom in mol.GetAtoms():
        charge = atom.GetFormalCharge()
        if charge == 0:
            continue
        neighbours = list(atom.GetNeighbors())
        if charge < 0:
            if any(n.GetFormalCharge() > 0 for n in neighbours):
                continue  # nitro, N-oxide, azide, ylide: one neutral group written with charges
            atom.SetFormalCharge(0)
            atom.SetNumExplicitHs(atom.GetTotalNumHs() - charge)
            atom.SetNoImplicit(True)
            if atom.GetAtomicNum() == 8 and _is_acyl_oxygen(atom):
                carboxylates += 1
            else:
                deprotonated += 1
        elif (
            atom.GetAtomicNum() in _ACID_HYDROGEN
            and atom.GetTotalNumHs()
            and not any(n.GetFormalCharge() < 0 for n in neighbours)
        ):
            taken = min(charge, atom.GetTotalNumHs())
            atom.SetNumExplicitHs(atom.GetTotalNumHs() - taken)
            atom.SetFormalCharge(charge - taken)
            atom.SetNoImplicit(True)
            bases += 1
    if carboxylates:
        notes.append("carboxylate re-protonated" if carboxylates == 1 else f"{carboxylates} carboxylates re-protonated")
    if deprotonated:
        notes.append("another anionic group written with its proton")
    if bases and not carboxylates:
        notes.append("ammonium group read as its amine")
    try:
        Chem.SanitizeMol(mol)
    except (Chem.MolSanitizeException, ValueError) as error:
        raise StructureError("charges that cannot be neutralised; draw the neutral acid") from error
    return mol.GetMol()


def _is_acyl_oxygen(oxygen: Chem.Atom) -> bool:
    return any(
        bond.GetBondType() == Chem.BondType.DOUBLE and bond.GetOtherAtom(carbon).GetAtomicNum() == 8
        for carbon in oxygen.GetNeighbors()
        if carbon.GetAtomicNum() == 6
        for bond in carbon.GetBonds()
    )


def _carboxyl_sites(mol: Chem.Mol) -> tuple[int, ...]:
    sites: list[int] = []
    wrong: list[str] = []
    for carbon, _, _ in mol.GetSubstructMatches(_ANY_CARBOXYL):
        neighbours = mol.GetAtomWithIdx(carbon).GetNeighbors()
        others = [n for n in neighbours if n.GetAtomicNum() != 8 or n.GetDegree() > 1]
        bare = not others and mol.GetAtomWithIdx(carbon).GetTotalNumHs() == 1
        if bare or (others and others[0].GetAtomicNum() == 6):
            if carbon not in sites:
                sites.append(carbon)
        else:
            wrong.append(others[0].GetSymbol() if others else "O")
    if wrong:
        where = {"N": "nitrogen (carbamic acid)", "O": "oxygen (carbonic acid)"}.get(wrong[0], wrong[0])
        raise StructureError(f"COOH on {where}; only COOH on carbon is predicted")
    if mol.HasSubstructMatch(_PEROXY_ACID):
        raise StructureError("peroxy acid; only carboxylic acids are predicted")
    if not sites:
        raise StructureError("no carboxyl group (COOH) on carbon")
    if len(sites) > MAX_SITES:
        raise StructureError(f"{len(sites)} COOH groups; at most {MAX_SITES} are handled")
    return tuple(sorted(sites))


_PEROXY_ACID = Chem.MolFromSmarts("[CX3](=O)O[OX2H1]")
