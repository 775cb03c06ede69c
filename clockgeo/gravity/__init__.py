"""The gravity wing: potentials, heights, tide systems, tides and geoid grids."""
