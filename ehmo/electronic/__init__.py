"""Hamiltonian, eigensolver, occupation and self-consistent charges."""
