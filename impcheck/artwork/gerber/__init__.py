"""Reading Gerber files (X1, X2, X3). In: the bytes of one file; out: an Image of typed arrays in mm."""

from impcheck.artwork.gerber.reader import read_gerber

__all__ = ["read_gerber"]
