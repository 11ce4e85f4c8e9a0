"""The way round for the return current and the inductance it adds."""
