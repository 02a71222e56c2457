"""Writes an Excel add-in file (.xlam) with a VBA project, from the published file formats alone."""
