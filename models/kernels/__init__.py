"""Closed-form interaction kernels, one module a lattice."""
