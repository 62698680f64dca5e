//! Units at the border: what is shown in mV, mΩ or A/mm² from volts, ohms and millimetres, with three significant digits.
