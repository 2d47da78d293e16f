"""Linear networks: nothing here knows about boards."""
