"""The demo site's generator: circuits and phasors written apart from the program.

Nothing here imports ``meterlens``: what the generator plants and what the program finds
must not share an author's mistake. Only NumPy and the standard library are used.
"""
