"""Arrays of vectors and angles: vectors, planes, lines, projection, statistics. NumPy only; knows no mesh."""
