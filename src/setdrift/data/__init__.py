"""Files, stores, grids and configuration: everything between the disk and the arrays."""
