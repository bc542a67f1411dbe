"""Many tables made into one answer: sweeps, calibration, comparison and bands."""
