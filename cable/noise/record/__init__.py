"""What an electrode records: amplifier and filters, voltage clamp, and how long to record."""
