"""A path as a nonlinear circuit: how fast it switches when its transistors are integrated."""
