"""Line shapes, noise, regions and line fits: arrays in, arrays out."""
