"""Kinds of gates beside the static complementary ones."""
