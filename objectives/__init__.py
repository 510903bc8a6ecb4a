"""Wanted behaviours: quantities, requirements, improvements; no algorithm is named here."""
