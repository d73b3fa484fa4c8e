"""Checks too long for CI: ``make prove`` runs them and writes docs/evidence.md.

Each module here offers ``prove() -> str``: a section of Markdown with the figures it measured.
"""
