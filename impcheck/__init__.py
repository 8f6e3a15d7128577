"""impcheck finds every impedance discontinuity of a board's declared nets from its fabrication files."""
