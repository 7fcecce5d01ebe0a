"""Line drawings: exact hidden lines in vector form."""
