"""Excel through xlwings: registration, the add-in file, its installation and repair."""
