"""Panel sets: starting meshes, splitting, refinement geometry."""
