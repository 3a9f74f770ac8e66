"""Published check values, and their repetition on the machine where the program is installed. No HTTP, no caller's units."""
