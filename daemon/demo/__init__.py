"""A board to try the program on, and the saves of its story. All data invented."""
