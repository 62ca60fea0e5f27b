"""The electrical kernel: every formula of the program, on NumPy arrays in SI units.

Phase arrays have shape ``(3, n)`` in phase order a, b, c; totals have shape ``(n,)``.
Units are volt, ampere, watt, var, voltampere, ohm and radian. NaN means "not known" and
travels through every formula; what it means at each door is decided in
:mod:`meterlens.electrical.conventions`.
"""
