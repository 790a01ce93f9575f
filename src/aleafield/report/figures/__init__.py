"""The figures of a report: each a drawing with a caption, shown in the page and written as a file."""

from aleafield.report.figures.all import Figure, figure_files, report_figures

__all__ = ["Figure", "figure_files", "report_figures"]
