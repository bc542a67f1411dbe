"""Shipped polar families: section data computed once over thickness, camber and Reynolds number.

The package holds data only (`<family>.npz`), and `generate.py`, which made them. `bemt.section.family` reads them;
`docs/sections.md` says how good they are.
"""
