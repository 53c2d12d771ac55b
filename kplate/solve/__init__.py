"""Solvers: a stated plate and a mesh in, unknowns out, nothing judged."""
