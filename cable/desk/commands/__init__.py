"""One module a command. They import the rest of the program inside their functions, so that help is quick."""
