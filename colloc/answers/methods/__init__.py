"""What was done, in words that another can repeat: the methods paragraph and its bibliography."""
