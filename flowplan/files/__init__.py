"""Reading and writing: YAML with positions, atomic output."""
