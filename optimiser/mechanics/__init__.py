"""Plate bending, contact between shims and stress: what a stack does under pressure."""

from optimiser.mechanics.deflect import BackSpringForce, Deflection, deflect

__all__ = ["BackSpringForce", "Deflection", "deflect"]
