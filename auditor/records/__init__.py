"""Frozen records that the rooms hand to one another, their errors, and the nomenclature.

Nothing here computes: a record is what one room gives and the next one takes. Everything is in SI
units with the unit in the name, instants are UTC microseconds since 1970-01-01 (``*_us``), and
arrays are read by everyone and written by nobody after they have been handed on.
"""
