"""The break point: the smallest smooth distortion of the background that takes the evidence away."""
