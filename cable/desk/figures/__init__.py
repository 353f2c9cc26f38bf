"""Figures for a page: maps of the cell and profiles along a path, at the width of one or two columns."""
