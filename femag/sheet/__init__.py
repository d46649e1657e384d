"""The sheet that a design review is held over: one HTML file that needs nothing else."""

from femag.sheet.page import review_sheet

__all__ = ["review_sheet"]
