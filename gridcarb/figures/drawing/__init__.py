"""What draws: the only modules that import matplotlib and cartopy, loaded when the first figure is drawn."""
