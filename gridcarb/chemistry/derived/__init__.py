"""Fields that follow from the solved cell, one theme a file, one decorated function a field."""
