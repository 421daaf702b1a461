"""The simulation against distributions and packages that share no code with it."""
