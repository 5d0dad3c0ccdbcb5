"""The demonstration: an invented basin, the files its laboratories send, and the walk through all rooms."""
