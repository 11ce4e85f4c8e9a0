"""Reference copper, the traces over it, and where it breaks beneath them."""
