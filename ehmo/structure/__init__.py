"""Files to fragments; fragments to metals, bonds, ligands, donor kinds, local frames and electron counts."""

from ehmo.structure.electrons import assign_electrons
from ehmo.structure.files import MAX_ATOMS, MAX_BYTES
from ehmo.structure.perceive import perceive
from ehmo.structure.readers import from_ase, read, read_frames

__all__ = ["MAX_ATOMS", "MAX_BYTES", "assign_electrons", "from_ase", "perceive", "read", "read_frames"]
