"""The course: file, track, repair, grid, bends and pieces."""
