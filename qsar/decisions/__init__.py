"""What a chemist does with a pKa: which base, which pH, which buffer, and whether to measure first.

Everything here works on macroscopic steps with their intervals (`acids.AcidSteps`).

* `acids`: an acid with its steps, predicted or given;
* `equilibrium`: mass, charge and distribution balance of a mixture, activities by Davies;
* `speciation`: fractions, charge and log D against pH;
* `bases`, `workup`, `window`: which base pulls an acid into water, and which pH parts two acids;
* `buffer`: pH, capacity and range of an acid with its salt;
* `worth_measuring`: where a choice flips and what a measurement would change;
* `cautions`: what can hurt, one line each;
* `plots`: the figures.
"""
