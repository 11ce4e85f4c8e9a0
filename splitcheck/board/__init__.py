"""Layers in z, connected copper, nets and centre lines: what is on the board."""
