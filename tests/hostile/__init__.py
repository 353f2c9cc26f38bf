"""Input that means harm, or was damaged on its way: mutators, verdicts, and a program that tries many of them."""
