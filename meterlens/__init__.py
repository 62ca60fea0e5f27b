"""Meterlens: from interval exports of metered three-phase services to the monthly answer."""

__all__ = ["__version__"]

__version__ = "0.1.0"
