"""Recalculation without a spreadsheet program: a workbook file in, the same file with new values out."""
