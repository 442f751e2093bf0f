"""Process constants from measured delays: table in, fitted process with its errors out."""
