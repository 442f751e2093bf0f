"""What several tests build their blocks with."""
