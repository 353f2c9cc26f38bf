"""The report: one HTML file that shows a cell to a person who has nothing but a browser."""
