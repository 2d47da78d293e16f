"""What a part is electrically worth, and what had to be assumed to say so."""
