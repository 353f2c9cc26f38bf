"""The answers: what the voltage does at every place, one question a file."""
