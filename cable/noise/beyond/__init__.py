"""Beyond linear theory: mean and SD to the next order in the size of the events."""
