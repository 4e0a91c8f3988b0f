"""Choose, defend and hand over calibration functions."""
