"""What others see: the map, and the looks it shares with everything else that leaves the program."""
