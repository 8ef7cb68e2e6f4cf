"""How sure a number is, and what may be decided from it. Pure numbers, no files, no instruments."""
