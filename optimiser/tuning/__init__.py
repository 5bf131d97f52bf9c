"""Tune tables: many cells searched, one chain of stacks through them, one kit that builds them."""
