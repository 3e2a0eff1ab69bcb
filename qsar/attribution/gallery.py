"""The gallery of a model: its attributions of a simple, a crowded and a dibasic acid, a series, and a chain.

``python -m qsar.attribution.gallery FOLDER`` makes it for the shipped model. The acids are drawn from textbooks or
invented; no measured value is shown but those of the model's own table.
"""

from __future__ import annotations

import sys
from pathlib import Path
from typing import TYPE_CHECKING

from qsar.attribution.explain import explain, explain_many
from qsar.files import atomic_path
from qsar.progress import progress

if TYPE_CHECKING:
    from qsar.attribution.survey import Survey
    from qsar.model.model import Model

SINGLE = (
    ("simple", "dichloroacetic acid", "ClC(Cl)C(=O)O"),
    ("arylpropanoic", "2-[4-(2-methylpropyl)phenyl]propanoic acid", "CC(C)Cc1ccc(cc1)C(C)C(=O)O"),
    (
        "crowded",
        "an invented N-acetylphenylalanine",
        "COc1cc(cc(c1Oc1ccc(Cl)cc1C(F)(F)F)[N+](=O)[O-])CC(NC(C)=O)C(=O)O",
    ),
    ("dibasic", "succinic acid", "OC(=O)CCC(=O)O"),
    ("zwitterion", "glutamic acid", "NC(CCC(=O)O)C(=O)O"),
)
SERIES = (
    ("benzoic", "OC(=O)c1ccccc1"),
    ("2-chloro", "OC(=O)c1ccccc1Cl"),
    ("3-chloro", "OC(=O)c1cccc(Cl)c1"),
    ("4-chloro", "OC(=O)c1ccc(Cl)cc1"),
    ("4-methoxy", "OC(=O)c1ccc(OC)cc1"),
    ("2-hydroxy", "OC(=O)c1ccccc1O"),
    ("3-nitro", "OC(=O)c1cccc([N+](=O)[O-])c1"),
    ("4-nitro", "OC(=O)c1ccc([N+](=O)[O-])cc1"),
    ("2-chloro-4-nitro", "OC(=O)c1ccc([N+](=O)[O-])cc1Cl"),
    ("2,6-dichloro", "OC(=O)c1c(Cl)cccc1Cl"),
)
SURVEY = (
    "substituent",
    "on",
    "bonds",
    "contributions",
    "mean",
    "low",
    "high",
    "pairs",
    "pairs_mean",
    "pairs_low",
    "pairs_high",
    "verdict",
)


def chain(group: str, longest: int = 7) -> list[str]:
    """SMILES of the omega-substituted straight acids, the group on carbon 2, then 3, and so on.

    Parameters
    ----------
    group : str
        SMILES of the group, the attached atom first, such as "Cl".
    longest : int
        Carbons of the longest acid.
    """
    return ["OC(=O)" + "C" * n + group for n in range(1, longest)]


def make_gallery(model: Model, folder: Path) -> None:
    """Write the gallery of a model.

    Parameters
    ----------
    model : Model
    folder : pathlib.Path
        Must exist.

    Raises
    ------
    UserError
        If a file cannot be written.
    """
    from qsar.attribution.drawing import structure_png, structure_svg
    from qsar.attribution.plots import analogues_figure, distance_figure, save, steps_figure
    from qsar.attribution.survey import survey

    for name, title, smiles in SINGLE:
        for e in explain(model, smiles):
            stem = f"{name}-step{e.step}" if len(e.acid.sites) > 1 else name
            with atomic_path(folder / f"{stem}-structure.svg") as temporary:
                temporary.write_text(structure_svg(e), encoding="utf-8")
            with atomic_path(folder / f"{stem}-structure.png") as temporary:
                temporary.write_bytes(structure_png(e, 700, 500))
            save(steps_figure(e, title), folder / f"{stem}-steps")
    series = [answer.steps[0] for answer in explain_many(model, [smiles for _, smiles in SERIES])]
    save(analogues_figure(series, [name for name, _ in SERIES]), folder / "analogues-benzoic")
    for group, name in (("Cl", "chloro"), ("C#N", "cyano")):
        along = [answer.steps[0] for answer in explain_many(model, chain(group))]
        save(distance_figure(along, name), folder / f"distance-{name}")
    own = len({s for s in model.library.smiles if s})
    with progress(lambda: own, "acids") as advance:
        _write_survey(survey(model, advance), folder / "substituents.csv")


def _write_survey(found: Survey, target: Path) -> None:
    from qsar.attribution.tables import write_table

    with atomic_path(target) as temporary:
        write_table(
            temporary,
            SURVEY,
            (
                (
                    row.name,
                    row.on,
                    row.bonds,
                    row.n,
                    *(round(v, 3) for v in (row.mean, row.low, row.high)),
                    row.witnesses.n,
                    *(
                        round(v, 3) if row.witnesses.n else None
                        for v in (row.witnesses.mean, row.witnesses.low, row.witnesses.high)
                    ),
                    row.witnesses.verdict,
                )
                for row in found.rows
            ),
        )


def main() -> int:
    """Make the gallery of the shipped model in the folder that is named."""
    from qsar.model import load_model

    if len(sys.argv) != 2:
        print("usage: python -m qsar.attribution.gallery FOLDER", file=sys.stderr)
        return 2
    folder = Path(sys.argv[1])
    folder.mkdir(parents=True, exist_ok=True)
    make_gallery(load_model(), folder)
    return 0


if __name__ == "__main__":
    sys.exit(main())
