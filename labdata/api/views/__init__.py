"""The routes of the API, one file a room."""
