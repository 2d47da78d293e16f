"""What an export says, what its parts are worth, and what its networks do. Pure: no clock, no files written."""
