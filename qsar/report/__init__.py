"""One self-contained HTML file about some acids: dossier of the model, figures, evidence, statements to file."""

from qsar.report.html import write_report

__all__ = ["write_report"]
