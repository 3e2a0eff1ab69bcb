"""Descriptors of one carboxyl group in one charge state, one module for each physical effect."""

from qsar.descriptors.pipeline import COLUMNS, EFFECTS, LOWERS, NAMES, rounded, site_descriptors
from qsar.descriptors.view import Molecule, SiteView

__all__ = ["COLUMNS", "EFFECTS", "LOWERS", "NAMES", "Molecule", "SiteView", "rounded", "site_descriptors"]
