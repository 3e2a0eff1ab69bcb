"""Names of substituents and of their places, as chemists say them."""

from __future__ import annotations

import re
from collections.abc import Collection
from functools import lru_cache

from rdkit import Chem

from qsar.graph import Graph
from qsar.groups import Group

_GREEK = {2: "α", 3: "β", 4: "γ", 5: "δ", 6: "ε", 7: "ζ", 8: "η", 9: "θ"}
_RING_OF_SIX = {3: "ortho", 4: "meta", 5: "para"}

#: SMILES with the attachment as ``*``, and the name in substitutive nomenclature or common use.
_NAMES = """
*F fluoro|*Cl chloro|*Br bromo|*I iodo|*C#N cyano|*[N+]#[C-] isocyano|*[N+](=O)[O-] nitro|*N=O nitroso
*N=[N+]=[N-] azido|*O hydroxy|*OC methoxy|*OCC ethoxy|*OCCC propoxy|*OC(C)C isopropoxy|*OCCCC butoxy
*OC(C)(C)C tert-butoxy|*S sulfanyl|*SC methylsulfanyl|*SCC ethylsulfanyl|*SSC methyldisulfanyl|*SC#N thiocyanato
*N=C=S isothiocyanato|*OC=O formyloxy|*OC(C)=O acetoxy|*SC(C)=O acetylsulfanyl|*NC=O formamido|*NC(C)=O acetamido
*NC(N)=O ureido|*NC(=O)OC methoxycarbonylamino|*NC(=O)OC(C)(C)C tert-butoxycarbonylamino
*N amino|*[NH3+] ammonio|*NC methylamino|*[NH2+]C methylammonio|*N(C)C dimethylamino|*[NH+](C)C dimethylammonio
*N(CC)CC diethylamino|*[NH+](CC)CC diethylammonio|*[N+](C)(C)C trimethylammonio|*NN hydrazinyl
*[NH2+]CC ethylammonio|*[NH2+]C(C)C isopropylammonio|*[NH2+]C(C)(C)C tert-butylammonio
*[NH+]1CCCCC1 piperidinio|*[NH+]1CCOCC1 morpholinio|*[NH+]1CCCC1 pyrrolidinio|*[NH+]1CC[NH2+]CC1 piperazinediio
*NC(=N)N guanidinio|*C(=N)N amidinio|*C=O formyl|*C(C)=O acetyl|*C(=O)CC propanoyl
*C(=O)O carboxy|*C(=O)[O-] carboxylate|*C(=O)OC methoxycarbonyl|*C(=O)OCC ethoxycarbonyl|*C(N)=O carbamoyl
*C(=O)NC methylcarbamoyl|*C(=O)N(C)C dimethylcarbamoyl|*S(C)=O methylsulfinyl|*S(C)(=O)=O methylsulfonyl
*S(N)(=O)=O sulfamoyl|*S(=O)(=O)O sulfonate|*S(=O)(=O)N(C)C dimethylsulfamoyl|*NS(C)(=O)=O methylsulfonamido
*P(=O)(O)O phosphonate|*S(=O)=O sulfonyl|*S=O sulfinyl|*=O oxo|*=S thioxo|*=N imino|*=NO hydroxyimino
*=NOC methoxyimino|*=C methylidene|*=CC ethylidene|*[N+]([O-])=O nitro|*S(F)(F)(F)(F)F pentafluorosulfanyl
*N=C=O isocyanato|*B(O)O borono|*[Si](C)(C)C trimethylsilyl|*[SiH3] silyl|*[Se]C methylselanyl|*[SeH] selanyl
*C methyl|*CC ethyl|*CCC propyl|*C(C)C isopropyl|*CCCC butyl|*CC(C)C isobutyl|*C(C)CC sec-butyl|*C(C)(C)C tert-butyl
*CCCCC pentyl|*CCC(C)C isopentyl|*CC(C)(C)C neopentyl|*C(C)(C)CC tert-pentyl|*CCCCCC hexyl|*CCCCCCC heptyl
*CCCCCCCC octyl|*CCCCCCCCC nonyl|*CCCCCCCCCC decyl|*CCCCCCCCCCCC dodecyl
*C=C vinyl|*CC=C allyl|*C(C)=C isopropenyl|*C=CC prop-1-enyl|*C#C ethynyl|*C#CC prop-1-ynyl
*C1CC1 cyclopropyl|*C1CCC1 cyclobutyl|*C1CCCC1 cyclopentyl|*C1CCCCC1 cyclohexyl|*C1CCCCCC1 cycloheptyl
*C12CC3CC(CC(C3)C1)C2 1-adamantyl|*c1ccccc1 phenyl|*c1cccc2ccccc12 1-naphthyl|*c1ccc2ccccc2c1 2-naphthyl
*c1ccco1 2-furyl|*c1ccoc1 3-furyl|*c1cccs1 2-thienyl|*c1ccsc1 3-thienyl|*c1ccc[nH]1 pyrrol-2-yl|*n1cccc1 pyrrol-1-yl
*c1ccccn1 2-pyridyl|*c1cccnc1 3-pyridyl|*c1ccncc1 4-pyridyl|*c1c[nH]cn1 imidazol-4-yl|*c1cnc[nH]1 imidazol-4-yl
*n1ccnc1 imidazol-1-yl|*c1nnn[nH]1 tetrazol-5-yl|*c1nn[nH]n1 tetrazol-5-yl|*c1c[nH]c2ccccc12 indol-3-yl
*N1CCCCC1 piperidin-1-yl|*N1CCOCC1 morpholin-4-yl|*N1CCNCC1 piperazin-1-yl|*N1CCCC1 pyrrolidin-1-yl
*N1CCCC1=O 2-oxopyrrolidin-1-yl|*N1C(=O)CCC1=O succinimido|*N1C(=O)c2ccccc2C1=O phthalimido
*[O-] oxido|*CC* ethylene|*CCC* trimethylene|*CCCC* tetramethylene|*CCCCC* pentamethylene|*OCO* methylenedioxy
*C* methylene bridge|*O* epoxy bridge|*c1cccc(*)c1 phenylene|*C(=O)OC(*)=O oxydicarbonyl
*NC(=O)CC propanamido|*NC(=O)CCC butanamido|*NC(=O)CCCC pentanamido|*NC(=O)CCCCC hexanamido
*NC(=O)C(C)C 2-methylpropanamido|*NC(=O)CC(C)C 3-methylbutanamido|*NC(=O)CCC(C)C 4-methylpentanamido
*N(C)C(C)=O N-methylacetamido|*C(=O)NCC ethylcarbamoyl|*NC(=O)OCC ethoxycarbonylamino|*N=N diazenyl|*NCC ethylamino
*[NH+](C)CC ethyl(methyl)ammonio|*[NH+](C)CCC methyl(propyl)ammonio|*[NH+](C)CCCC butyl(methyl)ammonio
*[NH2+]CCC propylammonio|*[NH2+]CCCC butylammonio|*[NH2+]CCCCC pentylammonio|*[N+](C)(C)CC ethyldimethylammonio
*N1CC[NH2+]CC1 piperazin-4-ium-1-yl|*[NH+]1CCNCC1 piperazin-1-ium-1-yl|*C1CC[NH2+]C1 pyrrolidin-1-ium-3-yl
*C1CCC[NH2+]1 pyrrolidin-1-ium-2-yl|*OP(=O)(O)O phosphonooxy|*SCCC propylsulfanyl|*SC(C)C isopropylsulfanyl
*SCCCC butylsulfanyl|*SSCC ethyldisulfanyl|*[S+](C)C dimethylsulfonio|*NO hydroxyamino|*ON aminooxy
*N(C)N=O methyl(nitroso)amino
*N(C)N 1-methylhydrazinyl|*c1ncccn1 pyrimidin-2-yl|*n1cccn1 pyrazol-1-yl|*c1cnoc1 isoxazol-4-yl|*C1CCCO1 oxolan-2-yl
*C=CCC but-1-enyl|*C=C(C)C 2-methylprop-1-enyl|*OC(C)CC sec-butoxy|*OCCCCC pentyloxy|*OCCCCCC hexyloxy
*C(=O)OCCC propoxycarbonyl|*C(=O)OC(C)C isopropoxycarbonyl|*C(=O)OC(C)(C)C tert-butoxycarbonyl|*C(=O)CCC butanoyl
*Nc1ccccc1 anilino|*N(C)c1ccccc1 N-methylanilino|*c1ccc2c(c1)OCO2 1,3-benzodioxol-5-yl
*N1c2ccccc2Sc2ccccc21 phenothiazin-10-yl
"""


@lru_cache(maxsize=1)
def _names() -> dict[str, str]:
    table: dict[str, str] = {}
    for entry in _NAMES.replace("\n", "|").split("|"):
        smiles, _, name = entry.strip().partition(" ")
        if smiles and name:
            mol = Chem.MolFromSmiles(smiles)
            table.setdefault(Chem.MolToSmiles(mol), name)
    return table


def unit_kind(
    mol: Chem.Mol, unit: Collection[int], inner: Collection[int], ionised: Collection[int], protonated: Collection[int]
) -> str:
    """Canonical SMILES of a unit, ``*`` for each bond towards the carboxyl group, H for whatever it carries.

    Parameters
    ----------
    mol : rdkit.Chem.Mol
    unit : collection of int
    inner : collection of int
        Atoms of the parent, or of the unit that carries this one.
    ionised : collection of int
        Carboxyl carbons without their proton.
    protonated : collection of int
        Amine nitrogens with a proton more than drawn.

    Returns
    -------
    str
    """
    fragment = Chem.RWMol()
    index: dict[int, int] = {}
    for a in sorted(unit):
        old = mol.GetAtomWithIdx(a)
        atom = Chem.Atom(old.GetAtomicNum())
        extra = int(a in protonated)
        atom.SetFormalCharge(old.GetFormalCharge() + extra)
        atom.SetIsAromatic(old.GetIsAromatic())
        atom.SetNoImplicit(True)
        lost = sum(
            _whole(bond)
            for bond in old.GetBonds()
            if bond.GetOtherAtomIdx(a) not in unit and bond.GetOtherAtomIdx(a) not in inner
        )
        atom.SetNumExplicitHs(old.GetTotalNumHs() + lost + extra)
        index[a] = fragment.AddAtom(atom)
    for bond in mol.GetBonds():
        ends = [bond.GetBeginAtomIdx(), bond.GetEndAtomIdx()]
        if ends[0] in index and ends[1] in index:
            fragment.AddBond(index[ends[0]], index[ends[1]], bond.GetBondType())
        elif (ends[0] in index and ends[1] in inner) or (ends[1] in index and ends[0] in inner):
            kept = ends[0] if ends[0] in index else ends[1]
            star = fragment.AddAtom(Chem.Atom(0))
            kind = bond.GetBondType()
            single = Chem.BondType.SINGLE if kind == Chem.BondType.AROMATIC else kind
            fragment.AddBond(index[kept], star, single)
    for carbon in ionised:
        if carbon in index:
            for other in mol.GetAtomWithIdx(carbon).GetNeighbors():
                if other.GetAtomicNum() == 8 and other.GetTotalNumHs():
                    oxygen = fragment.GetAtomWithIdx(index[other.GetIdx()])
                    oxygen.SetNumExplicitHs(0)
                    oxygen.SetFormalCharge(-1)
    smiles = Chem.MolToSmiles(fragment)
    clean = Chem.MolFromSmiles(smiles)
    return smiles if clean is None else str(Chem.MolToSmiles(clean))


def _whole(bond: Chem.Bond) -> int:
    return 1 if bond.GetIsAromatic() else int(bond.GetBondTypeAsDouble())


#: Groups that end in a hydrogen by themselves and link where they carry something.
_LINKING = {
    "hydroxy": "oxy",
    "sulfanyl": "thio",
    "formyl": "carbonyl",
    "carboxy": "oxycarbonyl",
    "formyloxy": "carbonyloxy",
    "formamido": "carbonylamino",
    "hydroxyimino": "oxyimino",
}


def unit_name(kind: str, graph: Graph, groups: list[Group], unit: Collection[int], carries: bool) -> str:
    """Name of a unit; where there is no short one, what its groups are and its formula.

    Parameters
    ----------
    kind : str
        From `unit_kind`.
    graph : Graph
    groups : list of Group
    unit : collection of int
    carries : bool
        Whether other units hang on it.
    """
    known = _names().get(kind)
    if known is not None:
        return _LINKING.get(known, known) if carries else known
    from qsar.constants.functional_groups import functional_groups

    labels = functional_groups()
    inside = [g for g in groups if set(unit).intersection(g.atoms)]
    described = [labels[g.kind].label if g.kind in labels else g.kind for g in inside]
    if any(graph.ring_size[a] for a in unit):
        rings = sorted({graph.ring_size[a] for a in unit if graph.ring_size[a]})
        if not described:
            described = [f"{rings[0]}-membered ring"]
    elif not described:
        described = ["alkyl"]
    return f"{' '.join(dict.fromkeys(described))} ({_formula(graph, kind)})"


def _formula(graph: Graph, kind: str) -> str:
    from rdkit.Chem.rdMolDescriptors import CalcMolFormula

    mol = Chem.MolFromSmiles(kind, sanitize=False)
    mol.UpdatePropertyCache(strict=False)
    return re.sub(r"\*\d*", "", str(CalcMolFormula(mol)))


def place_of(graph: Graph, rule: str, parent: Collection[int], path: tuple[int, ...], carrier: str) -> str:
    """Where a substituent sits, in words.

    Parameters
    ----------
    graph : Graph
    rule : str
        The rule that gave the parent.
    parent : collection of int
    path : tuple of int
    carrier : str
        Name of the substituent that carries it; empty where the parent does.
    """
    if carrier:
        return f"on {carrier}"
    bonds, inner = len(path) - 1, path[-2]
    if bonds <= 1:
        return ""
    if graph.numbers[inner] != 6:
        return f"on {({7: 'N', 8: 'O', 16: 'S'}).get(graph.numbers[inner], 'the hetero atom')}"
    if rule == "a":
        ring = [r for r in graph.rings if path[1] in r]
        if len(ring) == 1 and len(ring[0]) == 6 and inner in ring[0] and bonds in _RING_OF_SIX:
            return _RING_OF_SIX[bonds]
        return f"{bonds - 1} bonds out" if bonds - 1 not in (1,) else "α"
    return _GREEK.get(bonds, f"{bonds} bonds out")
